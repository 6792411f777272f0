"""Closed surfaces for tests, built from nothing: outward-oriented triangles as the case holds them, in metres.

Every builder returns the surface of one part, all of it untagged; :func:`tagged` then gives tags to faces by where they
are and where they look, :func:`merged` makes several shells one part (a cavity is a shell turned :func:`inside_out`),
:func:`assembly` makes them parts of their own. Each flat piece that a builder names has its own face number, and the
mesher keeps the edges between those: a finer division of the surface grades the mesh.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from fluxface.solver.case import Surface
from fluxface.solver.geometry.surface import area_vectors, triangle_corners
from scipy.spatial import ConvexHull

# A choice of faces: centres (F, 3) m and unit normals (F, 3) in, (F,) bool out.
Where = Callable[[np.ndarray, np.ndarray], np.ndarray]

AXES = {"x": 0, "y": 1, "z": 2}


def surface_of(vertices: np.ndarray, triangles: np.ndarray, face: np.ndarray | None = None) -> Surface:
    """Vertices (V, 3) and triangles (F, 3) as one untagged part; face (F,): by default each triangle its own."""
    count = len(triangles)
    return Surface(
        vertices=np.asarray(vertices, dtype=np.float64),
        triangles=np.asarray(triangles, dtype=np.int32),
        part=np.zeros(count, np.int32),
        tag=np.full(count, -1, np.int32),
        face=np.asarray(np.arange(count) if face is None else face, dtype=np.int32),
    )


# Choosing and combining ----------------------------------------------------------------------------------------------


def centres_and_normals(surface: Surface) -> tuple[np.ndarray, np.ndarray]:
    """(F, 3) m the triangles' centres, and (F, 3) their unit outward normals."""
    corners = triangle_corners(surface)
    normals = area_vectors(corners)
    return corners.mean(axis=1), normals / np.linalg.norm(normals, axis=1, keepdims=True)


def tagged(surface: Surface, tag: int, where: Where) -> Surface:
    """The surface with ``tag`` on the triangles that ``where`` chooses; later tags replace earlier ones."""
    return replace(surface, tag=np.where(where(*centres_and_normals(surface)), tag, surface.tag).astype(np.int32))


def facing(direction: str) -> Where:
    """The faces that look along an axis of the world: '+x', '-z', ..."""
    unit = np.zeros(3)
    unit[AXES[direction[1]]] = 1.0 if direction[0] == "+" else -1.0
    return lambda centres, normals: normals @ unit > 1.0 - 1e-9


def within(low: Sequence[float], high: Sequence[float]) -> Where:
    """The faces whose centre lies in a box from ``low`` to ``high`` (m); use -inf and inf for no bound."""
    return lambda centres, normals: ((centres >= low) & (centres <= high)).all(axis=1)


def every(centres: np.ndarray, normals: np.ndarray) -> np.ndarray:
    """All faces."""
    return np.ones(len(centres), bool)


def merged(*surfaces: Surface) -> Surface:
    """Several shells as the surface of one part, face numbers and vertices kept apart."""
    return _concatenated(surfaces, [0] * len(surfaces))


def assembly(*surfaces: Surface) -> Surface:
    """Several surfaces as parts 0, 1, 2 ..., face numbers and vertices kept apart."""
    return _concatenated(surfaces, range(len(surfaces)))


def _concatenated(surfaces: Sequence[Surface], parts: Sequence[int]) -> Surface:
    vertices = np.cumsum([0] + [len(surface.vertices) for surface in surfaces[:-1]])
    faces = np.cumsum([0] + [surface.face.max() + 1 for surface in surfaces[:-1]])
    return Surface(
        vertices=np.concatenate([surface.vertices for surface in surfaces]),
        triangles=np.concatenate([s.triangles + shift for s, shift in zip(surfaces, vertices, strict=True)]),
        part=np.concatenate([np.full(len(s.part), part, np.int32) for s, part in zip(surfaces, parts, strict=True)]),
        tag=np.concatenate([surface.tag for surface in surfaces]),
        face=np.concatenate([s.face + shift for s, shift in zip(surfaces, faces, strict=True)]),
    )


def inside_out(surface: Surface) -> Surface:
    """The same triangles looking the other way: the wall of a cavity."""
    return replace(surface, triangles=surface.triangles[:, ::-1].copy())


def moved(
    surface: Surface, shift: Sequence[float] = (0, 0, 0), turn: np.ndarray | None = None, scale: float = 1.0
) -> Surface:
    """The surface scaled, then turned by a rotation matrix (3, 3), then shifted (m)."""
    matrix = scale * (np.eye(3) if turn is None else turn)
    return replace(surface, vertices=surface.vertices @ matrix.T + np.asarray(shift, dtype=float))


