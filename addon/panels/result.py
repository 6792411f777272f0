"""What the last run found: temperatures, watts and where they go."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble
from ...solver.result import Summary
from .. import study, words
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


class ResultPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_result"
    bl_label = "Temperatures"

    def draw(self, context: bpy.types.Context) -> None:
        layout, summary = self.layout, present(context)
        column = layout.column(align=True)
        several = len(summary["parts"]) > 1
        for end in ("hottest", "coldest"):
            where = f" on {summary[end]['part']}" if several else ""
            pair(column, end.capitalize() + where, temperature_text(context.scene, summary[end]["temperature"]))
        for tag in summary["tags"]:
            _draw_row(context, layout.box(), tag["name"], tag)
        if several:
            for part in summary["parts"]:
                _draw_row(context, layout.box(), part["name"], part)
        for contact in summary["contacts"]:
            _draw_contact(context, layout.box(), contact)
        _draw_balance(layout, summary)
        for warning in summary["warnings"]:
            paragraph(context, layout, warning, "ERROR")
        for caution in words.CAUTIONS:
            paragraph(context, layout, caution, "INFO")


def _draw_row(context: bpy.types.Context, box: bpy.types.UILayout, name: str, row: dict) -> None:
    column = box.column(align=True)
    pair(column, name, heat_text(row["heat"]))
    if row["mean"] is None:
        column.label(text="covered by contacts")
        return
    pair(column, "Mean", temperature_text(context.scene, row["mean"]))
    pair(column, "Range", span_text(context.scene, row["min"], row["max"]))
    pair(column, "Area", area_text(context.scene, row["area"]))
    if row.get("film"):
        pair(column, "Film", f"{row['film']:.3g} W/m²K")


def _draw_contact(context: bpy.types.Context, box: bpy.types.UILayout, contact: dict) -> None:
    first, second = contact["parts"] if contact["heat"] >= 0 else reversed(contact["parts"])
    column = box.column(align=True)
    pair(column, f"{first} to {second}", power_text(abs(contact["heat"])))
    pair(column, "Drop", difference_text(context.scene, abs(contact["drop"])))
    pair(column, "Area", area_text(context.scene, contact["area"]))


def heat_text(watts: float) -> str:
    """As in "12 W in": heat into the part is positive, and a sign alone leaves the direction to be guessed."""
    return f"{power_text(abs(watts))} {'in' if watts >= 0 else 'out'}"


def _draw_balance(layout: bpy.types.UILayout, summary: Summary) -> None:
    balance = summary["balance"]
    column = layout.column(align=True)
    pair(column, "Heat in", power_text(balance["in"]))
    pair(column, "Heat out", power_text(-balance["out"]))


class WaysPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_ways"
    bl_parent_id = "FLUXFACE_PT_result"
    bl_label = "Where the Heat Goes"

    def draw(self, context: bpy.types.Context) -> None:
        for sentence in present(context).get("where_heat_goes", []):
            paragraph(context, self.layout, sentence)


register, unregister = bpy.utils.register_classes_factory((ResultPanel, WaysPanel))
