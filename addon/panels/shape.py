"""The active part's shape: its measures, and what is amiss with it."""

from __future__ import annotations

import bpy

from .. import inspection, study
from ..units import area_text, length_text, mass_text, volume_text
from .sidebar import Sidebar, pair, paragraph

ICONS = {"error": "CANCEL", "warning": "ERROR", "note": "INFO"}


class ShapePanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_shape"
    bl_parent_id = "FLUXFACE_PT_study"
    bl_label = "Shape"

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        part = study.active_part(context)
        return part is not None and bool(part.fluxface.body)

    def draw(self, context: bpy.types.Context) -> None:
        layout, scene, part = self.layout, context.scene, study.active_part(context)
        settings = part.fluxface
        column = layout.column(align=True)
        pair(column, "Size", " × ".join(length_text(scene, length) for length in settings.extent))
        pair(column, "Volume", volume_text(scene, settings.volume))
        pair(column, "Surface", area_text(scene, settings.surface))
        if settings.material.density > 0.0:
            pair(column, "Mass", mass_text(scene, settings.volume * settings.material.density))
        if settings.recovered:
            paragraph(
                context, layout, "Tags were carried over to the new shape from the old one: look at them.", "ERROR"
            )
        found = inspection.findings(part)
        if not inspection.is_current(part):
            layout.label(
                text="Being looked at" if found or not settings.inspected else "Changed; being looked at",
                icon="SORTTIME",
            )
        elif not found:
            layout.label(text="Nothing is amiss with it", icon="CHECKMARK")
        for number, finding in enumerate(found):
            _draw_finding(context, layout, number, finding, inspection.is_current(part))
        if any(finding["severity"] == "error" for finding in found):
            layout.operator("fluxface.mend", icon="MODIFIER")
            paragraph(context, layout, "A run mends it for itself, and leaves the mesh as it is.")
        if context.window_manager.fluxface.mended:
            paragraph(context, layout, context.window_manager.fluxface.mended, "INFO")


def _draw_finding(
    context: bpy.types.Context, layout: bpy.types.UILayout, number: int, finding: inspection.Finding, current: bool
) -> None:
    box = layout.box()
    box.active = current
    paragraph(context, box, finding["message"], ICONS[finding["severity"]])
    if finding["mend"]:
        paragraph(context, box, finding["mend"])
    if finding["faces"] or finding["points"]:
        box.operator("fluxface.finding_show", icon="VIEWZOOM").which = number


register, unregister = bpy.utils.register_classes_factory((ShapePanel,))