def rotation(axis: Sequence[float], degrees: float) -> np.ndarray:
    """(3, 3) rotation about ``axis``, by Rodrigues' formula."""
    x, y, z = np.asarray(axis, dtype=float) / np.linalg.norm(axis)
    cross = np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]])
    angle = np.radians(degrees)
    return np.eye(3) + np.sin(angle) * cross + (1.0 - np.cos(angle)) * cross @ cross


# Builders ------------------------------------------------------------------------------------------------------------


def box(size: Sequence[float], divisions: Sequence[int] = (1, 1, 1), at: Sequence[float] = (0, 0, 0)) -> Surface:
    """A box of ``size`` (m) whose lowest corner lies ``at``, its sides divided into equal rectangles."""
    lines = [low + np.linspace(0.0, length, count + 1) for low, length, count in zip(at, size, divisions, strict=True)]
    return blocks(*lines)


def blocks(x: np.ndarray, y: np.ndarray, z: np.ndarray, filled: np.ndarray | None = None) -> Surface:
    """The skin of the filled cells of a rectangular grid with lines at x, y, z (m); all cells if ``filled`` is None.

    filled: (len(x) - 1, len(y) - 1, len(z) - 1) bool. Each grid rectangle of the skin is a face of its own. Plates with
    a patch on them, finned blocks, ducts, L-shapes: choose the lines so that they lie on every boundary.
    """
    solid = np.ones((len(x) - 1, len(y) - 1, len(z) - 1), bool) if filled is None else np.asarray(filled, bool)
    padded = np.pad(solid, 1)
    cells = np.argwhere(solid)
    rectangles = []
    for axis in range(3):
        one, other = np.eye(3, dtype=int)[[(axis + 1) % 3, (axis + 2) % 3]]
        loop = np.array([0 * one, one, one + other, other])
        for way in (-1, 1):
            beyond = cells + 1
            beyond[:, axis] += way
            corners = cells[~padded[tuple(beyond.T)], None, :] + (loop if way > 0 else loop[::-1])
            corners[..., axis] += way > 0
            rectangles.append(corners)
    grid, index = np.unique(np.concatenate(rectangles).reshape(-1, 3), axis=0, return_inverse=True)
    vertices = np.stack([np.asarray(line, dtype=float)[grid[:, i]] for i, line in enumerate((x, y, z))], axis=1)
    return _from_rectangles(vertices, index.reshape(-1, 4))


def _from_rectangles(vertices: np.ndarray, rectangles: np.ndarray) -> Surface:
    triangles = rectangles[:, [0, 1, 2, 0, 2, 3]].reshape(-1, 3)
    return surface_of(vertices, triangles, np.repeat(np.arange(len(rectangles)), 2))


def prism(polygon: Sequence[Sequence[float]], height: float) -> Surface:
    """A convex polygon (n, 2) in the plane z = 0, m, raised by ``height``: wedges, hexagons, slices.

    Faces: 0 below, 1 above, then one for each side, from the polygon's point k to k + 1.
    """
    flat = np.asarray(polygon, dtype=float)
    if _signed_area(flat) < 0:
        flat = flat[::-1]
    count = len(flat)
    vertices = np.concatenate([np.c_[flat, np.zeros(count)], np.c_[flat, np.full(count, height)]])
    fan = np.stack([np.zeros(count - 2, int), np.arange(1, count - 1), np.arange(2, count)], axis=1)
    k, after = np.arange(count), np.roll(np.arange(count), -1)
    sides = np.stack([k, after, after + count, k, after + count, k + count], axis=1).reshape(-1, 3)
    face = np.concatenate([np.zeros(count - 2), np.ones(count - 2), np.repeat(2 + k, 2)])
    return surface_of(vertices, np.concatenate([fan[:, ::-1], fan + count, sides]), face)


def _signed_area(polygon: np.ndarray) -> float:
    x, y = polygon.T
    return float(0.5 * (x @ np.roll(y, -1) - y @ np.roll(x, -1)))


