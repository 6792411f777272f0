"""Usual surroundings of faces, to start from. Every figure is common practice, no source, and is to be looked at."""

from __future__ import annotations

from dataclasses import dataclass

from .properties import ROOM, Terms


@dataclass(frozen=True)
class Preset:
    """name: on the menu. about: what it stands for. coefficient: W/(m2 K). emissivity: None = no radiation."""

    name: str
    about: str
    coefficient: float
    ambient: float = ROOM
    emissivity: float | None = None


SKIN = 273.15 + 34.0

PRESETS = (
    Preset("Still Air, Bare Metal", "A room without a draught; metal hardly radiates", 5.0, emissivity=0.1),
    Preset("Still Air, Painted or Plastic", "A room without a draught; the surface radiates", 5.0, emissivity=0.9),
    Preset("Small Fan", "Air at some 2 m/s over the faces", 25.0),
    Preset("Strong Fan", "Air at some 8 m/s over the faces", 60.0),
    Preset("In a Hand", "Held by a hand of 34 °C: no answer to whether it may be touched", 50.0, SKIN),
    Preset("Still Water", "A tank of water at rest", 300.0),
    Preset("Running Water", "Water that is pumped past the faces", 2000.0),
)


def apply(terms: Terms, preset: Preset) -> None:
    """Give a tag the surroundings of a preset; its heat stays as it is."""
    terms.use_temperature = terms.insulated = False
    terms.use_convection, terms.film = True, "COEFFICIENT"
    terms.coefficient, terms.ambient = preset.coefficient, preset.ambient
    terms.use_radiation = preset.emissivity is not None
    if preset.emissivity is not None:
        terms.emissivity, terms.surroundings = preset.emissivity, preset.ambient
