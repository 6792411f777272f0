"""What is amiss with a surface that is seen at once, before the solver has looked at it."""

from __future__ import annotations

from typing import Any

import numpy as np

from .parts import Skin

MOST_PLACES = 50
# Of the diagonal: corners nearer than this are one, and a triangle lower than this has no area; as in the solver.
SAME_PLACE, FLAT = 1e-6, 1e-6
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
    triangles = _welded(surface)
    start, end = triangles.ravel(), np.roll(triangles, -1, axis=1).ravel()
    edge = np.minimum(start, end) * len(surface.vertices) + np.maximum(start, end)
    _, inverse, uses = np.unique(edge, return_inverse=True, return_counts=True)
    backward = np.bincount(inverse, weights=start > end)
    folded = (triangles == np.roll(triangles, -1, axis=1)).any(axis=1)
    found = []
    for kind, which, message, mend, severity in (
        (
            "open edges", uses % 2 == 1, f"The surface of '{name}' is open: {{}} without a face on both sides.",
            "Close the holes there (select the edges and fill), or give sheets a thickness.", "error",
        ),
        (
            "crowded edges", uses > 2, f"'{name}' has {{}} where more than two faces meet.",
            "Shells that touch along an edge are taken as they are; remove inner faces there.", "warning",
        ),
        (
            "flipped faces", (uses == 2) & (backward != 1),
            f"'{name}' has {{}} between faces that point opposite ways.", TURN, "error",
        ),
    ):  # fmt: skip
        sides = np.flatnonzero(which[inverse] & ~np.repeat(folded, 3))
        if len(sides):
            _, first = np.unique(inverse[sides], return_index=True)
            at = sides[first[:MOST_PLACES]]
            ends = triangles[at // 3, at % 3], triangles[at // 3, (at + 1) % 3]
            places = 0.5 * (surface.vertices[ends[0]] + surface.vertices[ends[1]])
            text = message.format(f"{len(first)} edge" + ("s" if len(first) > 1 else ""))
            found.append(_finding(kind, text, mend, surface.face[sides // 3], places, severity))
    return found


def _welded(surface: Skin) -> np.ndarray:
    """(F, 3) the triangles with corners at the same place made one, as the solver does before it looks."""
    low = surface.vertices.min(axis=0)
    tolerance = SAME_PLACE * max(float(np.linalg.norm(np.ptp(surface.vertices, axis=0))), 1e-30)
    cells = np.round((surface.vertices - low) / tolerance).astype(np.int64)
    span = cells.max(axis=0) + 1
    _, first, inverse = np.unique(
        (cells[:, 0] * span[1] + cells[:, 1]) * span[2] + cells[:, 2], return_index=True, return_inverse=True
    )
    return first[inverse.ravel()][surface.triangles]


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
