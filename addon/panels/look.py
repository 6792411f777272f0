"""How the result is shown, and the picture and report of it."""

from __future__ import annotations

import bpy

from .. import cutting, view
from .result import OfResult
from .sidebar import fields, named, paragraph


class LookPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_look"
    bl_label = "View and Picture"

    def draw(self, context: bpy.types.Context) -> None:
        view.draw_settings(self.layout, context.scene)
        named(self.layout, "Render with").prop(view.settings_of(context.scene), "engine", text="")
        self.layout.operator("fluxface.render_picture", icon="RENDER_STILL")
        self.layout.operator("fluxface.write_report", icon="DOCUMENTS")


class LinesPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_lines"
    bl_parent_id = "FLUXFACE_PT_look"
    bl_label = "Lines and Marks"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        view.draw_lines(fields(self.layout), context.scene)


class InsidePanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_inside"
    bl_parent_id = "FLUXFACE_PT_look"
    bl_label = "Inside"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        if cutting.plane_of(context.scene) is None:
            self.layout.operator("fluxface.cut_open", icon="MOD_BISECT")
            return
        row = self.layout.row(align=True)
        for axis in "XYZ":
            row.operator("fluxface.turn_cut", text=axis).axis = axis
        paragraph(context, self.layout, "Move and turn the arrow of the plane to cut elsewhere.")
        self.layout.operator("fluxface.close_cut", icon="X")


register, unregister = bpy.utils.register_classes_factory((LookPanel, LinesPanel, InsidePanel))
