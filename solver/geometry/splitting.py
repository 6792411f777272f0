"""Finer triangles where a size is asked for: the longest edges halved, without changing the shape."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
from scipy.spatial import cKDTree

from ..case import Surface
from .edges import edges_of
from .surface import triangle_corners

GROWTH = 1.0  # of the longest edge, per distance from a fine triangle

ROUNDS = 200  # far more than a sound surface takes: each round halves edges, and 40 halvings are rounding


def split_to_size(surface: Surface, finest: np.ndarray) -> Surface:
    """The surface with no edge of a triangle longer than its size (F,) m; infinite where it may stay as it is.

    About fine triangles the others are graded, on whichever face they lie: a fine face close to a coarse one makes
    the mesher search without end. An edge is halved when it is the longest of all its triangles, so that no triangle
    gets a smaller angle than half the smallest it came from, and the edges of neighbours stay one.

    Rivara, New longest-edge algorithms for the refinement and improvement of unstructured triangulations,
    Int. J. Numer. Meth. Eng. 40 (1997) 3313.
    """
    surface, finest = _split(surface, finest, lambda _, finest: finest)
    fine = [
        (size, cKDTree(triangle_corners(surface)[finest == size].mean(axis=1)))
        for size in np.unique(finest[np.isfinite(finest)])
    ]

    def graded(surface: Surface, finest: np.ndarray) -> np.ndarray:
        middles = triangle_corners(surface).mean(axis=1)
        return np.minimum.reduce([finest, *(size + GROWTH * tree.query(middles)[0] for size, tree in fine)])

    return _split(surface, finest, graded)[0]


def _split(
    surface: Surface, finest: np.ndarray, longest: Callable[[Surface, np.ndarray], np.ndarray]
) -> tuple[Surface, np.ndarray]:
    for _ in range(ROUNDS):
        halved = _halved(surface, longest(surface, finest))
        if halved is None:
            break
        surface, parent = halved
        finest = finest[parent]
    return surface, finest


def _halved(surface: Surface, size: np.ndarray) -> tuple[Surface, np.ndarray] | None:
    """One round: every edge that is due and the longest of all its triangles, halved, and each triangle's parent.

    None when none is due.
    """
    edges = edges_of(surface.triangles)
    length = np.linalg.norm(surface.vertices[edges.end] - surface.vertices[edges.start], axis=1).reshape(-1, 3)
    due = (length > size[:, None]).any(axis=1)
    if not due.any():
        return None
    # Edges of one length are told apart by their numbers, so that every triangle has one longest edge.
    of_edge = np.zeros(len(edges.uses))
    of_edge[edges.edge] = length.ravel()
    rank = np.empty(len(of_edge), np.int64)
    rank[np.argsort(of_edge, kind="stable")] = np.arange(len(of_edge))
    local = rank[edges.edge].reshape(-1, 3).argmax(axis=1)
    longest = edges.edge.reshape(-1, 3)[np.arange(len(local)), local]
    due = _with_neighbours(due, edges.edge.reshape(-1, 3), longest)
    agreed = np.bincount(longest[due], minlength=len(rank)) == edges.uses
    split = due & agreed[longest]
    chosen, middle = np.unique(longest[split], return_inverse=True)
    side = np.zeros(len(rank), np.int64)
    side[edges.edge] = np.arange(len(edges.edge))
    ends = side[chosen]
    middles = 0.5 * (surface.vertices[edges.start[ends]] + surface.vertices[edges.end[ends]])
    turn = (local[split, None] + np.arange(3)) % 3
    start, end, tip = np.take_along_axis(surface.triangles[split], turn, axis=1).T
    middle = middle.reshape(-1) + len(surface.vertices)
    triangles = surface.triangles.copy()
    triangles[split] = np.stack([start, middle, tip], axis=1)
    parent = np.concatenate([np.arange(len(size)), np.flatnonzero(split)])
    return replace(
        surface,
        vertices=np.concatenate([surface.vertices, middles]),
        triangles=np.concatenate([triangles, np.stack([middle, end, tip], axis=1)]).astype(np.int32),
        part=surface.part[parent],
        tag=surface.tag[parent],
        face=surface.face[parent],
    ), parent


def _with_neighbours(due: np.ndarray, edge: np.ndarray, longest: np.ndarray) -> np.ndarray:
    """Also due: triangles (F,) whose edge is the longest of one that is due and not their own longest."""
    while True:
        asked = np.zeros(edge.max() + 1, bool)
        asked[longest[due]] = True
        more = due | asked[edge].any(axis=1)
        if (more == due).all():
            return due
        due = more
