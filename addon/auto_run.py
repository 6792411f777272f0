"""Auto run: once things are quiet after a change, the study is run beside the designer, if the scene asks for it."""

from __future__ import annotations

import bpy
from bpy.app.handlers import persistent

from ..solver.errors import Trouble
from . import study

# After the last change; long enough to type the next figure.
SECONDS_QUIET, SECONDS_BETWEEN_LOOKS = 1.0, 0.25


class AutoRun:
    """Waits for quiet after the last change, and runs at most once for each set of inputs."""

    def __init__(self) -> None:
        self._seen, self._run = "", ""
        self._quiet = 0.0

    def look(self) -> float:
        """What the host's clock calls again and again; it never waits."""
        context = bpy.context
        if not context.scene.fluxface.auto_run or context.window_manager.fluxface.running:
            return SECONDS_QUIET
        inputs = self._inputs(context)
        if not inputs or inputs == self._run:
            return SECONDS_QUIET
        self._quiet = self._quiet + SECONDS_BETWEEN_LOOKS if inputs == self._seen else 0.0
        self._seen = inputs
        if self._quiet >= SECONDS_QUIET and not _is_busy(context):
            self._run = inputs
            _run(context)
        return SECONDS_BETWEEN_LOOKS

    def _inputs(self, context: bpy.types.Context) -> str:
        """What a run would start from now; nothing where it would have nothing to start from, or nothing to add."""
        try:
            members = study.parts(context)
        except Trouble:
            return ""
        if study.is_current(context.scene, members) or not study.tag_areas(context.scene, members):
            return ""
        return study.inputs(context.scene, members)


def _is_busy(context: bpy.types.Context) -> bool:
    """Whether something in a window has the mouse, as a transform does, or a picture is being rendered."""
    modal = any(len(getattr(window, "modal_operators", ())) for window in context.window_manager.windows)
    return modal or bpy.app.is_job_running("RENDER")


def _run(context: bpy.types.Context) -> None:
    with context.temp_override(window=context.window_manager.windows[0]):
        if bpy.ops.fluxface.run.poll():
            bpy.ops.fluxface.run("INVOKE_DEFAULT")


# One for the session, as is the host's clock that calls it.
auto_run = AutoRun()
look = auto_run.look  # one and the same object each time, by which the host knows what it calls


@persistent
def keep_looking(_file: str) -> None:
    """The host's clock forgets what it called when a file is opened."""
    if not bpy.app.background and not bpy.app.timers.is_registered(look):
        bpy.app.timers.register(look, first_interval=SECONDS_QUIET)


def register() -> None:
    bpy.app.handlers.load_post.append(keep_looking)
    keep_looking("")


def unregister() -> None:
    bpy.app.handlers.load_post.remove(keep_looking)
    if bpy.app.timers.is_registered(look):
        bpy.app.timers.unregister(look)
