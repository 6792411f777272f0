"""What is amiss with the parts' surfaces, looked at beside the designer after each edit, and kept with each part."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import bpy

from ..solver.case import write_case
from ..solver.errors import Trouble
from . import host, jobs
from .cases import build_shapes
from .parts import in_sight

SECONDS_BETWEEN_LOOKS = 0.2

Finding = dict[str, Any]


def is_current(part: bpy.types.Object) -> bool:
    """Whether what is kept was found on the part as it stands."""
    settings = part.fluxface
    return bool(settings.inspected) and settings.inspected == settings.body


def findings(part: bpy.types.Object) -> list[Finding]:
    """As ``fluxface inspect`` tells them: kind, message, mend, faces, points (m) and severity of each."""
    return json.loads(part.fluxface.findings or "[]")


def start(context: bpy.types.Context, parts: Sequence[bpy.types.Object], folder: Path) -> jobs.Job:
    """Start looking at the parts as they stand.

    Raises Trouble when a part is no body or the solver is missing.
    """
    with in_sight(context, parts) as depsgraph:
        write_case(build_shapes(context.scene, parts, depsgraph), folder)
    return jobs.inspect(folder)


def bodies_among(context: bpy.types.Context, parts: Sequence[bpy.types.Object]) -> list[bpy.types.Object]:
    """Those of ``parts`` that are bodies at all; what keeps the others from it is all that is said of them."""
    found = []
    with in_sight(context, parts) as depsgraph:
        for part in parts:
            try:
                build_shapes(context.scene, [part], depsgraph)
                found.append(part)
            except Trouble as trouble:
                no_body = {"message": trouble.message, "mend": trouble.mend, "severity": "error"}
                _keep(part, part.fluxface.body, [{**no_body, "faces": [], "points": []}])
    return found


def keep(parts: Sequence[bpy.types.Object], bodies: Sequence[str], said: str) -> None:
    """Keep with the parts what was found on ``bodies``, the digests they had when the look began."""
    for part, body, told in zip(parts, bodies, json.loads(said)["parts"], strict=True):
        _keep(part, body, told["findings"])


def _keep(part: bpy.types.Object, body: str, found: list[Finding]) -> None:
    part.fluxface.findings, part.fluxface.inspected = json.dumps(found), body


class Inspector:
    """One look at a time: a newer shape ends the look at an older one."""

    def __init__(self) -> None:
        self._job: jobs.Job | None = None
        self._folder: tempfile.TemporaryDirectory | None = None
        self._parts: tuple[int, ...] = ()
        self._bodies: tuple[str, ...] = ()

    def look(self, parts: Sequence[bpy.types.Object]) -> None:
        """Look at those of ``parts`` that have changed since they were last looked at; it returns at once."""
        new = [part for part in parts if part.library is None and part.fluxface.body and not is_current(part)]
        if tuple(part.fluxface.body for part in new) == self._bodies:
            return
        self.stop()
        try:
            new = bodies_among(bpy.context, new)
            if not new:
                return
            self._folder = tempfile.TemporaryDirectory(prefix="fluxface-", ignore_cleanup_errors=True)
            self._job = start(bpy.context, new, Path(self._folder.name))
        except (Trouble, OSError):
            # Without a solver or room for a case there is nothing to look with, which a run says in full.
            self.stop()
            return
        self._parts = tuple(part.session_uid for part in new)
        self._bodies = tuple(part.fluxface.body for part in new)
        bpy.app.timers.register(self._wait, first_interval=SECONDS_BETWEEN_LOOKS)

    def stop(self) -> None:
        """End the look that is under way, if one is."""
        if bpy.app.timers.is_registered(self._wait):
            bpy.app.timers.unregister(self._wait)
        if self._job is not None:
            self._job.cancel()
            self._job.wait()
            self._job.poll()
        if self._folder is not None:
            self._folder.cleanup()
        self._job, self._folder, self._parts, self._bodies = None, None, (), ()

    def _wait(self) -> float | None:
        ending = self._job.poll()
        if ending is None:
            return SECONDS_BETWEEN_LOOKS
        objects = {thing.session_uid: thing for thing in bpy.data.objects}
        parts = [objects.get(uid) for uid in self._parts]
        if not (ending.trouble or ending.cancelled) and all(parts):
            keep(parts, self._bodies, ending.said)
        self._job = None
        self.stop()
        host.redraw()
        return None


# One for the session, as is the host's clock that it waits by.
inspector = Inspector()


def register() -> None:
    """Nothing is looked at until a part changes."""


def unregister() -> None:
    inspector.stop()
