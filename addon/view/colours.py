"""Colour maps: from a fraction of the range to a colour, and from a colour back to the fraction.

A map is a polyline through its stops in linear light, which is how the host's colour ramp blends, so that viewport,
picture and these functions agree. The maps are published, perceptually uniform and safe for colour-blind eyes; their
source and licence stand in ``colour_maps.json``.
"""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType

import numpy as np

DEFAULT_MAP, DIFFERENCE_MAP = "lipari", "vik"

# Linear light, of what has no value to show.
NO_VALUE = (0.21, 0.21, 0.21)

# How finely a map is sampled to find the fraction nearest to a colour.
SAMPLES = 2048


@dataclass(frozen=True)
class ColourMap:
    """kind: "sequential" or "diverging". stops: (S, 3) linear light 0..1, evenly spaced from coldest to hottest."""

    name: str
    looks: str
    kind: str
    stops: np.ndarray


@cache
def colour_maps() -> Mapping[str, ColourMap]:
    """The maps by name, in the order of the file."""
    document = json.loads((files(__package__) / "colour_maps.json").read_text("utf-8"))
    return MappingProxyType({row["name"]: _read_map(row) for row in document["maps"]})


def _read_map(row: Mapping[str, str]) -> ColourMap:
    stops = np.frombuffer(bytes.fromhex(row["stops"]), dtype=np.uint8).reshape(-1, 3) / 255.0
    return ColourMap(row["name"], row["looks"], row["kind"], linear_from_srgb(stops))


def linear_from_srgb(srgb: np.ndarray) -> np.ndarray:
    """Linear light from sRGB values, both 0..1 and of any shape (IEC 61966-2-1)."""
    return np.where(srgb <= 0.04045, srgb / 12.92, ((np.maximum(srgb, 0.04045) + 0.055) / 1.055) ** 2.4)


def srgb_from_linear(linear: np.ndarray) -> np.ndarray:
    """The inverse of :func:`linear_from_srgb`."""
    return np.where(linear <= 0.0031308, linear * 12.92, 1.055 * np.maximum(linear, 0.0031308) ** (1 / 2.4) - 0.055)


def colours_at(colour_map: ColourMap, fraction: np.ndarray) -> np.ndarray:
    """Linear-light colours (N, 3) at ``fraction`` (N,); beyond 0..1 the end colours."""
    places = np.linspace(0.0, 1.0, len(colour_map.stops))
    return np.stack([np.interp(fraction, places, channel) for channel in colour_map.stops.T], axis=-1)


def fractions_of(colour_map: ColourMap, srgb: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Read colours back: the fractions (N,) whose colours lie nearest to ``srgb`` (N, 3), and how far off each is (N,).

    Distances are Euclidean in sRGB. A large one says that the pixel shows something other than a temperature.
    """
    fraction = np.linspace(0.0, 1.0, SAMPLES)
    known = srgb_from_linear(colours_at(colour_map, fraction))
    # |a - b|^2 expanded, so that no (N, SAMPLES, 3) array is made.
    squared = (srgb**2).sum(axis=1)[:, None] - 2.0 * srgb @ known.T + (known**2).sum(axis=1)
    nearest = squared.argmin(axis=1)
    return fraction[nearest], np.linalg.norm(srgb - known[nearest], axis=1)
