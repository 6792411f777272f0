"""Sentences and short texts: what a tag carries, how a run stands, where the heat goes."""

from __future__ import annotations

import bpy

from ..solver.result import Summary
from .properties import Terms
from .units import as_typed, power_text, short_temperature_text

WAYS = {"convection": "convection", "radiation": "radiation", "source": "heat drawn out", "held": "held temperature"}

CAUTIONS = (
    "An estimate for design. Film coefficients are uncertain by tens of per cent.",
    "Surfaces that people touch, batteries and mains parts are decided by measurement, local codes and licensed"
    " practice.",
)


def carries(scene: bpy.types.Scene, terms: Terms) -> str:
    """The terms of a tag in short, as in "12 W" or "8 W/m²K to 25 °C"; empty when it carries none."""
    texts = []
    if terms.use_temperature:
        texts.append(f"held at {short_temperature_text(scene, as_typed(terms.temperature))}")
    if terms.use_heat:
        texts.append(power_text(as_typed(terms.heat)))
    if terms.use_heat_flux:
        texts.append(f"{as_typed(terms.heat_flux):g} W/m²".replace("-", "−"))
    if terms.use_convection:
        to_one_room = terms.use_radiation and terms.surroundings == terms.ambient
        ambient = f" to {short_temperature_text(scene, as_typed(terms.ambient))}"
        texts.append(_film(terms) + ("" if to_one_room else ambient))
    if terms.use_radiation:
        surroundings = short_temperature_text(scene, as_typed(terms.surroundings))
        texts.append(f"ε {as_typed(terms.emissivity):g} to {surroundings}")
    return ", ".join(texts)


def _film(terms: Terms) -> str:
    if terms.film == "COEFFICIENT":
        return f"{as_typed(terms.coefficient):g} W/m²K"
    moving = terms.film in ("flat_plate_flow", "cylinder_crossflow")
    return f"{'moving' if moving else 'still'} {terms.fluid}"


def clash(terms: Terms) -> str:
    """The warning that two terms exclude each other, or nothing."""
    others = terms.use_heat or terms.use_heat_flux or terms.use_convection or terms.use_radiation
    return "A held temperature excludes every other term." if terms.use_temperature and others else ""


def ways_out(summary: Summary) -> list[str]:
    """Where the heat goes, largest share first, as in "81 % of 14 W leaves through fins (convection 55 %, ...)"."""
    total = summary["balance"]["in"]
    if not total > 0:
        return []
    leaving = []
    for tag in summary["tags"]:
        split = {way: -heat for way, heat in tag["split"].items() if heat < 0}
        if split:
            leaving.append((sum(split.values()) / total, tag["name"], split))
    return [
        f"{_share(share)} of {power_text(total)} leaves through {name}{_by_way(split, total)}."
        for share, name, split in sorted(leaving, key=lambda each: -each[0])
        if share >= 0.005
    ]


def _by_way(split: dict[str, float], total: float) -> str:
    ways = sorted(split.items(), key=lambda each: -each[1])
    if len(ways) == 1:
        return f" by {WAYS.get(ways[0][0], ways[0][0])}"
    return " (" + ", ".join(f"{WAYS.get(way, way)} {_share(heat / total)}" for way, heat in ways) + ")"


def _share(fraction: float) -> str:
    return f"{100 * fraction:.0f} %" if fraction > 0.0995 else f"{100 * fraction:.1f} %"
