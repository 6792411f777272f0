"""What is amiss with a surface that is seen at once, before the solver has looked at it."""

from __future__ import annotations

from typing import Any

import numpy as np

from .parts import Skin

MOST_PLACES = 50
# Of the diagonal: corners nearer than this are one, and a triangle lower than this has no area; as in the solver.
SAME_PLACE, FLAT = 1e-6, 1e-6
# Bins that sides are sorted into at first, as a power of two: about as many as a part of 100 000 faces has edges.
BIN_BITS = 18
TURN = "Recalculate the normals to the outside."

# As ``fluxface inspect`` tells them: kind, message, mend, faces, points (m) and severity of each.
Finding = dict[str, Any]


def glance(surface: Skin, name: str) -> list[Finding]:
    """What is amiss with edges and directions, and faces without an area.

    surface: in metres and world axes.
    """
    if not len(surface.triangles):
        return [_finding("no faces", f"'{name}' has no faces.", "Model a closed body.")]
    if _closes(surface.triangles, len(surface.vertices)):
        seen = []
        if surface.volume() < 0.0:
            seen.append(_finding("inside out", f"The surface of '{name}' is inside out.", TURN))
        return seen + _flat(surface, name)
    return _edges_amiss(surface, name) + _flat(surface, name)


def _closes(triangles: np.ndarray, count: int) -> bool:
    """Whether each edge is run along as often one way as the other, as on a closed surface of one orientation.

    The sum over all sides of the product of random numbers given to their corners, signed by the way, is then nought;
    otherwise it is so by a chance of about 2^-60 (Schwartz, J. ACM 27 (1980) 701; from memory). No sorting is needed.
    """
    drawn = np.random.default_rng(0).integers(0, 2**63, count, dtype=np.uint64)
    corners = [np.ascontiguousarray(triangles[:, corner]) for corner in range(3)]
    total = 0
    for start, end in zip(corners, corners[1:] + corners[:1], strict=True):
        products = drawn[start] * drawn[end]
        total += 2 * int(products.sum(where=start < end)) - int(products.sum())
    return total % 2**64 == 0


def _edges_amiss(surface: Skin, name: str) -> list[Finding]:
    count = len(surface.vertices)
    amiss = _unmatched(surface.triangles, np.roll(surface.triangles, -1, axis=1), count)
    # Corners at one place count as one, but those of sides that have their counterpart need not be looked for.
    near = np.flatnonzero(amiss.any(axis=1))
    amiss, triangles = amiss[near], _welded(surface.vertices, surface.triangles[near])
    following = np.roll(triangles, -1, axis=1)
    amiss &= ~(triangles == following).any(axis=1, keepdims=True)
    face = np.broadcast_to(surface.face[near, None], amiss.shape)[amiss]
    start, end = triangles[amiss], following[amiss]
    left = _unmatched(start, end, count)
    face, start, end = face[left], start[left], end[left]
    edge = np.minimum(start, end) * count + np.maximum(start, end)
    _, inverse, uses = np.unique(edge, return_inverse=True, return_counts=True)
    backward = np.bincount(inverse, weights=start > end)
    found = []
    for kind, which, message, mend, severity in (
        (
            "open edges", uses % 2 == 1, "The surface of '{name}' is open: {edges} without a face on both sides.",
            "Close the holes there (select the edges and fill), or give sheets a thickness.", "error",
        ),
        (
            "crowded edges", uses > 2, "'{name}' has {edges} where more than two faces meet.",
            "Shells that touch along an edge are taken as they are; remove inner faces there.", "warning",
        ),
        (
            "flipped faces", (uses == 2) & (backward != 1),
            "'{name}' has {edges} between faces that point opposite ways.", TURN, "error",
        ),
    ):  # fmt: skip
        these = np.flatnonzero(which[inverse])
        if len(these):
            _, first = np.unique(inverse[these], return_index=True)
            at = these[first[:MOST_PLACES]]
            places = 0.5 * (surface.vertices[start[at]] + surface.vertices[end[at]])
            text = message.format(name=name, edges=f"{len(first)} edge" + ("s" if len(first) > 1 else ""))
            found.append(_finding(kind, text, mend, face[these], places, severity))
    return found


def _unmatched(start: np.ndarray, end: np.ndarray, count: int) -> np.ndarray:
    """Which sides, from corner to corner, lie on an edge that is not run along as often one way as the other.

    As in :func:`_closes`, the sides in each of many bins by their corners' random numbers are summed up, so that only
    the few in bins that do not come to nought are left to be sorted, and those that share a bin with them. Four faces
    at an edge may match; the solver finds those when it looks.
    start, end: of one shape, which the answer has too.
    """
    drawn = np.random.default_rng(0).integers(0, 2**63, count, dtype=np.uint64)
    products = drawn[start] * drawn[end]
    bins = (products >> np.uint64(64 - BIN_BITS)).astype(np.int64)
    number = ((products >> np.uint64(8)) & np.uint64(2**32 - 1)).astype(np.float64)
    sums = np.bincount(bins.ravel(), weights=np.where(start < end, number, -number).ravel())
    return sums[bins] != 0.0


def _welded(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(n, 3) the triangles with corners at the same place made one, as the solver does before it looks."""
    used = np.zeros(len(vertices), bool)
    used[triangles] = True
    corners = np.flatnonzero(used)
    low = vertices.min(axis=0)
    tolerance = SAME_PLACE * max(float(np.linalg.norm(np.ptp(vertices, axis=0))), 1e-30)
    cells = np.round((vertices[corners] - low) / tolerance).astype(np.int64)
    # There are a million cells along an axis at most, so that three numbers go into one.
    key = (cells[:, 0] << 42) | (cells[:, 1] << 21) | cells[:, 2]
    order = np.argsort(key)
    another = np.diff(key[order], prepend=-1) != 0
    same = np.empty(len(vertices), np.int64)
    same[corners[order]] = corners[order][another][np.cumsum(another) - 1]
    return same[triangles]


def _flat(surface: Skin, name: str) -> list[Finding]:
    lowest = FLAT * float(np.linalg.norm(np.ptp(surface.vertices, axis=0)))
    # A triangle of a larger area is higher than that, however long it is.
    small = np.flatnonzero(surface.areas < 0.5 * lowest * lowest / FLAT)
    corners = surface.vertices[surface.triangles[small]]
    longest = np.linalg.norm(np.roll(corners, -1, axis=1) - corners, axis=2).max(axis=1, initial=0.0)
    flat = 2.0 * surface.areas[small] < lowest * np.maximum(longest, 1e-300)
    if not flat.any():
        return []
    faces = np.unique(surface.face[small[flat]])
    return [
        _finding(
            "flat faces",
            f"'{name}' has {len(faces)} face{'s' if len(faces) > 1 else ''} without an area, all corners on a line.",
            "Dissolve them (merge by distance, or delete degenerate).",
            faces,
            corners[flat][:MOST_PLACES].mean(axis=1),
            "warning",
        )
    ]


def _finding(
    kind: str,
    message: str,
    mend: str,
    faces: np.ndarray | tuple[int, ...] = (),
    places: np.ndarray | None = None,
    severity: str = "error",
) -> Finding:
    return {
        "kind": kind,
        "message": message,
        "mend": mend,
        "faces": np.unique(faces).astype(int).tolist(),
        "points": [] if places is None else places.tolist(),
        "severity": severity,
    }
