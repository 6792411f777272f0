"""The edges of a triangulation: which triangles meet there and whether they agree in direction."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components


@dataclass(frozen=True)
class Edges:
    """Side k of triangle f, from its corner k to the next, is number 3 f + k; an edge is what sides share.

    start, end: (3F,) vertices of each side. edge: (3F,) its edge. uses: (E,) sides of each edge. turns: (E,) how many
    more of them run from the lower vertex to the higher than back: 0 where directions agree.
    """

    start: np.ndarray
    end: np.ndarray
    edge: np.ndarray
    uses: np.ndarray
    turns: np.ndarray

    @property
    def owner(self) -> np.ndarray:
        """(3F,) the triangle of each side."""
        return np.repeat(np.arange(len(self.start) // 3), 3)

    @property
    def closed(self) -> bool:
        """Whether every edge has as many sides one way as the other."""
        return not self.turns.any()


def edges_of(triangles: np.ndarray) -> Edges:
    """Of triangles (F, 3), none of which uses a vertex twice."""
    start, end = triangles.ravel(), np.roll(triangles, -1, axis=1).ravel()
    low, high = np.minimum(start, end).astype(np.int64), np.maximum(start, end)
    _, edge, uses = np.unique(low * (triangles.max(initial=0) + 1) + high, return_inverse=True, return_counts=True)
    turns = np.bincount(edge, weights=np.where(start < end, 1.0, -1.0), minlength=len(uses)).astype(np.int64)
    return Edges(start, end, edge.reshape(-1), uses, turns)


def neighbours(edges: Edges) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The pairs of sides that share an edge of two sides: sides (N,), their mates (N,), agreeing in direction (N,)."""
    order = np.argsort(edges.edge, kind="stable")
    first = np.searchsorted(edges.edge[order], np.flatnonzero(edges.uses == 2))
    one, other = order[first], order[first + 1]
    return one, other, edges.start[one] == edges.end[other]


def groups(one: np.ndarray, other: np.ndarray, count: int) -> np.ndarray:
    """(count,) the number of the connected group of each of ``count`` things that the pairs link."""
    graph = coo_array((np.ones(len(one), bool), (one, other)), shape=(count, count))
    return connected_components(graph, directed=False)[1]


def shells(triangles: np.ndarray) -> np.ndarray:
    """(F,) the shell of each triangle: what hangs together over edges of two sides."""
    one, other, _ = neighbours(edges_of(triangles))
    return groups(one // 3, other // 3, len(triangles))


def boundary_sides(edges: Edges) -> np.ndarray:
    """The sides (S,) that lack a mate of the other direction; each edge's surplus of one direction, and no more."""
    forwards = edges.start < edges.end
    surplus = np.where(forwards, edges.turns[edges.edge], -edges.turns[edges.edge])
    order = np.lexsort((np.arange(len(forwards)), ~forwards, edges.edge))
    key = 2 * edges.edge[order] + ~forwards[order]
    fresh = np.concatenate([[True], key[1:] != key[:-1]]) if len(key) else np.zeros(0, bool)
    rank = np.arange(len(key)) - np.maximum.accumulate(np.where(fresh, np.arange(len(key)), 0))
    return np.sort(order[rank < surplus[order]])


def solid_shells(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(F,) the closed shell of each triangle of a closed surface (all edges turn both ways alike), outward-oriented.

    Where more than two triangles meet on an edge, those belong together that have solid between them.
    """
    edges = edges_of(triangles)
    one, other, _ = neighbours(edges)
    many = np.flatnonzero((edges.uses[edges.edge] > 2) & (edges.turns[edges.edge] == 0))
    forwards = edges.start[many] < edges.end[many]
    order = np.lexsort((forwards, -_angles(vertices, triangles, edges, many, forwards), edges.edge[many]))
    many, forwards = many[order], forwards[order]
    # Going around an edge against the turn, solid lies between a forward side and the backward one that comes next.
    rank = _rank_after_first(edges.edge[many], forwards)
    backs = np.lexsort((np.where(forwards, 1, 0), rank, edges.edge[many]))
    leads = np.lexsort((np.where(forwards, 0, 1), rank, edges.edge[many]))
    front, back = many[leads][forwards[leads]], many[backs][~forwards[backs]]
    return groups(np.concatenate([one, front]) // 3, np.concatenate([other, back]) // 3, len(triangles))


def _angles(
    vertices: np.ndarray, triangles: np.ndarray, edges: Edges, sides: np.ndarray, forwards: np.ndarray
) -> np.ndarray:
    """(S,) radians at which the triangle of each side stands about the side's edge, turning about its direction."""
    tip = vertices[triangles[sides // 3, (sides % 3 + 2) % 3]]
    start, end = vertices[edges.start[sides]], vertices[edges.end[sides]]
    low, high = np.where(forwards[:, None], start, end), np.where(forwards[:, None], end, start)
    axis = (high - low) / np.linalg.norm(high - low, axis=1, keepdims=True)
    zero = np.cross(axis, np.eye(3)[np.abs(axis).argmin(axis=1)])
    zero /= np.linalg.norm(zero, axis=1, keepdims=True)
    angle = np.arctan2(np.einsum("si,si->s", tip - low, np.cross(axis, zero)), np.einsum("si,si->s", tip - low, zero))
    return np.round(angle, 9)  # faces that lie on each other stand at one angle


def _rank_after_first(edge: np.ndarray, forwards: np.ndarray) -> np.ndarray:
    """(S,) of sides sorted by edge: how many of its own direction come before it, going around from a forward one.

    A backward side before the first forward one comes last.
    """
    if not len(edge):
        return np.zeros(0, np.int64)
    first = np.concatenate([[True], np.diff(edge) != 0])
    block = np.cumsum(first) - 1
    begin = np.flatnonzero(first)
    fore, back = forwards.astype(np.int64), (~forwards).astype(np.int64)
    ahead, behind = np.cumsum(fore), np.cumsum(back)
    ahead -= (ahead[begin] - fore[begin])[block]
    behind -= (behind[begin] - back[begin])[block]
    early = ~forwards & (ahead == 0)
    passed = np.bincount(block, early)[block].astype(np.int64)
    count = np.bincount(block, ~forwards)[block].astype(np.int64)
    return np.where(forwards, ahead - 1, (behind - 1 - passed) % np.maximum(count, 1))
