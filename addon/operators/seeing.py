"""Looking inside: a result cut open by a plane."""

from __future__ import annotations

import bpy
from bpy.props import EnumProperty

from ...solver.errors import Trouble
from .. import cutting, study, view
from .telling import TellsTrouble


def members_with_result(operator: type[bpy.types.Operator], context: bpy.types.Context) -> bool:
    """Whether the present study has a result to look at; the operator says so where it has none."""
    try:
        shown = all(view.has_result(part) for part in study.parts(context))
    except Trouble:
        shown = False
    if not shown:
        operator.poll_message_set("There is no result yet: press Run first")
    return shown


class CutOpen(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.cut_open"
    bl_label = "Cut Open"
    bl_description = "Cut the result by a plane to see the temperatures inside; move and turn the plane's arrow"
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return members_with_result(cls, context)

    def act(self, context: bpy.types.Context) -> None:
        cutting.open_up(context)


class _OfCut(TellsTrouble):
    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if cutting.plane_of(context.scene) is None:
            cls.poll_message_set("Nothing is cut open")
            return False
        return members_with_result(cls, context)


class TurnCut(_OfCut, bpy.types.Operator):
    bl_idname = "fluxface.turn_cut"
    bl_label = "Turn the Cut"
    bl_description = "Let the cutting plane look along an axis of the world; again: the other way"
    bl_options = {"REGISTER", "UNDO"}

    axis: EnumProperty(
        name="Along",
        description="The axis of the world that the plane looks along",
        items=[(axis, axis, f"Take away what lies towards {axis}") for axis in "XYZ"],
    )

    def act(self, context: bpy.types.Context) -> None:
        cutting.turn(context.scene, study.parts(context), self.axis)


class CloseCut(_OfCut, bpy.types.Operator):
    bl_idname = "fluxface.close_cut"
    bl_label = "Close the Cut"
    bl_description = "Show the result whole again and remove the cutting plane"
    bl_options = {"REGISTER", "UNDO"}

    def act(self, context: bpy.types.Context) -> None:
        cutting.close(context.scene)


class ShowTrueColours(bpy.types.Operator):
    bl_idname = "fluxface.show_true_colours"
    bl_label = "Show True Colours"
    bl_description = "Set the scene's view transform to Standard, so that colours are those of the legend"
    bl_options = {"REGISTER", "UNDO"}

    def execute(self, context: bpy.types.Context) -> set[str]:
        context.scene.view_settings.view_transform = view.TRUE_TRANSFORM
        context.scene.view_settings.look = "None"
        context.scene.view_settings.exposure, context.scene.view_settings.gamma = 0.0, 1.0
        return {"FINISHED"}


register, unregister = bpy.utils.register_classes_factory((ShowTrueColours, CutOpen, TurnCut, CloseCut))
