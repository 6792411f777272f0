"""Triangulated surfaces: measures, and welding."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from ..case import Surface

# Vertices nearer than this share of the part's diagonal are one: far below any modelled feature, far above the
# rounding of single-precision coordinates. Common practice, no source.
WELD_TOLERANCE = 1e-6


def triangle_corners(surface: Surface) -> np.ndarray:
    """(F, 3, 3) corner positions, m."""
    return surface.vertices[surface.triangles]


def area_vectors(corners: np.ndarray) -> np.ndarray:
    """(F, 3) m2: along each triangle's normal, as long as its area; corners (F, 3, 3)."""
    return 0.5 * np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])


def areas(corners: np.ndarray) -> np.ndarray:
    """(F,) m2."""
    return np.linalg.norm(area_vectors(corners), axis=1)


def enclosed_volume(corners: np.ndarray) -> float:
    """m3 within outward-oriented triangles (F, 3, 3), by the divergence theorem."""
    local = corners - corners.reshape(-1, 3).mean(axis=0)
    return float(np.einsum("fi,fi->", local[:, 0], np.cross(local[:, 1], local[:, 2])) / 6.0)


def diagonal(vertices: np.ndarray) -> float:
    """m, of the bounding box."""
    return float(np.linalg.norm(np.ptp(vertices, axis=0)))


def winding_numbers(points: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """(P,) how often the triangles (F, 3, 3) wind about each point (P, 3): 1 inside a solid, 0 outside or in a cavity.

    Van Oosterom & Strackee, IEEE Trans. Biomed. Eng. 30 (1983) 125: the solid angle of a plane triangle.
    """
    to = corners[None] - points[:, None, None]
    a, b, c = to[:, :, 0], to[:, :, 1], to[:, :, 2]
    la, lb, lc = (np.linalg.norm(side, axis=-1) for side in (a, b, c))
    numerator = np.einsum("pfi,pfi->pf", a, np.cross(b, c))
    dot = [np.einsum("pfi,pfi->pf", u, v) for u, v in ((a, b), (b, c), (c, a))]
    denominator = la * lb * lc + dot[0] * lc + dot[1] * la + dot[2] * lb
    return np.arctan2(numerator, denominator).sum(axis=1) / (2.0 * np.pi)


def distances(points: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """(P,) m, of points (P, 3) from their triangles (P, 3, 3)."""
    sides = np.roll(corners, -1, axis=1) - corners
    offset = points[:, None] - corners
    normal = np.cross(sides[:, 0], sides[:, 1])
    square = np.maximum(np.einsum("pci,pci->pc", sides, sides), np.finfo(float).tiny)
    fraction = np.clip(np.einsum("pci,pci->pc", offset, sides) / square, 0, 1)
    from_sides = np.linalg.norm(offset - fraction[:, :, None] * sides, axis=2).min(axis=1)
    above = (np.einsum("pci,pi->pc", np.cross(sides, offset), normal) >= 0).all(axis=1)
    length = np.linalg.norm(normal, axis=1)
    from_plane = np.abs(np.einsum("pi,pi->p", offset[:, 0], normal)) / np.where(length > 0, length, 1.0)
    return np.where(above & (length > 0), from_plane, from_sides)


def one_part(surface: Surface, part: int) -> Surface:
    """The triangles of one part, with only the vertices that they use."""
    mine = surface.part == part
    used, triangles = np.unique(surface.triangles[mine], return_inverse=True)
    return Surface(
        vertices=surface.vertices[used],
        triangles=triangles.reshape(-1, 3).astype(np.int32),
        part=surface.part[mine],
        tag=surface.tag[mine],
        face=surface.face[mine],
    )


def united(surfaces: Sequence[Surface]) -> Surface:
    """The triangles of several surfaces as those of one, their vertices kept apart."""
    before = np.cumsum([0, *(len(surface.vertices) for surface in surfaces)])
    triangles = [surface.triangles + start for surface, start in zip(surfaces, before[:-1], strict=True)]
    return Surface(
        np.concatenate([surface.vertices for surface in surfaces]),
        np.concatenate(triangles).astype(np.int32),
        *(np.concatenate([getattr(surface, key) for surface in surfaces]) for key in ("part", "tag", "face")),
    )


def weld(surface: Surface, share: float = WELD_TOLERANCE) -> Surface:
    """Vertices within that share of the diagonal made one; triangles that collapse by it are dropped."""
    tolerance = share * diagonal(surface.vertices)
    near = cKDTree(surface.vertices).query_pairs(tolerance, output_type="ndarray")
    if len(near):
        count = len(surface.vertices)
        graph = coo_array((np.ones(len(near), bool), (near[:, 0], near[:, 1])), shape=(count, count))
        _, group = connected_components(graph, directed=False)
        _, first = np.unique(group, return_index=True)
        vertices, triangles = surface.vertices[first], group[surface.triangles].astype(np.int32)
    else:
        vertices, triangles = surface.vertices, surface.triangles
    a, b, c = triangles.T
    whole = (a != b) & (b != c) & (c != a)
    return Surface(vertices, triangles[whole], surface.part[whole], surface.tag[whole], surface.face[whole])


def centred(surface: Surface) -> tuple[Surface, np.ndarray, float]:
    """The surface moved to its centre and scaled to unit diagonal; the centre (3,) m and the diagonal m.

    Far from the origin, or very small, a predicate's tolerances would otherwise decide.
    """
    centre = 0.5 * (surface.vertices.min(axis=0) + surface.vertices.max(axis=0))
    scale = diagonal(surface.vertices)
    return replace(surface, vertices=(surface.vertices - centre) / scale), centre, scale
