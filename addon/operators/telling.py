"""An operator whose trouble reaches the designer as one plain sentence."""

from __future__ import annotations

from collections.abc import Callable

import bpy

from ...solver.errors import Trouble
from .. import jobs, running
from ..language import report


def told(trouble: Trouble) -> str:
    return " ".join(report(sentence) for sentence in (trouble.message, trouble.mend) if sentence)


Finish = Callable[[jobs.Ending], Trouble | None]


class TellsTrouble:
    """Give ``act``; what it raises as Trouble is reported, and from a script it is raised as RuntimeError."""

    def act(self, context: bpy.types.Context) -> None:
        raise NotImplementedError

    def execute(self, context: bpy.types.Context) -> set[str]:
        try:
            self.act(context)
        except Trouble as trouble:
            self.report({"ERROR"}, told(trouble))
            return {"CANCELLED"}
        return {"FINISHED"}


class WorksBeside(TellsTrouble):
    """Give ``start``: in a window its job goes on beside the designer; from a script it is waited for.

    undo_step: the name of the step that is made when the job has ended.
    """

    undo_step = ""

    def start(self, context: bpy.types.Context) -> tuple[jobs.Job, Finish]:
        """The job under way, and what is to be done with its ending."""
        raise NotImplementedError

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if context.window_manager.fluxface.running:
            cls.poll_message_set("The solver is running")
            return False
        return True

    def invoke(self, context: bpy.types.Context, _event: bpy.types.Event) -> set[str]:
        if bpy.app.background:
            return self.execute(context)
        try:
            job, finish = self.start(context)
        except Trouble as trouble:
            self.report({"ERROR"}, told(trouble))
            return {"CANCELLED"}
        running.watch(job, finish, self.undo_step)
        return {"FINISHED"}

    def act(self, context: bpy.types.Context) -> None:
        job, finish = self.start(context)
        trouble = finish(running.wait(job))
        if trouble:
            raise trouble
