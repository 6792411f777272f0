"""What the last run found: temperatures, watts and where they go."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble
from ...solver.result import Summary
from .. import study, view, words
from ..units import area_text, power_text, span_text, temperature_text
from .sidebar import Sidebar, pair, paragraph


def present(context: bpy.types.Context) -> Summary | None:
    """The summary of the present study's last run."""
    try:
        return study.summary(study.outcome(context.scene, study.parts(context)))
    except Trouble:
        return None


class _OfResult(Sidebar):
    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return present(context) is not None


class ResultPanel(_OfResult, bpy.types.Panel):
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
        _draw_balance(layout, summary)
        for warning in summary["warnings"]:
            paragraph(context, layout, warning, "ERROR")
        cautions = layout.column()
        cautions.active = False
        for caution in words.CAUTIONS:
            paragraph(context, cautions, caution)


def _draw_row(context: bpy.types.Context, box: bpy.types.UILayout, name: str, row: dict) -> None:
    column = box.column(align=True)
    pair(column, name, power_text(row["heat"]))
    if row["mean"] is None:
        column.label(text="covered by contacts")
        return
    pair(column, "Mean", temperature_text(context.scene, row["mean"]))
    pair(column, "Range", span_text(context.scene, row["min"], row["max"]))
    pair(column, "Area", area_text(context.scene, row["area"]))
    if row.get("film"):
        pair(column, "Film", f"{row['film']:.3g} W/m²K")


def _draw_balance(layout: bpy.types.UILayout, summary: Summary) -> None:
    balance = summary["balance"]
    column = layout.column(align=True)
    pair(column, "Heat in", power_text(balance["in"]))
    pair(column, "Heat out", power_text(-balance["out"]))


class WaysPanel(_OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_ways"
    bl_parent_id = "FLUXFACE_PT_result"
    bl_label = "Where the Heat Goes"

    def draw(self, context: bpy.types.Context) -> None:
        for sentence in words.ways_out(present(context)):
            paragraph(context, self.layout, sentence)


class LookPanel(_OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_look"
    bl_label = "Colours and Picture"

    def draw(self, context: bpy.types.Context) -> None:
        view.draw_settings(self.layout, context.scene)
        self.layout.operator("fluxface.render_picture", icon="RENDER_STILL")


register, unregister = bpy.utils.register_classes_factory((ResultPanel, WaysPanel, LookPanel))
