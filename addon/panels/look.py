"""How the result is shown, and the picture and report of it."""

from __future__ import annotations

import bpy

from .. import cutting, view
from ..language import label
from .result import OfResult
from .sidebar import fields, named, paragraph


class LookPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_look"
    bl_label = "View and Picture"

    def draw(self, context: bpy.types.Context) -> None:
        _draw_settings(self.layout, context.scene)
        named(self.layout, "Render with").prop(view.settings_of(context.scene), "engine", text="")
        self.layout.prop(view.settings_of(context.scene), "caution")
        self.layout.operator("fluxface.render_picture", icon="RENDER_STILL")
        self.layout.operator("fluxface.write_report", icon="DOCUMENTS")


class SeveralPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_several"
    bl_parent_id = "FLUXFACE_PT_look"
    bl_label = "Views and Turntable"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        settings = view.settings_of(context.scene)
        self.layout.grid_flow(columns=2, align=True).prop(settings, "view_names")
        self.layout.operator("fluxface.render_views", icon="RENDER_STILL")
        column = self.layout.column(align=True)
        column.prop(settings, "turns")
        column.operator("fluxface.render_turntable", icon="RENDER_ANIMATION")


class LinesPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_lines"
    bl_parent_id = "FLUXFACE_PT_look"
    bl_label = "Lines and Marks"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        _draw_lines(fields(self.layout), context.scene)


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


def _draw_settings(layout: bpy.types.UILayout, scene: bpy.types.Scene) -> None:
    """The settings as rows of ``layout``."""
    settings = view.settings_of(scene)
    layout.row().prop(settings, "showing", expand=True)
    column = layout.column()
    column.use_property_split, column.use_property_decorate = True, False
    column.prop(settings, "colour_map")
    column.row().prop(settings, "range", expand=True)
    ends = column.column(align=True)
    ends.enabled = settings.range == "LOCKED"
    ends.prop(settings, "low")
    ends.prop(settings, "high")
    column.prop(settings, "legend")
    if settings.range == "LOCKED" and settings.low >= settings.high:
        layout.label(text="From is not below To, so one kelvin is shown.", icon="ERROR")
    elif settings.range == "LOCKED" and (settings.coldest < settings.low or settings.hottest > settings.high):
        unit = view.scale_of(scene).unit
        beyond = label(
            "Some surfaces lie beyond the range: {coldest} to {hottest}.",
            coldest=unit.text(settings.coldest),
            hottest=unit.text(settings.hottest),
        )
        layout.label(text=beyond, icon="INFO")
    if scene.view_settings.view_transform != view.TRUE_TRANSFORM:
        warning = layout.column(align=True)
        shifted = label("{transform} shifts the colours outside Solid.", transform=scene.view_settings.view_transform)
        warning.label(text=shifted, icon="INFO")
        warning.operator("fluxface.show_true_colours")


def _draw_lines(layout: bpy.types.UILayout, scene: bpy.types.Scene) -> None:
    """What is drawn over the surfaces, as rows of ``layout``."""
    settings = view.settings_of(scene)
    layout.prop(settings, "marks")
    layout.prop(settings, "isotherms")
    step = layout.row()
    step.active = settings.isotherms
    step.prop(settings, "isotherm_step")
    layout.prop(settings, "arrows")
    count = layout.row()
    count.active = settings.arrows
    count.prop(settings, "arrow_count")
    if settings.arrows and (settings.live or settings.compared):
        layout.label(text="Arrows show the flux of a run alone.", icon="INFO")


register, unregister = bpy.utils.register_classes_factory((LookPanel, LinesPanel, InsidePanel, SeveralPanel))