def revolved(profile: Sequence[Sequence[float]], around: int) -> Surface:
    """A profile of points (n, 2) as (radius, height), m, turned about the z axis in ``around`` facets.

    The profile is closed, or open with both ends on the axis (radius 0). Flat segments (one height) make one face
    each, the others a face for each facet; segment k, from point k to k + 1, has the numbers k * around onwards.
    """
    points = np.asarray(profile, dtype=float)
    if _signed_area(points) < 0:
        points = points[::-1]
    radius, height = points.T
    angle = 2.0 * np.pi * np.arange(around) / around
    ring = np.stack(
        [np.outer(radius, np.cos(angle)), np.outer(radius, np.sin(angle)), np.repeat(height[:, None], around, 1)], -1
    )
    number = np.arange(len(points) * around).reshape(len(points), around)
    # All of a ring on the axis is one vertex.
    number[radius == 0] = number[radius == 0, :1]
    start, end = number, np.roll(number, -1, axis=0)
    off_axis = (radius > 0) | (np.roll(radius, -1) > 0)
    quads = np.stack([start, np.roll(start, -1, axis=1), np.roll(end, -1, axis=1), end], axis=-1)[off_axis]
    flat = (height == np.roll(height, -1))[off_axis]
    face = np.flatnonzero(off_axis)[:, None] * around + np.where(flat[:, None], 0, np.arange(around))
    surface = _from_rectangles(ring.reshape(-1, 3), quads.reshape(-1, 4))
    triangles, face = surface.triangles, np.repeat(face.ravel(), 2)
    a, b, c = triangles.T
    whole = (a != b) & (b != c) & (c != a)
    used, triangles = np.unique(triangles[whole], return_inverse=True)
    return surface_of(surface.vertices[used], triangles.reshape(-1, 3), face[whole])


def polar(surface: Surface) -> Surface:
    """A surface given in (radius m, angle rad, height m), say by :func:`blocks`, bent to the sector that it describes.

    Triangles on the axis collapse there; welding drops them.
    """
    radius, angle, height = surface.vertices.T
    return replace(surface, vertices=np.stack([radius * np.cos(angle), radius * np.sin(angle), height], axis=1))


def cylinder(radius: float, height: float, around: int) -> Surface:
    """A faceted cylinder on the z axis, from z = 0 upwards, its corners on the radius (m)."""
    return revolved([(0, 0), (radius, 0), (radius, height), (0, height)], around)


def tube(inner: float, outer: float, height: float, around: int) -> Surface:
    """A faceted tube on the z axis, from z = 0 upwards, its corners on the radii (m)."""
    return revolved([(inner, 0), (outer, 0), (outer, height), (inner, height)], around)


def sphere(radius: float, subdivisions: int) -> Surface:
    """An icosahedron about the origin, divided ``subdivisions`` times, its corners on the radius (m)."""
    golden = (1.0 + np.sqrt(5.0)) / 2.0
    signs = np.array([(1, 1), (1, -1), (-1, 1), (-1, -1)]) * (1.0, golden)
    points = np.concatenate([np.roll(np.c_[np.zeros(4), signs], axis, axis=1) for axis in range(3)])
    triangles = hull(points).triangles
    for _ in range(subdivisions):
        points, triangles = _halved(points, triangles)
        points = points / np.linalg.norm(points, axis=1, keepdims=True)
    return surface_of(radius * points / np.linalg.norm(points, axis=1, keepdims=True), triangles)


def _halved(points: np.ndarray, triangles: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Each triangle cut into four at its mid-sides."""
    ends = np.sort(triangles[:, [0, 1, 1, 2, 2, 0]].reshape(-1, 2), axis=1)
    edges, side = np.unique(ends, axis=0, return_inverse=True)
    ab, bc, ca = (len(points) + side.reshape(-1, 3)).T
    a, b, c = triangles.T
    finer = np.stack([a, ab, ca, ab, b, bc, ca, bc, c, ab, bc, ca], axis=1).reshape(-1, 3)
    return np.concatenate([points, points[edges].mean(axis=1)]), finer


def refined(surface: Surface) -> Surface:
    """Each triangle cut into four at its mid-sides: the same shape, and every quarter a face of its own."""
    vertices, triangles = _halved(surface.vertices, surface.triangles)
    return replace(surface_of(vertices, triangles), part=np.repeat(surface.part, 4), tag=np.repeat(surface.tag, 4))


def hollow_sphere(inner: float, outer: float, subdivisions: int) -> Surface:
    """A sphere with a concentric cavity, corners on the radii (m)."""
    return merged(sphere(outer, subdivisions), inside_out(sphere(inner, subdivisions)))


def hull(points: np.ndarray) -> Surface:
    """The convex hull of points (P, 3), m, none of them inside: an irregular solid, each triangle a face of its own."""
    found = ConvexHull(points)
    corners = points[found.simplices]
    outward = np.einsum(
        "fi,fi->f", np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), found.equations[:, :3]
    )
    return surface_of(points, np.where((outward < 0)[:, None], found.simplices[:, ::-1], found.simplices))


def irregular_solid(seed: int = 3, corners: int = 14, size: float = 0.1) -> Surface:
    """The hull of random points on a squeezed sphere of diameter ``size`` (m): no faces alike, none along an axis."""
    directions = np.random.default_rng(seed).normal(size=(corners, 3))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    return hull(0.5 * size * directions * (1.0, 0.7, 0.5))
