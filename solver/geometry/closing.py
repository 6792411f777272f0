"""Which holes of a surface are closed, what is said of it, and which are left to the designer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..case import Surface
from ..errors import Trouble
from .edges import boundary_sides, edges_of
from .holes import Hole, holes
from .surface import areas, triangle_corners
from .tidying import with_faces

IN_A_PLANE = 1e-3  # of the hole's extent: how far its rim may lie from a plane


@dataclass(frozen=True)
class Limits:
    """Shares of the surface: the largest hole that is closed, and all of them together.

    level: of holes whose rim lies in a plane. uneven: of others, where closing guesses at the shape.
    """

    level: float
    all_level: float
    uneven: float
    all_uneven: float


# Common practice, no source. What is closed on the designer's word gets a warning each, and whoever mends checks that
# the volume is the one that the open surface winds about.
UNASKED = Limits(0.03, 0.06, 0.03, 0.06)
ON_THEIR_WORD = Limits(0.25, 0.35, 0.06, 0.08)


def closed(
    surface: Surface, name: str, centre: np.ndarray, scale: float, limits: Limits
) -> tuple[Surface, tuple[str, ...], tuple[str, ...]]:
    """The surface, in its unit frame (at ``centre``, ``scale`` m), with its holes closed; what is said, and warned of.

    Small holes get the tag of a face beside them, large ones none. Raises Trouble of kind "geometry" where a hole is
    too large to guess at.
    """
    found = holes(surface.vertices, edges_of(surface.triangles))
    if not found:
        return surface, (), ()
    share = np.array([hole.area for hole in found]) / float(areas(triangle_corners(surface)).sum())
    level = np.array([in_a_plane(surface.vertices[hole.vertices]) for hole in found])
    closable = all(len(hole.triangles) for hole in found)
    if not (closable and _are_within(limits, share, level)):
        raise open_trouble(surface, name, centre, scale, closable and _are_within(ON_THEIR_WORD, share, level))
    small = (share <= UNASKED.level) & (share[share <= UNASKED.level].sum() <= UNASKED.all_level)
    made, said, warnings = surface, list[str](), list[str]()
    if small.any():
        made = with_faces(made, _triangles(found, small))
        said.append(f"Small holes were closed ({_count_and_share(share[small])}).")
    if not small.all():
        made = with_faces(made, _triangles(found, ~small), tagged=False)
        said.append(f"Large holes were closed and left without a tag ({_count_and_share(share[~small])}).")
        warnings = [
            _warning(surface.vertices[hole.vertices].mean(axis=0) * scale + centre, hole.area * scale**2, part, name)
            for hole, part, told in zip(found, share.tolist(), small.tolist(), strict=True)
            if not told
        ]
    return made, tuple(said), tuple(warnings)


def _are_within(limits: Limits, share: np.ndarray, level: np.ndarray) -> bool:
    uneven = share[~level]
    return bool(
        share.max() <= limits.level
        and share.sum() <= limits.all_level
        and uneven.max(initial=0) <= limits.uneven
        and uneven.sum() <= limits.all_uneven
    )


def _triangles(found: Sequence[Hole], some: np.ndarray) -> np.ndarray:
    return np.concatenate([found[index].triangles for index in np.flatnonzero(some)])


def _count_and_share(share: np.ndarray) -> str:
    return f"{len(share)}, {100 * share.sum():.2g} % of the surface"


def _warning(at: np.ndarray, area: float, share: float, name: str) -> str:
    x, y, z = (1e3 * at).tolist()
    return (
        f"A hole of {1e4 * area:.3g} cm2 ({100 * share:.2g} % of the surface) near ({x:.4g}, {y:.4g}, {z:.4g}) mm was "
        f"closed as if '{name}' were solid behind it; if the faces around it are a sheet, give them a thickness."
    )


def in_a_plane(points: np.ndarray) -> bool:
    """Whether points (n, 3) lie in one plane, but for a small share of their extent."""
    around = points - points.mean(axis=0)
    normal = np.linalg.svd(around, full_matrices=True)[2][2]
    return bool(np.abs(around @ normal).max() <= IN_A_PLANE * np.linalg.norm(np.ptp(points, axis=0)))


def open_trouble(surface: Surface, name: str, centre: np.ndarray, scale: float, on_their_word: bool) -> Trouble:
    """That the surface, in its unit frame, is open, and where; on_their_word: whether mending when asked would do."""
    edges = edges_of(surface.triangles)
    sides = boundary_sides(edges)
    middles = 0.5 * (surface.vertices[edges.start[sides]] + surface.vertices[edges.end[sides]]) * scale + centre
    return Trouble(
        "geometry",
        f"The surface of '{name}' is open: {len(sides)} edges do not have a face on both sides.",
        "Close the holes there (select the edges and fill), give sheets a thickness, "
        f"{'or have the mesh mended, which closes them, ' if on_their_word else ''}and run again.",
        np.unique(surface.face[sides // 3]).tolist(),
        middles.tolist(),
    )
