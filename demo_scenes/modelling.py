"""Closed solids for the demo scenes: outlines lofted into shells, shells joined and cut by exact booleans.

Lengths are in whatever unit the scene models in. An outline is an (n, 2) array, anticlockwise.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import bmesh
import bpy
import numpy as np

# Every face remembers, through all booleans, the region of the shell it comes from.
REGION = "region"

# Where the two axes of an outline and the direction of the loft point, right-handed.
ALONG_X = ((0, 1, 0), (0, 0, 1), (1, 0, 0))
ALONG_Y = ((0, 0, 1), (1, 0, 0), (0, 1, 0))
ALONG_Z = ((1, 0, 0), (0, 1, 0), (0, 0, 1))


@dataclass(frozen=True)
class Shell:
    """A closed surface: vertices (n, 3), outward polygons, and the region its faces belong to."""

    vertices: np.ndarray
    polygons: list[tuple[int, ...]]
    region: int = 0


def rounded_rectangle(width: float, height: float, radius: float, segments: int) -> np.ndarray:
    """Outline of a rectangle about the origin, each corner an arc of ``segments`` pieces; (4 (segments + 1), 2)."""
    angles = np.linspace(0.0, np.pi / 2, segments + 1) + np.arange(4)[:, None] * np.pi / 2
    centres = np.array([[1, 1], [-1, 1], [-1, -1], [1, -1]]) * (width / 2 - radius, height / 2 - radius)
    arcs = radius * np.stack([np.cos(angles), np.sin(angles)], axis=-1)
    return (centres[:, None] + arcs).reshape(-1, 2)


def stadium(length: float, width: float, segments: int) -> np.ndarray:
    """Outline of a slot along the first axis with half-round ends of ``segments`` pieces; (2 (segments + 1), 2)."""
    angles = np.linspace(-np.pi / 2, np.pi / 2, segments + 1)
    end = width / 2 * np.stack([np.cos(angles), np.sin(angles)], axis=-1) + ((length - width) / 2, 0.0)
    return np.vstack([end, -end])


def circle(radius: float, segments: int) -> np.ndarray:
    """Outline of a regular polygon about the origin, its corners on the circle; (segments, 2)."""
    angles = np.arange(segments) * 2 * np.pi / segments
    return radius * np.stack([np.cos(angles), np.sin(angles)], axis=-1)


def loft(
    outlines: Sequence[np.ndarray],
    heights: Sequence[float],
    along: tuple[tuple[int, int, int], ...] = ALONG_Z,
    centre: tuple[float, float, float] = (0.0, 0.0, 0.0),
    region: int = 0,
) -> Shell:
    """The shell through ``outlines`` (each (n, 2)) at heights that never fall, closed by flat ends."""
    count, layers = len(outlines[0]), len(outlines)
    stacked = [np.column_stack([flat, np.full(count, height)]) for flat, height in zip(outlines, heights, strict=True)]
    ring = np.arange(count)
    following = np.roll(ring, -1)
    side = np.column_stack([ring, following, following + count, ring + count])
    sides = (side + np.arange(layers - 1)[:, None, None] * count).reshape(-1, 4)
    ends = [ring[::-1], ring + count * (layers - 1)]
    polygons = [tuple(polygon.tolist()) for polygon in (*ends, *sides)]
    return Shell(np.vstack(stacked) @ np.array(along, dtype=float) + centre, polygons, region)


def solid(name: str, shells: Sequence[Shell]) -> bpy.types.Object:
    """One mesh object, linked to the scene, of shells that do not touch each other."""
    starts = np.cumsum([0, *(len(shell.vertices) for shell in shells)]).tolist()
    polygons = [
        tuple(index + start for index in polygon)
        for start, shell in zip(starts, shells, strict=False)
        for polygon in shell.polygons
    ]
    mesh = bpy.data.meshes.new(name)
    mesh.from_pydata(np.vstack([shell.vertices for shell in shells]).tolist(), [], polygons)
    regions = np.repeat([shell.region for shell in shells], [len(shell.polygons) for shell in shells])
    mesh.attributes.new(REGION, "INT", "FACE").data.foreach_set("value", regions.astype(np.int32))
    made = bpy.data.objects.new(name, mesh)
    bpy.context.scene.collection.objects.link(made)
    return made


def combine(target: bpy.types.Object, operation: str, shells: Sequence[Shell]) -> None:
    """Join to, or cut from, ``target`` shells that do not touch each other: ``"UNION"`` or ``"DIFFERENCE"``."""
    other = solid(operation.lower(), shells)
    modifier = target.modifiers.new(operation, "BOOLEAN")
    modifier.operation, modifier.solver, modifier.object = operation, "EXACT", other
    evaluated = target.evaluated_get(bpy.context.evaluated_depsgraph_get())
    combined = bpy.data.meshes.new_from_object(evaluated)
    target.modifiers.remove(modifier)
    spent, target.data = (target.data, other.data), combined
    bpy.data.objects.remove(other)
    for mesh in spent:
        bpy.data.meshes.remove(mesh)
    combined.name = target.name
    _dissolve_flat(combined)


def _dissolve_flat(mesh: bpy.types.Mesh) -> None:
    """Take out the edges and corners that a boolean leaves inside flat faces and straight edges."""
    shape = bmesh.new()
    shape.from_mesh(mesh)
    bmesh.ops.dissolve_limit(shape, angle_limit=np.radians(0.02), verts=shape.verts, edges=shape.edges)
    shape.to_mesh(mesh)
    shape.free()


def region_of_faces(mesh: bpy.types.Mesh) -> np.ndarray:
    """(polygons,) the region each face comes from."""
    regions = np.empty(len(mesh.polygons), dtype=np.int32)
    mesh.attributes[REGION].data.foreach_get("value", regions)
    return regions


def face_normals(mesh: bpy.types.Mesh) -> np.ndarray:
    """(polygons, 3) unit normals in the object's own axes."""
    normals = np.empty(3 * len(mesh.polygons), dtype=np.float32)
    mesh.polygons.foreach_get("normal", normals)
    return normals.reshape(-1, 3)


def face_centres(mesh: bpy.types.Mesh) -> np.ndarray:
    """(polygons, 3) mean corners in the object's own axes."""
    centres = np.empty(3 * len(mesh.polygons), dtype=np.float32)
    mesh.polygons.foreach_get("center", centres)
    return centres.reshape(-1, 3)


def finish(made: bpy.types.Object) -> None:
    """Forget the regions, and shade what was meant round as round."""
    made.data.attributes.remove(made.data.attributes[REGION])
    made.data.shade_smooth()
    made.data.set_sharp_from_angle(angle=np.radians(38.0))
