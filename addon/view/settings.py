"""How results are shown in a scene: colour map, range, legend, part or result; and keeping what is shown up to date."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

import bpy
import numpy as np
from bpy.props import BoolProperty, EnumProperty, FloatProperty, PointerProperty, StringProperty

from ..host import redraw
from ..units import TEMPERATURE_UNITS
from .colours import DEFAULT_MAP, colour_maps
from .material import SHOWN, paint, set_range
from .over_result import over_results
from .result_object import (
    TEMPERATURE,
    colour,
    part_of,
    result_of,
    results_in,
    settle,
    shown_in,
    shown_of,
    temperatures,
)
from .scale import Scale, Unit, spanning

TRUE_TRANSFORM = "Standard"

# Solid shading in the results' own colours: no light on them, and form from the drawn ridges and valleys.
TRUE_SOLID = {"color_type": "VERTEX", "light": "FLAT", "show_cavity": True, "cavity_type": "SCREEN"}


def _range_changed(settings: ViewSettings, _context: bpy.types.Context) -> None:
    # The automatic range is written into the same two numbers, and is no change of the designer's.
    if settings.range == "LOCKED":
        refresh(settings.id_data)


def _refreshed(settings: ViewSettings, _context: bpy.types.Context) -> None:
    refresh(settings.id_data)


def _lines_changed(_settings: ViewSettings, _context: bpy.types.Context) -> None:
    over_results.forget()
    redraw()


def _showing_changed(settings: ViewSettings, _context: bpy.types.Context) -> None:
    apply_showing(settings.id_data)


class ViewSettings(bpy.types.PropertyGroup):
    """On the scene as ``fluxface_view``. Temperatures are kelvin and are drawn in the scene's unit."""

    showing: EnumProperty(
        name="Show",
        description="What stands in the scene: the part to be worked on, or its temperatures",
        items=(
            ("PART", "Part", "Show the parts, to be worked on; results are hidden"),
            ("RESULT", "Temperatures", "Show the results; the parts beneath them are hidden"),
        ),
        default="RESULT",
        update=_showing_changed,
    )
    colour_map: EnumProperty(
        name="Colours",
        description="Published maps, even to the eye and safe for colour-blind eyes; the coldest is the darkest",
        items=[(m.name, m.looks, m.name) for m in colour_maps().values() if m.kind == "sequential"],
        default=DEFAULT_MAP,
        update=_refreshed,
    )
    range: EnumProperty(
        name="Range",
        description="Which temperatures the colours span",
        items=(
            ("AUTOMATIC", "Automatic", "From the coldest to the hottest surface of all results in the scene"),
            ("LOCKED", "Locked", "From one given temperature to another, so that runs can be compared by eye"),
        ),
        default="AUTOMATIC",
        update=_refreshed,
    )
    low: FloatProperty(
        name="From", description="Temperature of the first colour", subtype="TEMPERATURE", unit="TEMPERATURE",
        min=0.0, default=293.15, update=_range_changed,
    )  # fmt: skip
    high: FloatProperty(
        name="To", description="Temperature of the last colour", subtype="TEMPERATURE", unit="TEMPERATURE",
        min=0.0, default=333.15, update=_range_changed,
    )  # fmt: skip
    legend: BoolProperty(
        name="Legend", description="Draw the legend in the 3D view", default=True, update=lambda _self, _c: redraw()
    )
    marks: BoolProperty(
        name="Hottest and coldest", description="Mark the hottest and the coldest place on the surfaces in the 3D view",
        default=True, update=lambda _self, _c: redraw(),
    )  # fmt: skip
    isotherms: BoolProperty(
        name="Isotherms", description="Draw lines of equal temperature, in the 3D view and in pictures",
        default=True, update=_lines_changed,
    )  # fmt: skip
    isotherm_step: FloatProperty(
        name="Degrees between", description="From one isotherm to the next, in the scene's degrees; 0 = as the legend",
        min=0.0, default=0.0, precision=2, update=_lines_changed,
    )  # fmt: skip
    engine: EnumProperty(
        name="Render with",
        description="What renders pictures; their colours are the same with each",
        items=(
            ("CYCLES", "Cycles", "With a soft shadow; needs no graphics card"),
            ("EEVEE", "Eevee", "With a soft shadow; quick where there is a graphics card"),
            ("WORKBENCH", "Workbench", "The quickest; without a shadow"),
        ),
        default="CYCLES",
    )
    coldest: FloatProperty(options={"HIDDEN"}, description="Coldest surface of all results, kelvin")
    hottest: FloatProperty(options={"HIDDEN"}, description="Hottest surface of all results, kelvin")
    material: PointerProperty(type=bpy.types.Material, options={"HIDDEN"})
    cut: PointerProperty(type=bpy.types.Object, options={"HIDDEN"}, description="The empty that cuts the results open")
    solid_before: StringProperty(options={"HIDDEN"}, description="How Solid shading was set before results, as JSON")


