"""The skin: the surfaces of all results that are seen together, in the world."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import bpy
import numpy as np
from mathutils import Vector
from mathutils.bvhtree import BVHTree

from .framing import Frame
from .result_object import places_and_triangles, shown_values

# How much nearer something must be to hide a place, as a share of the place's distance.
HIDING = 1e-4


@dataclass(frozen=True)
class Skin:
    """places: (P, 3) in the host's units. triangles: (T, 3), outward. temperature: (P,) K."""

    places: np.ndarray
    triangles: np.ndarray
    temperature: np.ndarray


def skin_of(results: Sequence[bpy.types.Object]) -> Skin:
    surfaces = [places_and_triangles(result) for result in results]
    starts = np.cumsum([0] + [len(places) for places, _ in surfaces])
    return Skin(
        places=np.concatenate([places for places, _ in surfaces]),
        triangles=np.concatenate([triangles + start for (_, triangles), start in zip(surfaces, starts, strict=False)]),
        temperature=np.concatenate([shown_values(result) for result in results]),
    )


def hottest_in_view(skin: Skin, frame: Frame) -> int | None:
    """The vertex (its index) that is the hottest of those that nothing hides from the eye; None where none is seen."""
    tree = BVHTree.FromPolygons(skin.places.tolist(), skin.triangles.tolist())
    eye = Vector(frame.eye)

    def seen(vertex: int) -> bool:
        way = Vector(skin.places[vertex]) - eye
        hit = tree.ray_cast(eye, way.normalized(), way.length * (1 - HIDING))
        return hit[0] is None

    order = np.argsort(-skin.temperature)[: np.isfinite(skin.temperature).sum()]  # what is not known comes last
    # Few are asked: the search ends at the first that is seen.
    return next((int(vertex) for vertex in order if seen(vertex)), None)
