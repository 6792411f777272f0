"""Where a surface runs through itself, or lies upon itself."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .boxes import boxes_of, meeting_itself
from .surface import area_vectors

# Shares of the part's diagonal: what is nearer than this touches; what is flatter than FLAT has no certain normal.
TOUCH = 1e-9
FLAT = 1e-6


@dataclass(frozen=True)
class Crossings:
    """Pairs of triangles (P, 2) that run through each other or, in one plane, overlap; at: (P, 3) m a place of each."""

    pairs: np.ndarray
    overlapping: np.ndarray
    at: np.ndarray


def crossings(vertices: np.ndarray, triangles: np.ndarray, most: int | None = None) -> Crossings:
    """Of triangles (F, 3) over vertices (V, 3); with ``most``, the search ends once that many pairs are found."""
    extent = float(np.linalg.norm(np.ptp(vertices[np.unique(triangles)], axis=0))) if len(triangles) else 1.0
    middle = vertices.mean(axis=0) if len(vertices) else np.zeros(3)
    corners = ((vertices - middle) / extent)[triangles]
    normal = area_vectors(corners)
    length = np.linalg.norm(normal, axis=1)
    longest = np.linalg.norm(corners - np.roll(corners, 1, axis=1), axis=2).max(axis=1)
    sound = 2 * length > FLAT * longest
    normal /= np.where(length > 0, length, 1.0)[:, None]
    found = [(np.zeros((0, 2), np.int64), np.zeros(0, bool), np.zeros((0, 3)))]
    count = 0
    for i, j in meeting_itself(boxes_of(corners)):
        real = sound[i] & sound[j]
        some = _meeting_pairs(corners, normal, i[real], j[real], triangles)
        found.append(some)
        count += len(some[0])
        if most is not None and count >= most:
            break
    pairs, overlapping, at = (np.concatenate(arrays) for arrays in zip(*found, strict=True))
    return Crossings(pairs, overlapping, at * extent + middle)


def _meeting_pairs(
    corners: np.ndarray, normal: np.ndarray, i: np.ndarray, j: np.ndarray, triangles: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """What :class:`Crossings` holds, of those pairs i, j (P,) that meet."""
    above = np.einsum("pci,pi->pc", corners[i] - corners[j, :1], normal[j])
    under = np.einsum("pci,pi->pc", corners[j] - corners[i, :1], normal[i])
    flat = (np.abs(above) <= TOUCH).all(axis=1) & (np.abs(under) <= TOUCH).all(axis=1)
    spans = _both_sides(above) & _both_sides(under) & ~flat
    upon = np.flatnonzero(flat)
    upon = upon[_overlap_in_plane(corners[i[upon]], corners[j[upon]], normal[i[upon]])]
    through = np.flatnonzero(spans)
    pierced, at = _pierced(corners, i[through], j[through], above[through], under[through], triangles)
    through = through[pierced]
    pairs = np.stack([i, j], axis=1)[np.concatenate([through, upon])]
    middle = 0.5 * (corners[i[upon]].mean(axis=1) + corners[j[upon]].mean(axis=1))
    return pairs, np.arange(len(pairs)) >= len(through), np.concatenate([at, middle])


def _both_sides(height: np.ndarray) -> np.ndarray:
    return (height > TOUCH).any(axis=1) & (height < -TOUCH).any(axis=1)


def _pierced(
    corners: np.ndarray, i: np.ndarray, j: np.ndarray, above: np.ndarray, under: np.ndarray, triangles: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Which pairs (P,) have a side of one that goes through the other, and where (the places of those pairs alone)."""
    hit, at = np.zeros(len(i), bool), np.zeros((len(i), 3))
    for one, other, height in ((i, j, above), (j, i, under)):
        for start in range(3):
            end = (start + 1) % 3
            low, high = height[:, start], height[:, end]
            passes = (low > TOUCH) & (high < -TOUCH) | (low < -TOUCH) & (high > TOUCH)
            ends = triangles[one][:, [start, end]]
            passes &= ~(ends[:, :, None] == triangles[other][:, None, :]).any(axis=(1, 2))
            rows = np.flatnonzero(passes & ~hit)
            fraction = (low[rows] / (low[rows] - high[rows]))[:, None]
            p, q = corners[one[rows], start], corners[one[rows], end]
            place = p + fraction * (q - p)
            rows, place = (kept[_within(place, corners[other[rows]])] for kept in (rows, place))
            hit[rows], at[rows] = True, place
    return hit, at[hit]


def _within(points: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """(P,) whether points in the planes of their triangles lie within them."""
    normal = area_vectors(corners)
    sides = np.roll(corners, -1, axis=1) - corners
    inwards = np.einsum("pci,pi->pc", np.cross(sides, points[:, None] - corners), normal)
    scale = np.linalg.norm(normal, axis=1)[:, None] * np.linalg.norm(sides, axis=2)
    return (inwards >= -TOUCH * scale).all(axis=1)


def _overlap_in_plane(first: np.ndarray, second: np.ndarray, normal: np.ndarray) -> np.ndarray:
    """(P,) whether triangles of one plane share an area: no side of either has the other wholly beyond it."""
    apart = np.zeros(len(first), bool)
    for one, other in ((first, second), (second, first)):
        sides = np.roll(one, -1, axis=1) - one
        outwards = np.cross(sides, normal[:, None])
        outwards /= np.maximum(np.linalg.norm(outwards, axis=2, keepdims=True), np.finfo(float).tiny)
        own = np.einsum("pci,pci->pc", np.roll(one, -2, axis=1) - one, outwards)
        outwards = np.where(own[:, :, None] > 0, -outwards, outwards)
        beyond = np.einsum("pkci,pci->pkc", other[:, :, None] - one[:, None], outwards)
        apart |= (beyond >= -TOUCH).all(axis=1).any(axis=1)
    return ~apart