def settings_of(scene: bpy.types.Scene) -> ViewSettings:
    return scene.fluxface_view


def material_of(scene: bpy.types.Scene) -> bpy.types.Material:
    """The one material of all results in the scene, made when there is none."""
    settings = settings_of(scene)
    if settings.material is None:
        settings.material = bpy.data.materials.new("Temperature")
    return settings.material


def scale_of(scene: bpy.types.Scene) -> Scale:
    """The scale that the results in the scene are shown by."""
    settings = settings_of(scene)
    unit = Unit(*TEMPERATURE_UNITS[scene.unit_settings.temperature_unit])
    return spanning(settings.low, settings.high, unit, colour_maps()[settings.colour_map])


def levels_of(scene: bpy.types.Scene) -> tuple[float, ...]:
    """Temperatures (K) of the isotherms; none where none are wanted."""
    settings, scale = settings_of(scene), scale_of(scene)
    return scale.levels(settings.isotherm_step * scale.unit.kelvin_per_degree) if settings.isotherms else ()


def refresh(scene: bpy.types.Scene) -> None:
    """Bring range, material and vertex colours in line with the settings and with the results in the scene."""
    fields = [field for result in results_in(scene) if (field := temperatures(result)).size]
    if not fields:
        return
    settings = settings_of(scene)
    settings.coldest = min(float(field.min()) for field in fields)
    settings.hottest = max(float(field.max()) for field in fields)
    _span_all(scene)
    scale = scale_of(scene)
    paint(material_of(scene), scale)
    for result in {*results_in(scene), *shown_in(scene)}:
        colour(result, scale)
    over_results.forget()
    redraw()


def recolour(scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], temperature: Sequence[np.ndarray]) -> None:
    """Give the results of ``parts`` other temperatures (P,) K at their vertices, quickly enough for a drag."""
    settings, ends = settings_of(scene), []
    for part, values in zip(parts, temperature, strict=True):
        result = result_of(part)
        if result is None or len(result.data.vertices) != len(values):
            continue
        for name in (TEMPERATURE, SHOWN):
            result.data.attributes[name].data.foreach_set("value", values.astype(np.float32))
        ends += [float(values.min()), float(values.max())]
    if not ends:
        return
    settings.coldest, settings.hottest = min(ends), max(ends)
    _span_all(scene)
    scale = scale_of(scene)
    set_range(material_of(scene), scale)
    for result in results_in(scene):
        colour(result, scale)
    over_results.forget()
    redraw()


def _span_all(scene: bpy.types.Scene) -> None:
    """Let an automatic range span all that is shown: the surfaces, and what a cut shows of the inside."""
    settings = settings_of(scene)
    if settings.range == "AUTOMATIC":
        inside = [field for shown in shown_in(scene) if (field := temperatures(shown)).size]
        settings.low = min([settings.coldest, *(float(field.min()) for field in inside)])
        settings.high = max([settings.hottest, *(float(field.max()) for field in inside)])


def refresh_cut(scene: bpy.types.Scene) -> None:
    """Bring what a cut shows in line with the rest, quickly enough for a plane that is being moved."""
    _span_all(scene)
    scale = scale_of(scene)
    set_range(material_of(scene), scale)
    for shown in shown_in(scene):
        colour(shown, scale)
    over_results.forget()
    redraw()


