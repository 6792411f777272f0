"""Patches of a surface: faces reached from others across edges at which the surface does not turn much."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass

import bmesh
import bpy
import numpy as np

# Between unit normals in single precision: a flat face of many pieces is flat to about this.
ROUNDING = 1e-5

# Which of the faces ``beside`` (n,) may be reached from ``face`` (n,), where all began with ``seed`` (n,).
Joins = Callable[[np.ndarray, np.ndarray, np.ndarray], np.ndarray]


@dataclass(frozen=True)
class Facets:
    """The faces of a mesh and what lies beside them.

    normals: (F, 3) unit. start, count: (F,) where each face's sides begin among all, and how many it has. beside: (L,)
    the face across each side; -1 where there is none, several, or a hidden one.
    """

    normals: np.ndarray
    start: np.ndarray
    count: np.ndarray
    beside: np.ndarray

    def alike(self, one: np.ndarray, other: np.ndarray, angle: float) -> np.ndarray:
        """(n,) whether the faces ``one`` and ``other``, both (n,), look the same way to within ``angle`` (radians)."""
        chord = self.normals[one] - self.normals[other]
        return np.einsum("ni,ni->n", chord, chord) <= (2.0 * np.sin(0.5 * angle) + ROUNDING) ** 2


def flat_patch(facets: Facets, seeds: np.ndarray, angle: float) -> np.ndarray:
    """(F,) the seeds, (F,) bool, and what is joined to one and looks as it does to within ``angle`` (radians)."""
    return _reached(facets, seeds, lambda _face, beside, seed: facets.alike(seed, beside, angle))


def smooth_patch(facets: Facets, seeds: np.ndarray, angle: float) -> np.ndarray:
    """(F,) the seeds, (F,) bool, and all up to edges at which the surface turns by more than ``angle`` (radians)."""
    return _reached(facets, seeds, lambda face, beside, _seed: facets.alike(face, beside, angle))


def _reached(facets: Facets, seeds: np.ndarray, joins: Joins) -> np.ndarray:
    """Ring by ring about the seeds, each ring at once."""
    reached, front = seeds.copy(), np.flatnonzero(seeds)
    seed = np.arange(len(seeds))
    last = np.empty(len(seeds), np.int64)
    while len(front):
        count = facets.count[front]
        within = np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)
        face, beside = np.repeat(front, count), facets.beside[np.repeat(facets.start[front], count) + within]
        new = (beside >= 0) & ~reached[beside]
        face, beside = face[new], beside[new]
        joined = joins(face, beside, seed[face])
        face, beside = face[joined], beside[joined]
        # A face may be reached from several at once: the last of them counts.
        last[beside] = np.arange(len(beside))
        once = last[beside] == np.arange(len(beside))
        front = beside[once]
        reached[front], seed[front] = True, seed[face[once]]
    return reached


def facets_of(part: bpy.types.Object) -> Facets:
    """The faces of the part's own mesh as they are now, in edit mode too; they look as in the world."""
    with _as_it_is(part.data) as mesh:
        return _facets(mesh, np.array(part.matrix_world.to_3x3(), float))


@contextmanager
def _as_it_is(mesh: bpy.types.Mesh) -> Iterator[bpy.types.Mesh]:
    """The mesh, or in edit mode a copy: one that is brought up to date unasked confuses the host's undo."""
    if not mesh.is_editmode:
        yield mesh
        return
    copy = bpy.data.meshes.new(mesh.name)
    try:
        bmesh.from_edit_mesh(mesh).to_mesh(copy)
        yield copy
    finally:
        bpy.data.meshes.remove(copy)


def _facets(mesh: bpy.types.Mesh, matrix: np.ndarray) -> Facets:
    """matrix: (3, 3) from the mesh's axes to the world's."""
    sides, start = np.empty(len(mesh.loops), np.int32), np.empty(len(mesh.polygons), np.int32)
    normals, hidden = np.empty((len(start), 3), np.float32), np.zeros(len(start), bool)
    if len(start):
        mesh.attributes[".corner_edge"].data.foreach_get("value", sides)
        mesh.polygons.foreach_get("loop_start", start)
        mesh.polygon_normals.foreach_get("vector", normals.ravel())
    if (hiding := mesh.attributes.get(".hide_poly")) is not None:
        hiding.data.foreach_get("value", hidden)
    count = np.diff(start, append=np.int32(len(sides)))
    turned = normals @ np.linalg.pinv(matrix)
    turned /= np.maximum(np.linalg.norm(turned, axis=1, keepdims=True), 1e-300)
    return Facets(turned.astype(np.float32), start, count, _beside(sides, count, len(mesh.edges), hidden))


def _beside(sides: np.ndarray, count: np.ndarray, edges: int, hidden: np.ndarray) -> np.ndarray:
    """(L,) the face across each side. sides: (L,) the edge of each."""
    face = np.repeat(np.arange(len(count)), count)
    first, last = np.empty(edges, np.int64), np.empty(edges, np.int64)
    # Of several written to one place the last stays.
    first[sides[::-1]], last[sides] = face[::-1], face
    two = np.bincount(sides, minlength=edges) == 2
    across = np.where(face == first[sides], last[sides], first[sides])
    return np.where(two[sides] & ~hidden[across], across, -1)
