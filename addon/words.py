"""Sentences and short texts: what a tag carries, and the cautions."""

from __future__ import annotations

import bpy

from ..solver.case import Convection, Tag
from .cases import as_tag
from .language import label
from .properties import ContactSettings, Terms
from .units import as_typed, metres_per_unit, power_text, short_temperature_text

CAUTIONS = (
    "An estimate for design. Film coefficients are uncertain by tens of per cent.",
    "Surfaces that people touch, batteries and mains parts are decided by measurement, local codes and licensed"
    " practice.",
)


def carries(scene: bpy.types.Scene, terms: Terms) -> str:
    """The terms of a tag in short, as in "12 W" or "8 W/m²K to 25 °C"; empty when it carries none."""
    return carried(scene, as_tag(terms, "", metres_per_unit(scene)))


def carries_or_not(scene: bpy.types.Scene, terms: Terms) -> str:
    """The same; where it carries none, whether that is meant."""
    if terms.insulated:
        return label("insulated")
    return carries(scene, terms) or label("nothing set: insulated")


def carried(scene: bpy.types.Scene, tag: Tag) -> str:
    """The same of a tag of a case."""
    texts = []
    if tag.temperature is not None:
        texts.append(label("held at {temperature}", temperature=short_temperature_text(scene, tag.temperature)))
    if tag.heat:
        texts.append(power_text(tag.heat))
    if tag.heat_flux:
        texts.append(f"{tag.heat_flux:g} W/m²".replace("-", "−"))
    if tag.convection:
        to_one_room = tag.radiation and tag.radiation.ambient == tag.convection.ambient
        film, ambient = _film(tag.convection), short_temperature_text(scene, tag.convection.ambient)
        texts.append(film if to_one_room else label("{film} to {ambient}", film=film, ambient=ambient))
    if tag.radiation:
        surroundings = short_temperature_text(scene, tag.radiation.ambient)
        texts.append(label("ε {share:g} to {ambient}", share=tag.radiation.emissivity, ambient=surroundings))
    return ", ".join(texts)


def _film(convection: Convection) -> str:
    if convection.coefficient is not None:
        return f"{convection.coefficient:g} W/m²K"
    moving = convection.correlation in ("flat_plate_flow", "cylinder_crossflow")
    fluid = label(convection.fluid or "air")
    return label("moving {fluid}", fluid=fluid) if moving else label("still {fluid}", fluid=fluid)


def clash(terms: Terms) -> str:
    """The warning that two terms exclude each other, or nothing."""
    if terms.insulated:
        return ""
    others = terms.use_heat or terms.use_heat_flux or terms.use_convection or terms.use_radiation
    return "A held temperature excludes every other term." if terms.use_temperature and others else ""


def crossing(scene: bpy.types.Scene, contact: ContactSettings) -> str:
    """How heat crosses a contact, as in "0.2 mm of 3 W/mK"."""
    if contact.crossing == "BONDED":
        return label("bonded")
    if contact.crossing == "CONDUCTANCE":
        return f"{as_typed(contact.conductance):g} W/m²K"
    if contact.crossing == "RESISTANCE":
        return f"{as_typed(contact.resistance):g} m²K/W"
    thickness = 1e3 * as_typed(contact.thickness) * metres_per_unit(scene)
    return label(
        "{thickness:.3g} mm of {conductivity:g} W/mK", thickness=thickness, conductivity=as_typed(contact.conductivity)
    )


def heat_through(watts: float) -> str:
    """As in "12 W in": heat into the part is positive, and a sign alone leaves the direction to be guessed."""
    power = power_text(abs(watts))
    if power_text(watts) == "0 W":
        return power
    return label("{power} in", power=power) if watts > 0 else label("{power} out", power=power)
