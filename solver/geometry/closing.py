"""Which holes of a surface are closed, what is said of it, and which are left to the designer."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..case import Surface
from ..errors import Trouble
from .edges import boundary_sides, edges_of
from .holes import Hole, holes
from .surface import areas, triangle_corners
from .tidying import with_faces

# Shares of the surface. A hole up to SMALL is closed and told; closing a larger one is a guess at the shape, which is
# made with a warning where little can be wrong with it: the rim lies in a plane, or the volume that the open surface
# winds about is met (which whoever mends checks). Common practice, no source.
SMALL, ALL_SMALL = 0.03, 0.06
UNEVEN, ALL_UNEVEN = 0.06, 0.08
LEVEL, ALL_LEVEL = 0.25, 0.35
IN_A_PLANE = 1e-3  # of the hole's extent: how far its rim may lie from a plane


def closed(
    surface: Surface, name: str, centre: np.ndarray, scale: float
) -> tuple[Surface, tuple[str, ...], tuple[str, ...]]:
    """The surface, in its unit frame (at ``centre``, ``scale`` m), with its holes closed; what is said, and warned of.

    Small holes get the tag of a face beside them, large ones none. Raises Trouble of kind "geometry" where a hole is
    too large to guess at.
    """
    found = holes(surface.vertices, edges_of(surface.triangles))
    if not found:
        return surface, (), ()
    whole = float(areas(triangle_corners(surface)).sum())
    share = np.array([hole.area for hole in found]) / whole
    level = np.array([in_a_plane(surface.vertices[hole.vertices]) for hole in found])
    small = (share <= SMALL) & (share[share <= SMALL].sum() <= ALL_SMALL)
    uneven = ~level & ~small
    if (
        not all(len(hole.triangles) for hole in found)
        or share[uneven].max(initial=0) > UNEVEN
        or (uneven.any() and share[~level].sum() > ALL_UNEVEN)
        or share[level].max(initial=0) > LEVEL
        or share.sum() > ALL_LEVEL
    ):
        raise open_trouble(surface, name, centre, scale)
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


def open_trouble(surface: Surface, name: str, centre: np.ndarray, scale: float) -> Trouble:
    """That the surface, in its unit frame, is open, and where."""
    edges = edges_of(surface.triangles)
    sides = boundary_sides(edges)
    middles = 0.5 * (surface.vertices[edges.start[sides]] + surface.vertices[edges.end[sides]]) * scale + centre
    return Trouble(
        "geometry",
        f"The surface of '{name}' is open: {len(sides)} edges do not have a face on both sides.",
        "Close the holes there (select the edges and fill), give sheets a thickness, and run again.",
        np.unique(surface.face[sides // 3]).tolist(),
        middles.tolist(),
    )
