"""A tree of bounding boxes, and the pairs of items whose boxes meet."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

CHUNK = 1 << 16  # pairs of boxes treated at once; bounds the memory
# Shifts and masks that put two empty bits after each of 21.
SPREAD = (
    (32, 0x1F00000000FFFF),
    (16, 0x1F0000FF0000FF),
    (8, 0x100F00F00F00F00F),
    (4, 0x10C30C30C30C30C3),
    (2, 0x1249249249249249),
)


@dataclass(frozen=True)
class Boxes:
    """A binary tree of bounding boxes: level l has low and high corners (2^l, 3); leaf k holds item order[k].

    Leaves beyond the number of items are empty, with low above high, and meet nothing.
    """

    low: tuple[np.ndarray, ...]
    high: tuple[np.ndarray, ...]
    order: np.ndarray

    @property
    def depth(self) -> int:
        return len(self.low) - 1


def boxes(low: np.ndarray, high: np.ndarray) -> Boxes:
    """The tree over boxes (N, 3), in the order of their middles along a space-filling curve.

    Morton, A computer oriented geodetic data base and a new technique in file sequencing, IBM (1966).
    """
    count = len(low)
    depth = max(count - 1, 0).bit_length()
    order = np.concatenate([np.argsort(_morton_codes(low + high), kind="stable"), np.full((1 << depth) - count, count)])
    lows = [np.concatenate([low, np.full((1, 3), np.inf)])[order]]
    highs = [np.concatenate([high, np.full((1, 3), -np.inf)])[order]]
    for _ in range(depth):
        lows.append(lows[-1].reshape(-1, 2, 3).min(axis=1))
        highs.append(highs[-1].reshape(-1, 2, 3).max(axis=1))
    return Boxes(tuple(lows[::-1]), tuple(highs[::-1]), order)


def _morton_codes(points: np.ndarray) -> np.ndarray:
    """(N,) the bits of each point's (N, 3) coordinates, 21 of each, interleaved."""
    if not len(points):
        return np.zeros(0, np.uint64)
    low = points.min(axis=0)
    extent = np.ptp(points, axis=0).max() or 1.0
    bits = ((points - low) / extent * (2**21 - 1)).astype(np.uint64)
    for shift, mask in SPREAD:
        bits = (bits | (bits << np.uint64(shift))) & np.uint64(mask)
    return bits[:, 0] | (bits[:, 1] << np.uint64(1)) | (bits[:, 2] << np.uint64(2))


def boxes_of(corners: np.ndarray) -> Boxes:
    """The tree over triangles (F, 3, 3)."""
    return boxes(corners.min(axis=1), corners.max(axis=1))


def meeting(one: Boxes, other: Boxes, reach: float = 0.0) -> Iterator[tuple[np.ndarray, np.ndarray]]:
    """The pairs of items whose boxes are within ``reach`` (m) of each other along each axis, in chunks."""
    waiting = [(0, 0, np.zeros(1, dtype=np.int64), np.zeros(1, dtype=np.int64))]
    while waiting:
        level, other_level, i, j = waiting.pop()
        near = _near(one, level, i, other, other_level, j, reach)
        i, j = i[near], j[near]
        if level == one.depth and other_level == other.depth:
            if len(i):
                yield one.order[i], other.order[j]
            continue
        if level < one.depth:
            level, i, j = level + 1, np.concatenate([2 * i, 2 * i + 1]), np.concatenate([j, j])
        if other_level < other.depth:
            other_level, i, j = other_level + 1, np.concatenate([i, i]), np.concatenate([2 * j, 2 * j + 1])
        waiting += [(level, other_level, i[k : k + CHUNK], j[k : k + CHUNK]) for k in range(0, len(i), CHUNK)]


def meeting_itself(tree: Boxes, reach: float = 0.0) -> Iterator[tuple[np.ndarray, np.ndarray]]:
    """The pairs of different items of one tree, each pair once, whose boxes are within ``reach`` (m), in chunks."""
    waiting = [(0, np.zeros(1, dtype=np.int64), np.zeros(1, dtype=np.int64))]
    while waiting:
        level, i, j = waiting.pop()
        near = (i == j) | _near(tree, level, i, tree, level, j, reach)
        i, j = i[near], j[near]
        if level == tree.depth:
            apart = i != j
            if apart.any():
                yield tree.order[i[apart]], tree.order[j[apart]]
            continue
        two = i != j  # a box with itself has its halves' pairs (0, 0), (0, 1), (1, 1)
        i, j = (
            np.concatenate([2 * i, 2 * i, 2 * i + 1, 2 * i[two] + 1]),
            np.concatenate([2 * j, 2 * j + 1, 2 * j + 1, 2 * j[two]]),
        )
        waiting += [(level + 1, i[k : k + CHUNK], j[k : k + CHUNK]) for k in range(0, len(i), CHUNK)]


def _near(
    one: Boxes, level: int, i: np.ndarray, other: Boxes, other_level: int, j: np.ndarray, reach: float
) -> np.ndarray:
    """(P,) whether boxes i of a level of ``one`` are within ``reach`` of boxes j of a level of ``other``."""
    apart = (one.low[level][i] > other.high[other_level][j] + reach) | (
        other.low[other_level][j] > one.high[level][i] + reach
    )
    return ~apart.any(axis=1)
