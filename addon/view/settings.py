"""How results are shown in a scene: colour map, range, legend, part or result; and keeping what is shown up to date."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import bpy
import numpy as np
from bpy.props import BoolProperty, EnumProperty, FloatProperty, IntProperty, PointerProperty, StringProperty

from ..host import redraw
from ..units import TEMPERATURE_UNITS
from . import arrows
from .colours import DEFAULT_MAP, DIFFERENCE_MAP, colour_maps
from .framing import VIEWS
from .legend import OF_TEMPERATURE, Words, of_difference
from .material import SHOWN, paint, set_range
from .over_result import over_results
from .result_object import (
    TEMPERATURE,
    colour,
    result_of,
    results_in,
    shown_in,
    shown_values,
    temperatures,
    write_shown,
)
from .scale import LEAST_SPAN, Scale, Unit, spanning
from .showing import apply_showing

TRUE_TRANSFORM = "Standard"


def _range_changed(settings: ViewSettings, _context: bpy.types.Context) -> None:
    # The automatic range is written into the same two numbers, and is no change of the designer's.
    if settings.range == "LOCKED":
        refresh(settings.id_data)


def _refreshed(settings: ViewSettings, _context: bpy.types.Context) -> None:
    refresh(settings.id_data)


def _lines_changed(_settings: ViewSettings, _context: bpy.types.Context) -> None:
    over_results.forget()
    redraw()


def _arrows_changed(settings: ViewSettings, _context: bpy.types.Context) -> None:
    arrows.refresh(settings.id_data)
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
            ("SHARED", "All Runs", "From the coldest to the hottest of all runs that are kept"),
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
    arrows: BoolProperty(
        name="Heat flow", description="Arrows along the heat flux, in the 3D view and in pictures; longer is more flux",
        default=False, update=_arrows_changed,
    )  # fmt: skip
    arrow_count: IntProperty(
        name="Arrows", description="About how many arrows there are on all that is shown",
        min=10, max=5000, default=200, update=_arrows_changed,
    )  # fmt: skip
    live: BoolProperty(options={"HIDDEN"}, description="Whether loads other than those of the run are shown")
    arrow_longest: FloatProperty(options={"HIDDEN"}, description="What the longest arrow stands for, W/m2; 0 = none")
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
    caution: BoolProperty(
        name="Caution in pictures", default=True,
        description="Write beneath a picture that it shows an estimate, and what decides where people may be hurt",
    )  # fmt: skip
    view_names: EnumProperty(
        name="Sides", description="The sides that Render Views shows the parts from", options={"ENUM_FLAG"},
        items=[(name, name.capitalize(), f"From the {name}" if name != "three-quarter" else "From before and above")
               for name in VIEWS],
        default={"front", "right", "top", "three-quarter"},
    )  # fmt: skip
    turns: IntProperty(
        name="Pictures",
        description="How many pictures a turntable takes, all the way around",
        default=24,
        min=2,
        max=720,
    )
    coldest: FloatProperty(options={"HIDDEN"}, description="Coldest surface of all results, kelvin")
    hottest: FloatProperty(options={"HIDDEN"}, description="Hottest surface of all results, kelvin")
    material: PointerProperty(type=bpy.types.Material, options={"HIDDEN"})
    compared: StringProperty(options={"HIDDEN"}, description="The run that is compared with, in words")
    shared_low: FloatProperty(options={"HIDDEN"}, description="Coldest of all kept runs, kelvin; 0 = none")
    shared_high: FloatProperty(options={"HIDDEN"}, description="Hottest of all kept runs, kelvin; 0 = none")
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
    """The scale that the results in the scene are shown by; as far to either side of no change in a comparison."""
    settings = settings_of(scene)
    unit = Unit(*TEMPERATURE_UNITS[scene.unit_settings.temperature_unit])
    if settings.compared:
        most = max(abs(settings.coldest), abs(settings.hottest), LEAST_SPAN)
        return Scale(-most, most, replace(unit, zero=0.0, signed=True), colour_maps()[DIFFERENCE_MAP])
    return spanning(settings.low, settings.high, unit, colour_maps()[settings.colour_map])


def words_of(scene: bpy.types.Scene) -> Words:
    compared = settings_of(scene).compared
    return of_difference(compared) if compared else OF_TEMPERATURE


def levels_of(scene: bpy.types.Scene) -> tuple[float, ...]:
    """Temperatures (K) of the isotherms; none where none are wanted."""
    settings, scale = settings_of(scene), scale_of(scene)
    return scale.levels(settings.isotherm_step * scale.unit.kelvin_per_degree) if settings.isotherms else ()


def refresh(scene: bpy.types.Scene) -> None:
    """Bring range, material and vertex colours in line with the settings and with the results in the scene."""
    fields = [field for result in results_in(scene) if np.isfinite(field := shown_values(result)).any()]
    if not fields:
        return
    settings = settings_of(scene)
    settings.coldest = min(float(np.nanmin(field)) for field in fields)
    settings.hottest = max(float(np.nanmax(field)) for field in fields)
    _span_all(scene)
    scale = scale_of(scene)
    paint(material_of(scene), scale)
    for result in {*results_in(scene), *shown_in(scene)}:
        colour(result, scale)
    arrows.refresh(scene)
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
    arrows.refresh(scene)
    over_results.forget()
    redraw()


def _span_all(scene: bpy.types.Scene) -> None:
    """Let an automatic range span all that is shown: the surfaces, what a cut shows inside, and the other runs."""
    settings = settings_of(scene)
    if settings.compared:
        return
    if settings.range == "SHARED" and settings.shared_high:
        settings.low, settings.high = settings.shared_low, settings.shared_high
    elif settings.range != "LOCKED":
        inside = [field for shown in shown_in(scene) if np.isfinite(field := shown_values(shown)).any()]
        settings.low = min([settings.coldest, *(float(np.nanmin(field)) for field in inside)])
        settings.high = max([settings.hottest, *(float(np.nanmax(field)) for field in inside)])


def show_difference(
    scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], change: Sequence[np.ndarray], since: str
) -> None:
    """Show on the results of ``parts`` how much hotter each vertex is (P,), K, than it was; NaN where nobody knows."""
    for part, values in zip(parts, change, strict=True):
        write_shown(result_of(part), values)
    settings_of(scene).compared = since
    refresh(scene)


def end_difference(scene: bpy.types.Scene) -> None:
    """Show temperatures again, where a comparison was shown."""
    if settings_of(scene).compared:
        settings_of(scene).compared = ""
        for result in results_in(scene):
            write_shown(result, temperatures(result))
        refresh(scene)


def share_range(scene: bpy.types.Scene, low: float, high: float) -> None:
    """Tell the coldest and the hottest, K, of all kept runs; 0 where none are kept."""
    settings = settings_of(scene)
    if (settings.shared_low, settings.shared_high) != (low, high):
        settings.shared_low, settings.shared_high = low, high
        if settings.range == "SHARED":
            refresh(scene)


def refresh_cut(scene: bpy.types.Scene) -> None:
    """Bring what a cut shows in line with the rest, quickly enough for a plane that is being moved."""
    _span_all(scene)
    scale = scale_of(scene)
    set_range(material_of(scene), scale)
    for shown in shown_in(scene):
        colour(shown, scale)
    arrows.refresh(scene)
    over_results.forget()
    redraw()


register_classes, unregister_classes = bpy.utils.register_classes_factory((ViewSettings,))


def register() -> None:
    register_classes()
    bpy.types.Scene.fluxface_view = PointerProperty(type=ViewSettings)


def unregister() -> None:
    del bpy.types.Scene.fluxface_view
    unregister_classes()
