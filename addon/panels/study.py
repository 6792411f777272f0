"""Which objects are the parts, and how they are solved."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble
from .. import study
from .sidebar import Sidebar, fields, paragraph


class StudyPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_study"
    bl_label = "Parts"

    def draw(self, context: bpy.types.Context) -> None:
        settings = context.scene.fluxface
        column = fields(self.layout)
        column.prop(settings, "collection", text="Collection")
        try:
            members = study.parts(context)
        except Trouble as trouble:
            paragraph(context, self.layout, f"{trouble.message} {trouble.mend}", "INFO")
            return
        names = ", ".join(part.name for part in members)
        paragraph(context, self.layout, f"{len(members)} parts: {names}" if len(members) > 1 else f"Part: {names}")


class AccuracyPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_accuracy"
    bl_parent_id = "FLUXFACE_PT_study"
    bl_label = "Mesh and Units"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        settings = context.scene.fluxface
        column = fields(self.layout)
        column.prop(settings, "order")
        column.prop(settings, "size")
        if settings.size == 0.0:
            column.label(text="0: chosen by the solver")
        column.prop(settings, "max_nodes")
        column.separator()
        column.prop(context.scene.unit_settings, "temperature_unit", text="Temperatures in")
        column.prop(settings, "gravity", text="Gravity")


register, unregister = bpy.utils.register_classes_factory((StudyPanel, AccuracyPanel))
