"""What a surface encloses, by winding numbers: also of open surfaces and of ones that run through themselves.

Jacobson, Kavan & Sorkine-Hornung, Robust inside-outside segmentation using generalized winding numbers, ACM Trans.
Graph. 32 (2013) 33. A surface with a boundary and a cone over that boundary close each other; the winding number of
the closed chain is the signed count of crossings along a ray, from which the cone's solid angle is taken away.
"""

from __future__ import annotations

import numpy as np

from .boxes import boxes, meeting
from .edges import boundary_sides, edges_of
from .holes import holes
from .surface import winding_numbers

COLUMNS = 192  # along each side of the grid of columns that measures a volume
SAMPLES_OF_COVER = 4000
LEVEL = 1e-6  # of a cover's extent: flatter ones enclose nothing
SAMPLES = 4_000_000  # solid angles and crossings treated at once; bounds the memory
# Any direction no modelled edge follows: rays along it do not run through edges.
ASKEW = np.linalg.qr(np.array([[0.29, -0.71, 0.37], [0.67, 0.41, -0.53], [-0.13, 0.61, 0.73]]))[0]


def closing_cone(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(K, 3, 3) the triangles between the surface's boundary and the boundary's middle; none if it is closed."""
    edges = edges_of(triangles)
    sides = boundary_sides(edges)
    start, end = vertices[edges.start[sides]], vertices[edges.end[sides]]
    middle = np.broadcast_to(start.mean(axis=0) if len(sides) else np.zeros(3), start.shape)
    return np.stack([end, start, middle], axis=1)


def windings(points: np.ndarray, vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(P,) the winding numbers about points (P, 3), none of them on the surface."""
    cone = closing_cone(vertices, triangles)
    return _crossings(points, np.concatenate([vertices[triangles], cone])) - _solid_angles(points, cone)


def wound_volume(vertices: np.ndarray, triangles: np.ndarray, reach: np.ndarray) -> float:
    """m3 about which the surface winds by more than one half; to a few tenths of a per cent.

    reach: (2, 3) m, the low and high corner of a box around it. Measured exactly along columns on a jittered grid over
    that box, the holes covered; what the covers make up is found by samples. Two surfaces measured over one box compare
    better than that, as they are met by the same columns.
    """
    covers = _covers(vertices, triangles)
    corners = np.concatenate([vertices[triangles], *covers])
    axes = np.argsort(-np.ptp(reach, axis=0), kind="stable")  # the columns run along the shortest side
    if np.linalg.det(np.eye(3)[axes]) < 0:
        axes = axes[[1, 0, 2]]
    return _along_columns(corners[:, :, axes], reach[:, axes]) - _made_up(covers, corners)


def _covers(vertices: np.ndarray, triangles: np.ndarray) -> list[np.ndarray]:
    """(K, 3, 3) for each hole: the triangles that close it."""
    covers = []
    for hole in holes(vertices, edges_of(triangles)):
        rim = vertices[hole.vertices]
        fan = np.stack([np.roll(rim, -1, axis=0), rim, np.broadcast_to(rim.mean(axis=0), rim.shape)], axis=1)
        covers.append(vertices[hole.triangles] if len(hole.triangles) else fan)
    return covers


def _made_up(covers: list[np.ndarray], closed: np.ndarray) -> float:
    """m3 by which what the closed chain of triangles (F, 3, 3) encloses exceeds what it winds about without its covers.

    A cover takes up more than half of the full solid angle only from within its convex hull, so samples in its box do.
    """
    boxes_of_covers = [(cover.min(axis=(0, 1)), np.ptp(cover, axis=(0, 1))) for cover in covers]
    uneven = [i for i, (_, extent) in enumerate(boxes_of_covers) if extent.min() > LEVEL * extent.max()]
    if not uneven:
        return 0.0
    spread = np.random.default_rng(2).random((SAMPLES_OF_COVER, 3))
    points = np.concatenate([boxes_of_covers[i][0] + spread * boxes_of_covers[i][1] for i in uneven])
    around = _crossings(points, closed).reshape(len(uneven), -1)
    excess = 0.0
    for i, of_closed, some in zip(uneven, around, np.split(points, len(uneven)), strict=True):
        without = of_closed - _solid_angles(some, covers[i])
        changed = np.count_nonzero(of_closed > 0.5) - np.count_nonzero(without > 0.5)
        excess += changed / SAMPLES_OF_COVER * float(boxes_of_covers[i][1].prod())
    return excess


def _solid_angles(points: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """(P,) the share of the full solid angle that triangles (K, 3, 3) take up from points (P, 3)."""
    if not len(corners) or not len(points):
        return np.zeros(len(points))
    pieces = max(1, -(-len(points) * len(corners) // (SAMPLES // 8)))
    return np.concatenate([winding_numbers(some, corners) for some in np.array_split(points, pieces)])


def _crossings(points: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """(P,) how often the closed chain of triangles (K, 3, 3) winds about points (P, 3): exits less entries of a ray."""
    points, corners = points @ ASKEW, corners @ ASKEW
    far = points.copy()
    far[:, 2] = np.maximum(points[:, 2], corners[:, :, 2].max(initial=-np.inf))
    winding = np.zeros(len(points))
    low, high = corners.min(axis=1), corners.max(axis=1)
    for point, face in meeting(boxes(points, far), boxes(low, high)):
        sign, height = _pierced(corners[face], points[point, :2])
        hit = (sign != 0) & (height > points[point, 2])
        winding += np.bincount(point[hit], sign[hit], len(points))
    return winding


def _pierced(corners: np.ndarray, at: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Where the upright line through ``at`` (P, 2) meets its triangle (P, 3, 3): 1 if the face looks up there, -1 if
    down, 0 if it is missed; and the height.

    Each side is judged from its lesser end to its greater, so that the two triangles of an edge judge it alike and no
    line slips between them.
    """
    following = np.roll(corners, -1, axis=1)
    x, y, next_x, next_y = corners[:, :, 0], corners[:, :, 1], following[:, :, 0], following[:, :, 1]
    ordered = (x < next_x) | ((x == next_x) & (y < next_y))
    low_x, low_y = np.where(ordered, x, next_x), np.where(ordered, y, next_y)
    along_x, along_y = np.where(ordered, next_x, x) - low_x, np.where(ordered, next_y, y) - low_y
    left = (along_x * (at[:, None, 1] - low_y) - along_y * (at[:, None, 0] - low_x) >= 0) == ordered
    sign = left.all(axis=1).astype(np.int64) - (~left).all(axis=1)
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    offset = corners[:, 0, :2] - at
    upright = np.where(normal[:, 2] == 0, 1.0, normal[:, 2])
    height = corners[:, 0, 2] + (offset * normal[:, :2]).sum(axis=1) / upright
    return sign, np.clip(height, corners[:, :, 2].min(axis=1), corners[:, :, 2].max(axis=1))


def _along_columns(corners: np.ndarray, reach: np.ndarray) -> float:
    """m3 about which the closed chain of triangles (F, 3, 3) winds once or more, along upright lines within reach."""
    low, high = reach
    step = np.maximum(high - low, np.finfo(float).tiny)[:2] / COLUMNS
    cells = np.stack(np.meshgrid(np.arange(COLUMNS), np.arange(COLUMNS), indexing="ij"), axis=-1).reshape(-1, 2)
    at = low[:2] + (cells + 0.05 + 0.9 * np.random.default_rng(1).random(cells.shape)) * step
    first, last = (
        np.clip((ends[:, :2] - low[:2]) / step, 0, COLUMNS - 1).astype(np.int64)
        for ends in (corners.min(axis=1), corners.max(axis=1))
    )
    counts = (last - first + 1).prod(axis=1)
    pieces = [np.zeros((3, 0))]
    ends = np.cumsum(counts)
    for faces in np.split(np.arange(len(corners)), np.flatnonzero(np.diff(ends // SAMPLES)) + 1):
        face = np.repeat(faces, counts[faces])
        number = np.arange(len(face)) - np.repeat(np.cumsum(counts[faces]) - counts[faces], counts[faces])
        across = (last - first + 1)[face, 1]
        column = (first[face, 0] + number // across) * COLUMNS + first[face, 1] + number % across
        sign, height = _pierced(corners[face], at[column])
        hit = sign != 0
        pieces.append(np.stack([column[hit], height[hit], sign[hit]]))
    column, height, sign = np.concatenate(pieces, axis=1)
    order = np.lexsort((-sign, height, column))
    within = np.cumsum(-sign[order])[:-1] >= 1
    return float(step.prod() * np.diff(height[order])[within].sum()) if len(order) else 0.0
