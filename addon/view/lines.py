"""Lines that give form where the colours must not: edges, outlines and isotherms, as ribbons that face the eye.

A shaded surface would read as another temperature; a drawn line reads as a line. Line drawing from geometry rather than
from the picture keeps it in the same render: T. Saito and T. Takahashi, Comprehensible rendering of 3-D shapes,
SIGGRAPH (1990) gives the kinds of line, from memory.
"""

from __future__ import annotations

import math
from collections.abc import Iterable

import numpy as np

from .framing import Frame

# Facets of a rounded surface meet at less than this, edges of a design at more.
CREASE = math.radians(40.0)

# How far a ribbon stands before its surface, in its own widths, so that it is not cut by it.
LIFT = 2.5


def edges_of(triangles: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Edges (E, 2) between two of the triangles (T, 3), and those two (E, 2); other edges are left out."""
    sides = np.sort(triangles[:, ((0, 1), (1, 2), (2, 0))].reshape(-1, 2), axis=1)
    order = np.lexsort((sides[:, 1], sides[:, 0]))
    sides, faces = sides[order], order // 3
    first = np.concatenate([[True], (sides[1:] != sides[:-1]).any(axis=1)]).nonzero()[0]
    count = np.diff(np.append(first, len(sides)))
    pair = first[count == 2]
    return sides[pair], np.stack([faces[pair], faces[pair + 1]], axis=1)


def drawn_edges(places: np.ndarray, triangles: np.ndarray, eye: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Creases (C, 2) and outlines seen from ``eye`` (O, 2), as pairs of vertices of the surface."""
    edges, faces = edges_of(triangles)
    corners = places[triangles]
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normals /= np.maximum(np.linalg.norm(normals, axis=1, keepdims=True), 1e-300)
    first, second = normals[faces[:, 0]], normals[faces[:, 1]]
    sharp = (first * second).sum(axis=1) < math.cos(CREASE)
    facing = ((eye - corners[:, 0]) * normals).sum(axis=1) > 0
    outline = facing[faces[:, 0]] != facing[faces[:, 1]]
    seen = facing[faces].any(axis=1)
    return edges[sharp & seen & ~outline], edges[outline]


def isotherms(
    places: np.ndarray, triangles: np.ndarray, temperature: np.ndarray, levels: Iterable[float]
) -> tuple[np.ndarray, np.ndarray]:
    """Segments (S, 2, 3) along which the temperature (linear over each triangle) is a level, and that level (S,)."""
    at_corners = temperature[triangles]
    coldest, hottest = at_corners.min(axis=1), at_corners.max(axis=1)
    segments, at = [np.zeros((0, 2, 3))], [np.zeros(0)]
    for level in levels:
        crossed = np.flatnonzero((coldest <= level) & (hottest > level))
        segments.append(_isotherm(places[triangles[crossed]], at_corners[crossed], level))
        at.append(np.full(len(crossed), level))
    return np.concatenate(segments), np.concatenate(at)


def _isotherm(corners: np.ndarray, temperature: np.ndarray, level: float) -> np.ndarray:
    """Segments (S, 2, 3) across triangles of these corners (S, 3, 3), all of which the level crosses."""
    above = temperature > level
    # The corner that is alone on its side of the level: the segment runs between the two sides that meet there.
    alone = np.where((above.sum(axis=1) == 1)[:, None], above, ~above).argmax(axis=1)
    others = np.stack([(alone + 1) % 3, (alone + 2) % 3], axis=1)
    row = np.arange(len(corners))
    start, ends = temperature[row, alone], temperature[row[:, None], others]
    share = ((level - start)[:, None] / (ends - start[:, None]))[..., None]
    apex = corners[row, alone][:, None]
    return apex + share * (corners[row[:, None], others] - apex)


def outside(segments: np.ndarray, frame: Frame, pixel: np.ndarray, radius: float) -> tuple[np.ndarray, np.ndarray]:
    """What of the segments (S, 2, 3) lies outside a circle of the picture, and of which segment each piece is.

    pixel: (2,) the circle's centre, radius: pixels.
    """
    start, end = np.moveaxis(frame.pixels(segments), 1, 0)
    along, from_centre = end - start, start - pixel
    # |from_centre + t along| = radius
    a = np.maximum((along**2).sum(axis=1), 1e-12)
    b = (from_centre * along).sum(axis=1)
    c = (from_centre**2).sum(axis=1) - radius**2
    root = b**2 - a * c
    half = np.sqrt(np.maximum(root, 0.0))
    enters = np.where(root > 0, np.clip((-b - half) / a, 0, 1), 1.0)
    leaves = np.where(root > 0, np.clip((-b + half) / a, 0, 1), 1.0)
    spans = np.stack([np.stack([np.zeros_like(enters), enters], 1), np.stack([leaves, np.ones_like(leaves)], 1)])
    which = np.tile(np.arange(len(segments)), 2)
    spans = spans.reshape(-1, 2)
    kept = spans[:, 1] - spans[:, 0] > 1e-9
    which, spans = which[kept], spans[kept]
    whole = segments[which]
    # Shares of the way in the picture are not shares of the way in space: the nearer half looks longer.
    near, far = ((frame.eye - whole) @ frame.axes[2]).T[..., None]
    spans = spans * near / (far + spans * (near - far))
    return whole[:, :1] + spans[..., None] * (whole[:, 1:] - whole[:, :1]), which


def ribbons(segments: np.ndarray, frame: Frame, width: float) -> tuple[np.ndarray, np.ndarray]:
    """Strips ``width`` pixels wide along segments (S, 2, 3), facing the eye: places (4 S, 3), triangles (2 S, 3)."""
    along = segments[:, 1] - segments[:, 0]
    along /= np.maximum(np.linalg.norm(along, axis=1, keepdims=True), 1e-300)
    to_eye = frame.eye - segments
    across = np.cross(along[:, None], to_eye)
    across /= np.maximum(np.linalg.norm(across, axis=2, keepdims=True), 1e-300)
    half = 0.5 * width * frame.pixel_size(segments)[..., None]
    ends = segments + np.stack([-along, along], axis=1) * half
    # Along the line of sight, so that the ribbon stays where it is in the picture.
    ends = ends + to_eye / np.linalg.norm(to_eye, axis=2, keepdims=True) * 2 * LIFT * half
    places = np.stack([ends - across * half, ends + across * half], axis=2).reshape(-1, 3)
    quad = np.array([[0, 2, 3], [0, 3, 1]])
    return places, (4 * np.arange(len(segments))[:, None, None] + quad).reshape(-1, 3)