def apply_showing(scene: bpy.types.Scene) -> None:
    """Hide the parts beneath their results or the results over their parts; other objects stay as they are."""
    settle(scene)  # what has just been made is in no view layer yet, and could not be hidden
    settings, results = settings_of(scene), results_in(scene)
    shown = settings.showing == "RESULT"
    for result in results:
        part = part_of(result)
        for object_ in {result, shown_of(part)}:
            _hide(scene, object_, not shown or object_ != shown_of(part))
        _hide(scene, part, shown)
    if results and shown:
        _colour_solid_views(settings)
    else:
        _restore_solid_views(settings)


def reveal(scene: bpy.types.Scene, part: bpy.types.Object) -> None:
    _hide(scene, part, False)


def _hide(scene: bpy.types.Scene, object_: bpy.types.Object, hidden: bool) -> None:
    object_.hide_render = hidden
    for layer in scene.view_layers:
        if object_.name in layer.objects:
            object_.hide_set(hidden, view_layer=layer)


def _colour_solid_views(settings: ViewSettings) -> None:
    """Set Solid shading to the true colours, except where it shows colours already in a way the designer chose."""
    before = json.loads(settings.solid_before or "{}")
    for view, shading in _shadings():
        if shading.color_type != TRUE_SOLID["color_type"]:
            before[view] = {name: getattr(shading, name) for name in TRUE_SOLID}
            _set(shading, TRUE_SOLID)
    settings.solid_before = json.dumps(before)


def _restore_solid_views(settings: ViewSettings) -> None:
    before = json.loads(settings.solid_before or "{}")
    for view, shading in _shadings():
        if view in before and shading.color_type == TRUE_SOLID["color_type"]:
            _set(shading, before[view])
    settings.solid_before = ""


def _set(shading: bpy.types.View3DShading, values: Mapping[str, Any]) -> None:
    for name, value in values.items():
        setattr(shading, name, value)


def _shadings() -> Iterator[tuple[str, bpy.types.View3DShading]]:
    """The shading of every 3D view of the file, with a name for it that lasts as long as the layout of the screen."""
    for screen in bpy.data.screens:
        for place, area in enumerate(screen.areas):
            yield from ((f"{screen.name}/{place}", space.shading) for space in area.spaces if space.type == "VIEW_3D")


def draw_settings(layout: bpy.types.UILayout, scene: bpy.types.Scene) -> None:
    """The settings as rows of ``layout``."""
    settings = settings_of(scene)
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
        unit = scale_of(scene).unit
        beyond = f"{unit.text(settings.coldest)} to {unit.text(settings.hottest)}"
        layout.label(text=f"Some surfaces lie beyond the range: {beyond}.", icon="INFO")
    if scene.view_settings.view_transform != TRUE_TRANSFORM:
        warning = layout.column(align=True)
        warning.label(text=f"{scene.view_settings.view_transform} shifts the colours outside Solid.", icon="INFO")
        warning.operator(ShowTrueColours.bl_idname)


def draw_lines(layout: bpy.types.UILayout, scene: bpy.types.Scene) -> None:
    """What is drawn over the surfaces, as rows of ``layout``."""
    settings = settings_of(scene)
    layout.prop(settings, "marks")
    layout.prop(settings, "isotherms")
    step = layout.row()
    step.active = settings.isotherms
    step.prop(settings, "isotherm_step")


class ShowTrueColours(bpy.types.Operator):
    bl_idname = "fluxface.show_true_colours"
    bl_label = "Show True Colours"
    bl_description = "Set the scene's view transform to Standard, so that colours are those of the legend"
    bl_options = {"REGISTER", "UNDO"}

    def execute(self, context: bpy.types.Context) -> set[str]:
        context.scene.view_settings.view_transform = TRUE_TRANSFORM
        context.scene.view_settings.look = "None"
        context.scene.view_settings.exposure, context.scene.view_settings.gamma = 0.0, 1.0
        return {"FINISHED"}


register_classes, unregister_classes = bpy.utils.register_classes_factory((ViewSettings, ShowTrueColours))


def register() -> None:
    register_classes()
    bpy.types.Scene.fluxface_view = PointerProperty(type=ViewSettings)


def unregister() -> None:
    del bpy.types.Scene.fluxface_view
    unregister_classes()
