"""Run, cancel, and look at the place of a trouble."""

from __future__ import annotations

import json

import bpy
import numpy as np
from mathutils import Vector

from .. import jobs, running, study, tags
from ..units import metres_per_unit
from .tagging import enter_edit_mode
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
    bl_description = "Put the 3D cursor at the trouble and select the faces it names"
    bl_options = {"REGISTER", "UNDO"}

    def act(self, context: bpy.types.Context) -> None:
        members = study.parts(context)
        left = study.outcome(context.scene, members)
        faces, points = (np.array(json.loads(text or "[]")) for text in (left.faces, left.points))
        if len(points):
            context.scene.cursor.location = Vector(points[0] / metres_per_unit(context.scene))
        named = [part for part in members if f"'{part.name}'" in left.message] or members
        if len(faces):
            _select(context, named[0], faces.astype(int))


def _select(context: bpy.types.Context, part: bpy.types.Object, faces: np.ndarray) -> None:
    """In edit mode; faces are numbered as modifiers left them, so those that the mesh does not have are left out."""
    if context.mode != "OBJECT":
        bpy.ops.object.mode_set(mode="OBJECT")
    enter_edit_mode(context, part)
    chosen = np.isin(np.arange(len(tags.read(part.data))), faces)
    tags.select(part.data, chosen)


register, unregister = bpy.utils.register_classes_factory((RunSolver, CancelRun, ShowPlace))
