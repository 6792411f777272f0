"""Probes: places that stay on a part and tell its temperature there, run after run; and what lies under the pointer.

A probe is an empty, child of its part, so that it is moved, copied, undone and saved as all else is.
"""

from __future__ import annotations

from collections.abc import Sequence

import bmesh
import bpy
import numpy as np
from mathutils import Vector
from mathutils.bvhtree import BVHTree

from . import view
from .view.result_object import local_surface, temperatures

MARK, READING, BEFORE = "fluxface_probe", "fluxface_reading", "fluxface_reading_before"
# Of the part's extent: how large a probe is drawn, and how far from the surface it may stand.
SIZE, FAR = 0.02, 0.02


class Surface:
    """A mesh of triangles that can be asked for the nearest place and for what a line of sight meets."""

    def __init__(self, mesh: bpy.types.Mesh) -> None:
        self.key = _key(mesh)
        self._places, self._triangles = local_surface(mesh)
        edited = bmesh.new()
        edited.from_mesh(mesh)
        self._tree = BVHTree.FromBMesh(edited)
        edited.free()

    def nearest(self, place: Vector) -> tuple[np.ndarray, np.ndarray, float]:
        """The corners (3,) of the triangle nearest to a place, their weights (3,) there, and how far off it is."""
        found, _, face, apart = self._tree.find_nearest(place)
        return *self._weighed(found, face), apart

    def met(self, origin: Vector, way: Vector) -> tuple[np.ndarray, np.ndarray, Vector] | None:
        """The corners and weights as above and the place, of what a line of sight meets first; None if nothing."""
        found, _, face, _ = self._tree.ray_cast(origin, way)
        return None if found is None else (*self._weighed(found, face), found)

    def _weighed(self, place: Vector, face: int) -> tuple[np.ndarray, np.ndarray]:
        corners = self._triangles[face]
        first, *sides = self._places[corners] - np.array(place)
        sides = np.array(sides) - first
        weights = np.linalg.lstsq(sides.T, -first, rcond=None)[0]
        return corners, np.array([1.0 - weights.sum(), *weights])


def _key(mesh: bpy.types.Mesh) -> tuple[int, int]:
    """A result brings a new mesh; a cut has other vertices each time."""
    return mesh.session_uid, len(mesh.vertices)


class Surfaces:
    """Each mesh made ready once."""

    def __init__(self) -> None:
        self._known: dict[str, Surface] = {}

    def of(self, shown: bpy.types.Object) -> Surface:
        known = self._known.get(shown.name)
        if known is None or known.key != _key(shown.data):
            known = self._known[shown.name] = Surface(shown.data)
        return known

    def forget(self) -> None:
        self._known.clear()


# One for the session, as trees are slow to make.
surfaces = Surfaces()


# Probes --------------------------------------------------------------------------------------------------------------


def probes(members: Sequence[bpy.types.Object]) -> list[bpy.types.Object]:
    """The probes of parts, by their names."""
    return sorted((child for part in members for child in part.children if child.get(MARK)), key=lambda one: one.name)


def put(part: bpy.types.Object, place: Sequence[float], name: str = "Probe") -> bpy.types.Object:
    """A probe at a ``place`` (3,) of the world, which reads the part's result there if there is one."""
    probe = bpy.data.objects.new(name, None)
    probe.empty_display_type = "SPHERE"
    probe.empty_display_size = SIZE * max(part.dimensions)
    probe.show_in_front = True
    probe[MARK] = True
    part.users_collection[0].objects.link(probe)
    probe.parent = part
    probe.matrix_parent_inverse = part.matrix_world.inverted_safe()
    probe.location = place
    view.settle(bpy.context.scene)
    read([part])
    return probe


def read(members: Sequence[bpy.types.Object], anew: bool = False) -> None:
    """Let probes tell the temperature where they stand. anew: of a new run, so that the last reading is kept beside."""
    for part in members:
        result = view.result_of(part)
        for probe in probes([part]) if result is not None else ():
            if anew:
                probe[BEFORE] = probe.get(READING, 0.0)
            probe[READING] = _reading(part, result, probe)


def _reading(part: bpy.types.Object, result: bpy.types.Object, probe: bpy.types.Object) -> float:
    """K, or 0 off the surface."""
    place = part.matrix_world.inverted_safe() @ probe.matrix_world.translation
    corners, weights, apart = surfaces.of(result).nearest(place)
    return float(temperatures(result)[corners] @ weights) if apart <= FAR * _extent(part) else 0.0


def _extent(part: bpy.types.Object) -> float:
    return float(np.ptp(np.array(part.bound_box), axis=0).max())


def reading(probe: bpy.types.Object) -> float | None:
    """K; None where it stands off its part's surface, or before a run."""
    return probe.get(READING) or None


def change(probe: bpy.types.Object) -> float | None:
    """K more than in the run before; None where one of the two is not known."""
    now, then = probe.get(READING), probe.get(BEFORE)
    return now - then if now and then else None


# Under the pointer ---------------------------------------------------------------------------------------------------


def under(
    members: Sequence[bpy.types.Object], origin: Vector, way: Vector
) -> tuple[bpy.types.Object, Vector, float] | None:
    """Of the shown results what a line of sight in the world meets first: its part, the place, K; None if nothing."""
    found = []
    for part in members:
        shown = view.shown_of(part)
        if shown is None or not shown.visible_get():
            continue
        turned = shown.matrix_world.inverted_safe()
        met = surfaces.of(shown).met(turned @ origin, (turned.to_3x3() @ way).normalized())
        if met is not None:
            corners, weights, place = met
            world = shown.matrix_world @ place
            found.append(((world - origin).length, part, world, float(temperatures(shown)[corners] @ weights)))
    return min(found, key=lambda one: one[0])[1:] if found else None
