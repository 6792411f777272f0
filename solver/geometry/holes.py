"""Holes of a surface and the triangles that close them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .edges import Edges, boundary_sides, groups
from .surface import areas

MOST_SIDES = 400  # closed at once: the time it takes grows with their cube
# Between ways to close a hole of nearly the same area, the one of shorter sides: this share of the longest's square.
SHORTER = 1e-4


@dataclass(frozen=True)
class Hole:
    """A loop of sides without mates. vertices: (n,) in the order in which the surface runs along it.

    triangles: (n - 2, 3) or less, that close it, seen from outside. area: m2 of those.
    """

    vertices: np.ndarray
    triangles: np.ndarray
    area: float


def holes(vertices: np.ndarray, edges: Edges) -> list[Hole]:
    """The holes of a surface, each with its closing of least area, or near it where a hole has very many sides.

    Barequet & Sharir, Filling gaps in the boundary of a polyhedron, Computer Aided Geometric Design 12 (1995) 207.
    """
    found = []
    for loop in _loops(edges):
        triangles = _closing(vertices, loop)[:, ::-1]
        a, b, c = triangles.T  # where the loop comes by a vertex twice, some are folded flat and close nothing
        triangles = triangles[(a != b) & (b != c) & (c != a)]
        found.append(Hole(loop, triangles, float(areas(vertices[triangles]).sum())))
    return found


def _closing(vertices: np.ndarray, loop: np.ndarray) -> np.ndarray:
    """(n - 2, 3) triangles over the vertices of a loop (n,): a coarser loop is closed first, then what it left out."""
    if len(loop) < 3:
        return np.zeros((0, 3), np.int64)
    if len(loop) <= MOST_SIDES:
        return loop[_least_area(vertices[loop])]
    step = -(-len(loop) // MOST_SIDES)
    round_again = np.append(loop, loop[0])
    left_out = [round_again[first : first + step + 1] for first in range(0, len(loop), step)]
    return np.concatenate([_closing(vertices, some) for some in (loop[::step], *left_out)])


def _loops(edges: Edges) -> list[np.ndarray]:
    """The vertices of each loop of boundary sides, in order."""
    sides = boundary_sides(edges)
    count = len(sides)
    by_start, by_end = (np.argsort(ends[sides], kind="stable") for ends in (edges.start, edges.end))
    following = np.empty(count, np.int64)
    following[by_end] = by_start  # a boundary leaves each vertex as often as it comes there
    loop = groups(np.arange(count), following, count)
    _, first = np.unique(loop, return_index=True)
    left = _steps_to(first[loop], following)
    order = np.lexsort((-left, loop))
    return np.split(edges.start[sides][order], np.cumsum(np.bincount(loop))[:-1]) if count else []


def _steps_to(goal: np.ndarray, following: np.ndarray) -> np.ndarray:
    """(n,) how many steps along ``following`` lead from each item to its goal, by doubling; the goal itself: the most.

    Wyllie, The complexity of parallel computations, thesis, Cornell University (1979): list ranking.
    """
    items = np.arange(len(following))
    leap = np.where(following == goal, items, following)  # stop one short of the goal, so that loops have an end
    steps = np.where(leap == items, 0, 1)
    for _ in range(max(len(following), 1).bit_length()):
        steps = steps + steps[leap]
        leap = leap[leap]
    return steps


def _least_area(points: np.ndarray) -> np.ndarray:
    """(n - 2, 3) triangles over the corners of a closed polygon (n, 3) in space, of least total area."""
    count = len(points)
    cost, middle = np.zeros((count, count)), np.zeros((count, count), np.int64)
    for span in range(2, count):
        low = np.arange(count - span)
        high = low + span
        between = low[:, None] + np.arange(1, span)
        corners = np.stack(np.broadcast_arrays(points[low, None], points[between], points[high, None]), axis=2)
        longest = ((corners - np.roll(corners, 1, axis=2)) ** 2).sum(axis=3).max(axis=2)
        area = areas(corners.reshape(-1, 3, 3)).reshape(between.shape)
        total = cost[low[:, None], between] + cost[between, high[:, None]] + area + SHORTER * longest
        best = total.argmin(axis=1)
        cost[low, high], middle[low, high] = total[low, best], between[low, best]
    triangles, waiting = [], [(0, count - 1)]
    while waiting:
        first, last = waiting.pop()
        if last - first > 1:
            tip = int(middle[first, last])
            triangles.append((first, tip, last))
            waiting += [(first, tip), (tip, last)]
    return np.array(triangles, np.int64).reshape(-1, 3)
