"""Run, cancel, and look at the place of a trouble."""

from __future__ import annotations

import json

import bpy

from .. import jobs, places, running, study
from ..language import report
from .telling import Finish, TellsTrouble, WorksBeside


class RunSolver(WorksBeside, bpy.types.Operator):
    bl_idname = "fluxface.run"
    bl_label = "Run"
    bl_description = "Solve for the temperatures of the part; work can go on meanwhile"
    # The undo step is made when the result is there.
    bl_options = {"REGISTER"}
    undo_step = "Temperatures"

    def start(self, context: bpy.types.Context) -> tuple[jobs.Job, Finish]:
        run = running.start(context)
        return run.job, lambda ending: running.finish(run, ending)


class CancelRun(bpy.types.Operator):
    bl_idname = "fluxface.cancel"
    bl_label = "Cancel"
    bl_description = "Stop the solver; the result shown so far stays"

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if not context.window_manager.fluxface.running:
            cls.poll_message_set("The solver is not running")
            return False
        return True

    def execute(self, context: bpy.types.Context) -> set[str]:
        context.window_manager.fluxface.cancelled = True
        return {"FINISHED"}


class ShowPlace(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.show_place"
    bl_label = "Show the Place"
    bl_description = "Bring the view and the 3D cursor to the trouble, and select the faces it names"
    bl_options = {"REGISTER", "UNDO"}

    def act(self, context: bpy.types.Context) -> None:
        members = study.parts(context)
        left = study.outcome(context.scene, members)
        named = [part for part in members if f"'{part.name}'" in left.message] or members
        if not places.show(context, named[0], json.loads(left.faces or "[]"), json.loads(left.points or "[]")):
            self.report({"INFO"}, report(places.ELSEWHERE))


register, unregister = bpy.utils.register_classes_factory((RunSolver, CancelRun, ShowPlace))
