"""Which objects are the parts, and how they are solved."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble
from .. import study
from ..language import label
from .sidebar import Sidebar, fields, named, paragraph


class StudyPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_study"
    bl_label = "Parts"

    def draw(self, context: bpy.types.Context) -> None:
        settings = context.scene.fluxface
        named(self.layout, "Collection").prop(settings, "collection", text="")
        try:
            members = study.parts(context)
        except Trouble as trouble:
            paragraph(context, self.layout, f"{trouble.message} {trouble.mend}", "INFO")
            return
        names = ", ".join(part.name for part in members)
        paragraph(
            context,
            self.layout,
            label("{count} parts: {names}", count=len(members), names=names)
            if len(members) > 1
            else label("Part: {names}", names=names),
        )
        left_out = study.left_out(context.scene)
        if left_out:
            told = label(
                "Left out, as no meshes: {names}. Object > Convert > Mesh makes parts of them.",
                names=", ".join(left_out),
            )
            paragraph(context, self.layout, told, "INFO")


class AccuracyPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_accuracy"
    bl_parent_id = "FLUXFACE_PT_study"
    bl_label = "Mesh and Units"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        settings = context.scene.fluxface
        column = fields(self.layout)
        named(column, "Degrees").prop(context.scene.unit_settings, "temperature_unit", text="")
        named(column, "Elements").prop(settings, "order", text="")
        column.separator()
        column.prop(settings, "size")
        column.prop(settings, "max_nodes")
        if settings.size == 0.0:
            column.label(text="Mesh size 0: chosen by the solver")
        column.separator()
        column.label(text="Gravity points along")
        column.row(align=True).prop(settings, "gravity", text="")


register, unregister = bpy.utils.register_classes_factory((StudyPanel, AccuracyPanel))
