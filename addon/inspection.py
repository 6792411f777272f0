"""What is amiss with the parts' surfaces, looked at beside the designer after each edit, and kept with each part."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import bpy

from ..solver.case import write_case
from ..solver.errors import Trouble
from . import host, jobs, study
from .cases import accuracy, build_shapes
from .glance import Finding
from .parts import in_sight

# Longer than an edit takes to be measured: a designer who is at work is not looked at after every move.
QUIET_SECONDS = 1.5
SECONDS_BETWEEN_LOOKS = 0.2


# What is kept with a part ---------------------------------------------------------------------------------------------


def is_current(part: bpy.types.Object) -> bool:
    """Whether the solver has looked at the part as it stands; before, what is kept was seen at a glance."""
    settings = part.fluxface
    return bool(settings.inspected) and settings.inspected == settings.body


def findings(part: bpy.types.Object) -> list[Finding]:
    """What is amiss with the part, the faces left out: there may be many, and this is asked whenever it is drawn."""
    return json.loads(part.fluxface.findings or "[]")


def faces_of(part: bpy.types.Object, number: int) -> list[int]:
    """The faces of one finding, numbered as modifiers left them."""
    return json.loads(part.fluxface.finding_faces)[number]


def keep(part: bpy.types.Object, found: Sequence[Finding], inspected: str) -> None:
    """inspected: the digest of the body if the solver has found this, or nothing."""
    settings = part.fluxface
    settings.findings = json.dumps([{**finding, "faces": len(finding["faces"])} for finding in found])
    settings.finding_faces = json.dumps([finding["faces"] for finding in found])
    settings.inspected = inspected


def note(part: bpy.types.Object, sentence: str) -> None:
    """Tell of something that was done to the part, until it is dismissed or the part is solved."""
    known = part.fluxface.notes.split("\n")
    if sentence not in known:
        part.fluxface.notes = "\n".join([*known, sentence]).strip()


# The look ------------------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Look:
    """parts: the host's ids for the session. bodies: their digests when it began. folder: holds the case meanwhile."""

    job: jobs.Job
    parts: tuple[int, ...]
    bodies: tuple[str, ...]
    folder: tempfile.TemporaryDirectory


def start(context: bpy.types.Context, parts: Sequence[bpy.types.Object]) -> Look | None:
    """Start looking at the parts as they stand; what is no body is told at once, and None when nothing is left.

    Raises Trouble when the solver is missing.
    """
    bodies = _bodies_among(context, parts)
    if not bodies:
        return None
    with in_sight(context, bodies) as depsgraph:
        case = build_shapes(context.scene, bodies, depsgraph)
    folder = tempfile.TemporaryDirectory(prefix="fluxface-", ignore_cleanup_errors=True)
    # Walls are thin against the size that is chosen.
    write_case(replace(case, accuracy=accuracy(context.scene)), Path(folder.name))
    uids = tuple(part.session_uid for part in bodies)
    return Look(jobs.inspect(Path(folder.name)), uids, tuple(part.fluxface.body for part in bodies), folder)


def finish(look: Look, ending: jobs.Ending) -> None:
    """Keep what was found with the parts that are still as they were."""
    look.folder.cleanup()
    if ending.trouble or ending.cancelled:
        return
    objects = {thing.session_uid: thing for thing in bpy.data.objects}
    for uid, body, told in zip(look.parts, look.bodies, json.loads(ending.said)["parts"], strict=True):
        part = objects.get(uid)
        if part is not None and part.fluxface.body == body:
            keep(part, told["findings"], body)


def _bodies_among(context: bpy.types.Context, parts: Sequence[bpy.types.Object]) -> list[bpy.types.Object]:
    """Those of ``parts`` that are bodies at all; what keeps the others from it is all that is said of them."""
    bodies = []
    with in_sight(context, parts) as depsgraph:
        for part in parts:
            try:
                build_shapes(context.scene, [part], depsgraph)
                bodies.append(part)
            except Trouble as trouble:
                told = {"kind": "no body", "message": trouble.message, "mend": trouble.mend, "severity": "error"}
                keep(part, [{**told, "faces": [], "points": []}], part.fluxface.body)
    return bodies


def unseen(context: bpy.types.Context) -> list[bpy.types.Object]:
    """The parts in sight that the solver has not looked at as they stand."""
    try:
        members = study.parts(context)
    except Trouble:
        return []
    waiting = [part for part in members if part.library is None and part.fluxface.body and not is_current(part)]
    return [part for part in waiting if part.visible_get()]


class Inspector:
    """One look at a time: a newer shape ends the look at an older one, and a run ends any."""

    def __init__(self) -> None:
        self._look: Look | None = None
        # The host knows a timer by its object, and each mention of a method makes a new one.
        self._timer = self._go_on

    def follow(self) -> None:
        """After an edit was measured: look once all has been quiet for a while, at nothing that is being looked at."""
        if self._look is not None and self._look.bodies == tuple(part.fluxface.body for part in unseen(bpy.context)):
            return
        self.stop()
        bpy.app.timers.register(self._timer, first_interval=QUIET_SECONDS)

    def stop(self) -> None:
        """End the look that is under way, if one is, and wait for none."""
        if bpy.app.timers.is_registered(self._timer):
            bpy.app.timers.unregister(self._timer)
        self._give_up()

    def _give_up(self) -> None:
        if self._look is not None:
            self._look.job.cancel()
            self._look.job.wait()
            self._look.job.poll()
            self._look.folder.cleanup()
        self._look = None

    def _go_on(self) -> float | None:
        """What the timer calls: the seconds until the next call, or None when there is nothing more to do."""
        if bpy.context.window_manager.fluxface.running:
            # A run has the machine for itself.
            self._give_up()
            return QUIET_SECONDS
        if self._look is None:
            try:
                self._look = start(bpy.context, unseen(bpy.context))
            except (Trouble, OSError):
                # Without a solver or room for a case there is nothing to look with, which a run says in full.
                return None
            return None if self._look is None else SECONDS_BETWEEN_LOOKS
        ending = self._look.job.poll()
        if ending is None:
            return SECONDS_BETWEEN_LOOKS
        look, self._look = self._look, None
        finish(look, ending)
        host.redraw()
        return None


# One for the session, as is the host's clock that it waits by.
inspector = Inspector()


def register() -> None:
    """Nothing is looked at until a part changes."""


def unregister() -> None:
    inspector.stop()
