"""What the last run found: temperatures, watts and where they go."""

from __future__ import annotations

from typing import Any

import bpy

from ...solver.errors import Trouble
from ...solver.result import Summary
from .. import study, words
from ..language import label
from ..units import area_text, difference_text, power_text, span_text, temperature_text
from .sidebar import Sidebar, pair, paragraph


def present(context: bpy.types.Context) -> Summary | None:
    """The summary of the present study's last run."""
    try:
        return study.summary(study.outcome(context.scene, study.parts(context)))
    except Trouble:
        return None


class OfResult(Sidebar):
    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return present(context) is not None


class _OfSeveral(Sidebar):
    bl_parent_id = "FLUXFACE_PT_result"

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        summary = present(context)
        return summary is not None and len(summary["parts"]) > 1


class ResultPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_result"
    bl_label = "Temperatures"

    def draw(self, context: bpy.types.Context) -> None:
        layout, summary = self.layout, present(context)
        column = layout.column(align=True)
        for end in ("hottest", "coldest"):
            where = f" on {summary[end]['part']}" if len(summary["parts"]) > 1 else ""
            pair(column, end.capitalize() + where, temperature_text(context.scene, summary[end]["temperature"]))
        pair(column, "Heat in", power_text(summary["balance"]["in"]))
        pair(column, "Heat out", power_text(-summary["balance"]["out"]))
        for warning in summary["warnings"]:
            paragraph(context, layout, warning, "ERROR")
        for caution in words.CAUTIONS:
            paragraph(context, layout, caution, "INFO")


class WaysPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_ways"
    bl_parent_id = "FLUXFACE_PT_result"
    bl_label = "Where the Heat Goes"

    def draw(self, context: bpy.types.Context) -> None:
        for sentence in present(context).get("where_heat_goes", []):
            paragraph(context, self.layout, sentence)


class TagRowsPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_tag_rows"
    bl_parent_id = "FLUXFACE_PT_result"
    bl_label = "By Face Tag"

    def draw(self, context: bpy.types.Context) -> None:
        for row in present(context)["tags"]:
            column = self.layout.box().column(align=True)
            pair(column, row["name"], words.heat_through(row["heat"]))
            _draw_temperatures(context, column, row)
            if row["film"]:
                pair(column, "Film", f"{row['film']:.3g} W/m²K")


class PartRowsPanel(_OfSeveral, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_part_rows"
    bl_label = "By Part"

    def draw(self, context: bpy.types.Context) -> None:
        for row in present(context)["parts"]:
            column = self.layout.box().column(align=True)
            pair(column, row["name"], label("{power} inside", power=power_text(row["heat"])) if row["heat"] else "")
            _draw_temperatures(context, column, row)


class ContactRowsPanel(_OfSeveral, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_contact_rows"
    bl_label = "By Contact"

    def draw(self, context: bpy.types.Context) -> None:
        for row in present(context)["contacts"]:
            column = self.layout.box().column(align=True)
            first, second = row["parts"] if row["heat"] >= 0 else reversed(row["parts"])
            pair(column, label("{first} to {second}", first=first, second=second), power_text(abs(row["heat"])))
            pair(column, "Drop", difference_text(context.scene, abs(row["drop"])))
            pair(column, "Area", area_text(context.scene, row["area"]))


def _draw_temperatures(context: bpy.types.Context, column: bpy.types.UILayout, row: dict[str, Any]) -> None:
    if row["mean"] is None:
        column.label(text="covered by contacts")
        return
    pair(column, "Mean", temperature_text(context.scene, row["mean"]))
    pair(column, "Range", span_text(context.scene, row["min"], row["max"]))
    pair(column, "Area", area_text(context.scene, row["area"]))


register, unregister = bpy.utils.register_classes_factory(
    (ResultPanel, WaysPanel, TagRowsPanel, PartRowsPanel, ContactRowsPanel)
)
