"""The active part's shape: its measures, and what is amiss with it."""

from __future__ import annotations

import bpy

from .. import inspection, study
from ..glance import Finding
from ..overlay import tag_colours
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
        if settings.notes:
            box = layout.box()
            for sentence in settings.notes.split("\n"):
                paragraph(context, box, sentence, "INFO")
            box.operator("fluxface.notes_dismiss")
        found = inspection.findings(part)
        told, icon = standing(part)
        layout.label(text=told, icon=icon)
        for number, finding in enumerate(found):
            _draw_finding(context, layout, number, finding)
        if any(finding["severity"] == "error" for finding in found):
            layout.operator("fluxface.mend", icon="MODIFIER")
            paragraph(context, layout, "A run mends a copy for itself where it can; this mends the mesh.")


def standing(part: bpy.types.Object) -> tuple[str, str]:
    """In a few words how the part's surface is, and an icon for it."""
    found = inspection.findings(part)
    if not tag_colours.knows(part):
        # An edit drops what is drawn at once, and the part is measured when the edit is over.
        return "Changed; being looked at", "SORTTIME"
    if not inspection.is_current(part):
        return ("Seen at a glance; being looked at" if found else "Sound at a glance; being looked at"), "SORTTIME"
    if any(finding["severity"] == "error" for finding in found):
        return "Not sound", "CANCEL"
    return "Sound", "CHECKMARK"


def _draw_finding(context: bpy.types.Context, layout: bpy.types.UILayout, number: int, finding: Finding) -> None:
    box = layout.box()
    paragraph(context, box, finding["message"], ICONS[finding["severity"]])
    if finding["mend"]:
        paragraph(context, box, finding["mend"])
    if finding["faces"] or finding["points"]:
        box.operator("fluxface.finding_show", icon="VIEWZOOM").which = number


register, unregister = bpy.utils.register_classes_factory((ShapePanel,))
