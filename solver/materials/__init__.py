"""Materials: what a part is made of, and the built-in library of published values."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from itertools import pairwise
from types import MappingProxyType
from typing import Any

import numpy as np

from ..entries import Entry


@dataclass(frozen=True)
class Table:
    """A property over temperature (K): piecewise linear, held constant beyond its ends."""

    temperature: tuple[float, ...]
    value: tuple[float, ...]

    def __call__(self, temperature: np.ndarray) -> np.ndarray:
        """The property at ``temperature`` (K, any shape).

        Complex temperatures are allowed, so that the slope can be had by a complex step.
        """
        knots, values = np.array(self.temperature), np.array(self.value)
        interval = np.clip(np.searchsorted(knots, temperature.real, side="right") - 1, 0, len(knots) - 2)
        slope = (np.diff(values) / np.diff(knots))[interval]
        inside = (temperature.real >= knots[0]) & (temperature.real <= knots[-1])
        ends = np.where(temperature.real < knots[0], values[0], values[-1])
        return np.where(inside, values[interval] + slope * (temperature - knots[interval]), ends)


Property = float | Table


@dataclass(frozen=True)
class Material:
    """conductivity: W/(m K), one or three along the rows of ``axes``; density: kg/m3; heat_capacity: J/(kg K)."""

    name: str
    conductivity: tuple[Property, ...]
    axes: tuple[tuple[float, float, float], ...] | None = None
    density: float | None = None
    heat_capacity: Property | None = None


@dataclass(frozen=True)
class LibraryRow:
    """One material of the library; emissivity by finish, and where the values were published."""

    material: Material
    group: str
    emissivity: Mapping[str, float]
    source: str


@cache
def library() -> Mapping[str, LibraryRow]:
    """The built-in materials by name, in the order of the file (grouped, then by name)."""
    document = Entry(json.loads((files(__package__) / "library.json").read_text("utf-8")), "library")
    return MappingProxyType({row["name"].text(): _read_row(row) for row in document.each()})


def _read_row(row: Entry) -> LibraryRow:
    row.with_keys("name", "group", "conductivity", "density", "heat_capacity", "emissivity", "source")
    finishes = row["emissivity"]
    return LibraryRow(
        material=Material(
            name=row["name"].text(),
            conductivity=_read_conductivity(row["conductivity"]),
            density=row["density"].number("kg/m3", above=0),
            heat_capacity=_read_property(row["heat_capacity"], "J/(kg K)"),
        ),
        group=row["group"].text(),
        emissivity={finish: finishes[finish].number(at_least=0, at_most=1) for finish in finishes.value},
        source=row["source"].text(),
    )


def read_material(entry: Entry) -> Material:
    """The material of a part, from its JSON: given whole, or by its name in the library alone."""
    entry.with_keys("name", "conductivity", "axes", "density", "heat_capacity")
    name = entry["name"].text()
    if "conductivity" not in entry:
        if name not in library():
            raise entry["name"].trouble(
                f"is '{name}', which is not in the material library, and no conductivity is given",
                "Choose a material of the library or give its conductivity.",
            )
        return library()[name].material
    return Material(
        name=name,
        conductivity=_read_conductivity(entry["conductivity"]),
        axes=_read_axes(entry["axes"]) if "axes" in entry else None,
        density=entry["density"].number("kg/m3", above=0) if "density" in entry else None,
        heat_capacity=_read_property(entry["heat_capacity"], "J/(kg K)") if "heat_capacity" in entry else None,
    )


def material_as_json(material: Material) -> dict[str, Any]:
    """The inverse of :func:`read_material`."""
    along = [_property_as_json(value) for value in material.conductivity]
    whole = {
        "name": material.name,
        "conductivity": along[0] if len(along) == 1 else along,
        "axes": material.axes,
        "density": material.density,
        "heat_capacity": None if material.heat_capacity is None else _property_as_json(material.heat_capacity),
    }
    return {key: value for key, value in whole.items() if value is not None}


def _property_as_json(value: Property) -> Any:
    if isinstance(value, Table):
        return {"temperature": list(value.temperature), "value": list(value.value)}
    return value


def _read_conductivity(entry: Entry) -> tuple[Property, ...]:
    if isinstance(entry.value, list):
        return tuple(_read_property(along, "W/(m K)") for along in entry.each(3))
    return (_read_property(entry, "W/(m K)"),)


def _read_property(entry: Entry, unit: str) -> Property:
    """A positive number, or a table of positive numbers over increasing temperatures."""
    if not isinstance(entry.value, dict):
        return entry.number(unit, above=0)
    entry.with_keys("temperature", "value")
    temperature = tuple(knot.number("K", at_least=0) for knot in entry["temperature"].each())
    value = tuple(knot.number(unit, above=0) for knot in entry["value"].each(len(temperature)))
    if len(temperature) < 2:
        raise entry["temperature"].trouble("has fewer than two entries; a table needs at least two")
    if any(after <= before for before, after in pairwise(temperature)):
        raise entry["temperature"].trouble("does not increase from entry to entry")
    return Table(temperature, value)


def _read_axes(entry: Entry) -> tuple[tuple[float, float, float], ...]:
    axes = np.array([[component.number() for component in row.each(3)] for row in entry.each(3)])
    if not np.allclose(axes @ axes.T, np.eye(3), atol=1e-6):
        raise entry.trouble("is not three unit directions at right angles to each other")
    return tuple(tuple(row) for row in axes.tolist())
