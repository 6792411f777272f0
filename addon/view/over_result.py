"""What is drawn over a result in the 3D view: its isotherms, and where it is hottest and coldest."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import bpy
import numpy as np

from .lines import isotherms
from .result_object import local_surface, shown_values


@dataclass(frozen=True)
class Mark:
    """An end of a result: place and outward normal (3,) in its own axes, temperature in K."""

    place: np.ndarray
    normal: np.ndarray
    temperature: float


@dataclass(frozen=True)
class OverResult:
    """In the result's own axes. segments: (S, 2, 3), level: (S,) K."""

    segments: np.ndarray
    level: np.ndarray
    hottest: Mark
    coldest: Mark


def over_result(result: bpy.types.Object, levels: Sequence[float]) -> OverResult:
    places, triangles = local_surface(result.data)
    temperature = shown_values(result)
    segments, level = isotherms(places, triangles, temperature, levels)
    ends = (int(np.nanargmax(temperature)), int(np.nanargmin(temperature)))
    hottest, coldest = (Mark(places[end], _normal_at(end, places, triangles), float(temperature[end])) for end in ends)
    return OverResult(segments, level, hottest, coldest)


def _normal_at(vertex: int, places: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(3,) of the triangles that meet there, by their areas."""
    corners = places[triangles[(triangles == vertex).any(axis=1)]]
    vectors = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]).sum(axis=0)
    return vectors / max(float(np.linalg.norm(vectors)), 1e-300)


class OverResults:
    """Made when first asked for, and again after :meth:`forget`."""

    def __init__(self) -> None:
        self._made: dict[str, OverResult] = {}

    def of(self, result: bpy.types.Object, levels: Sequence[float]) -> OverResult:
        if result.name not in self._made:
            self._made[result.name] = over_result(result, levels)
        return self._made[result.name]

    def forget(self) -> None:
        self._made.clear()


# One for all views, as are the host's drawing handlers that ask it.
over_results = OverResults()
