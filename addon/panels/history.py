"""The runs that are kept, and what was changed for each."""

from __future__ import annotations

import json
from typing import Any

import bpy

from ...solver.errors import Trouble
from .. import history, study
from ..language import label
from ..units import power_text, signed_difference_text, span_text, temperature_text
from .sidebar import Sidebar, pair, paragraph

ROUNDING = 1e-4  # a share of the surface that is not worth a sentence


class RunList(bpy.types.UIList):
    bl_idname = "FLUXFACE_UL_runs"

    def draw_item(self, context, layout, _left, run, _icon, _active, _property, _index) -> None:
        lines = layout.column(align=True)
        split = lines.split(factor=0.45)
        split.label(text=history.when(run))
        end = split.row()
        end.alignment = "RIGHT"
        end.label(text=f"{temperature_text(context.scene, run.hottest)}, {power_text(run.heat)}")
        lines.prop(run, "note", text="", emboss=False, placeholder="What was changed?")


class CompareMenu(bpy.types.Menu):
    bl_idname = "FLUXFACE_MT_compare"
    bl_label = "Compare This Run With"

    def draw(self, context: bpy.types.Context) -> None:
        left = study.outcome(context.scene, study.parts(context))
        self.layout.operator("fluxface.run_compare", text="What Is Shown Now")
        for run in list(left.runs)[: left.active_run]:
            self.layout.operator("fluxface.run_compare", text=history.when(run), translate=False).later = run.name


class RunsPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_runs"
    bl_label = "Earlier Runs"
    bl_options = {"DEFAULT_CLOSED"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        try:
            left = study.outcome(context.scene, study.parts(context))
        except Trouble:
            return False
        return bool(left.runs) or left.lost

    def draw(self, context: bpy.types.Context) -> None:
        layout, left = self.layout, study.outcome(context.scene, study.parts(context))
        if left.lost:
            paragraph(
                context,
                layout,
                label("The folder of the last result is not where it was ({folder}).", folder=left.folder),
                "ERROR",
            )
            paragraph(context, layout, "Put it back beside the file, or run again; the colours shown are still its.")
        row = layout.row()
        row.template_list("FLUXFACE_UL_runs", "", left, "runs", left, "active_run", rows=3)
        buttons = row.column(align=True)
        buttons.operator("fluxface.run_folder", text="", icon="FILE_FOLDER")
        buttons.operator("fluxface.run_log", text="", icon="TEXT")
        buttons.operator("fluxface.run_forget", text="", icon="TRASH")
        if left.comparison:
            _draw_comparison(context, layout, json.loads(left.comparison))
        else:
            layout.menu(CompareMenu.bl_idname, icon="ARROW_LEFTRIGHT")
        paragraph(context, layout, label("The latest {count} are kept beside the file.", count=history.KEPT))


def _draw_comparison(context: bpy.types.Context, layout: bpy.types.UILayout, told: dict[str, Any]) -> None:
    box = layout.box()
    paragraph(context, box, _compared(told))
    column = box.column(align=True)
    for row in told["rows"]:
        change = signed_difference_text(context.scene, row["now"] - row["then"])
        pair(column, row["name"], f"{span_text(context.scene, row['then'], row['now'])}  ({change})")
    if told["known"] < 1 - ROUNDING:
        share = f"{100 * (1 - told['known']):.2g} %"
        paragraph(
            context, box, label("{share} of the surface was not there then, and is shown grey.", share=share), "INFO"
        )
    box.operator("fluxface.end_comparison", icon="X")


def _compared(told: dict[str, Any]) -> str:
    run = ", ".join(filter(None, (told["since"], told["note"])))
    return (
        label("From {run} to {until}", run=run, until=told["until"])
        if told["until"]
        else label("Compared with {run}", run=run)
    )


register, unregister = bpy.utils.register_classes_factory((RunList, CompareMenu, RunsPanel))
