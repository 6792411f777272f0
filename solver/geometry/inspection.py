"""What is to be said of a part's surface: everything that keeps it from bounding a solid, or looks unlikely."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..case import Surface
from .crossing import crossings
from .edges import Edges, edges_of, shells
from .surface import areas, diagonal, enclosed_volume, triangle_corners
from .thickness import thin_places
from .tidying import FLAT, against_their_shell, backward_shells, doubled, heights, oriented
from .winding import windings, wound_volume

ERROR, WARNING, NOTE = "error", "warning", "note"
NEEDLE = 1e-3  # the height of a needle over its longest side
MOST_PLACES = 50
SMALLEST, LARGEST = 0.5e-3, 10.0  # m: outside this a part is unlikely to be one that heat is asked of
ASIDE = 1e-5  # of the diagonal: how far beside a face its outside is probed
MOST_SHELLS = 200  # beyond this, shells are counted and not looked at one by one


@dataclass(frozen=True)
class Finding:
    """One thing found. kind: what, in two words. message: one plain sentence. mend: what to do about it.

    faces: the modeller's polygon numbers. points: places (at most MOST_PLACES of them), m. severity: "error" when the
    surface does not bound a solid as it is, "warning" when it may not be what was meant, "note" when it is only told.
    """

    kind: str
    message: str
    mend: str = ""
    faces: tuple[int, ...] = ()
    points: tuple[tuple[float, float, float], ...] = ()
    severity: str = ERROR


def inspected(surface: Surface, name: str, size: float | None = None) -> list[Finding]:
    """All that is to be said of the surface of one part, already welded. size: m, the edge length chosen, if one is."""
    if not len(surface.triangles):
        return [Finding("no faces", f"'{name}' has no faces with an area.", "Give it a body with a volume.")]
    edges = edges_of(surface.triangles)
    found = [
        *_open_edges(surface, edges, name),
        *_crowded_edges(surface, edges, name),
        *_flipped(surface, name),
        *_flat_and_needles(surface, name),
        *_doubled(surface, name),
        *_crossing(surface, name),
        *_size(surface, name),
    ]
    if not any(finding.severity == ERROR for finding in found):
        found += [*_shells(surface, name), *_thin(surface, name, size)]
    return found


def bounds_solid(findings: Sequence[Finding]) -> bool:
    return all(finding.severity != ERROR for finding in findings)


def volume(surface: Surface) -> float:
    """m3 that the surface encloses or winds about, whatever state it is in."""
    whole, _ = oriented(surface)
    reach = np.stack([surface.vertices.min(axis=0), surface.vertices.max(axis=0)])
    return wound_volume(whole.vertices, whole.triangles, reach)


def _of_faces(kind: str, message: str, mend: str, surface: Surface, some: np.ndarray, severity: str) -> list[Finding]:
    """A finding about triangles (indices), each counted once; none if there are none."""
    if not len(some):
        return []
    some = np.unique(some)
    middles = surface.vertices[surface.triangles[some[:MOST_PLACES]]].mean(axis=1)
    faces = tuple(np.unique(surface.face[some]).tolist())
    return [Finding(kind, message.format(count=_counted(len(faces), "face")), mend, faces, _places(middles), severity)]


def _of_sides(
    kind: str, message: str, mend: str, surface: Surface, edges: Edges, sides: np.ndarray, severity: str
) -> list[Finding]:
    """A finding about edges, given by sides of theirs; none if there are none."""
    if not len(sides):
        return []
    _, first = np.unique(edges.edge[sides], return_index=True)
    middles = 0.5 * (surface.vertices[edges.start[sides[first]]] + surface.vertices[edges.end[sides[first]]])
    faces = tuple(np.unique(surface.face[sides // 3]).tolist())
    message = message.format(count=_counted(len(first), "edge"))
    return [Finding(kind, message, mend, faces, _places(middles[:MOST_PLACES]), severity)]


def _places(points: np.ndarray) -> tuple[tuple[float, float, float], ...]:
    return tuple((x, y, z) for x, y, z in points.tolist())


def _counted(count: int, thing: str) -> str:
    return f"{count} {thing}" + ("s" if count != 1 else "")


# Edges ---------------------------------------------------------------------------------------------------------------


def _open_edges(surface: Surface, edges: Edges, name: str) -> list[Finding]:
    sides = np.flatnonzero((edges.uses % 2 == 1)[edges.edge])
    return _of_sides(
        "open edges",
        f"The surface of '{name}' is open: {{count}} without a face on both sides.",
        "Close the holes there (select the edges and fill), or give sheets a thickness.",
        surface, edges, sides, ERROR,
    )  # fmt: skip


def _crowded_edges(surface: Surface, edges: Edges, name: str) -> list[Finding]:
    sides = np.flatnonzero((edges.uses > 2)[edges.edge])
    return _of_sides(
        "crowded edges",
        f"'{name}' has {{count}} where more than two faces meet.",
        "Shells that touch along an edge are taken as they are; remove inner faces there.",
        surface, edges, sides, WARNING,
    )  # fmt: skip


def _flipped(surface: Surface, name: str) -> list[Finding]:
    turned = against_their_shell(surface)
    shell = shells(surface.triangles)
    triangles = np.where(turned[:, None], surface.triangles[:, ::-1], surface.triangles)
    backward = backward_shells(surface.vertices, triangles, shell)[shell]
    wrong = turned != backward
    if wrong.all():
        return _of_faces(
            "inside out",
            f"The surface of '{name}' is inside out.",
            "Recalculate the normals to the outside.",
            surface, np.flatnonzero(wrong), ERROR,
        )  # fmt: skip
    return _of_faces(
        "flipped faces",
        f"'{name}' has {{count}} pointing the wrong way.",
        "Recalculate the normals to the outside.",
        surface, np.flatnonzero(wrong), ERROR,
    )  # fmt: skip


# Faces ---------------------------------------------------------------------------------------------------------------


def _flat_and_needles(surface: Surface, name: str) -> list[Finding]:
    corners = triangle_corners(surface)
    height = heights(corners)
    flat = height < FLAT * diagonal(surface.vertices)
    longest = 2 * areas(corners) / np.maximum(height, np.finfo(float).tiny)
    needle = ~flat & (height < NEEDLE * longest)
    return [
        *_of_faces(
            "flat faces",
            f"'{name}' has {{count}} without an area, all corners on a line.",
            "Dissolve them (merge by distance, or delete degenerate).",
            surface, np.flatnonzero(flat), WARNING,
        ),
        *_of_faces(
            "needle faces",
            f"'{name}' has {{count}} thin as needles, which makes poor tetrahedra.",
            "Dissolve edges or merge vertices there, if the shape allows it.",
            surface, np.flatnonzero(needle), WARNING,
        ),
    ]  # fmt: skip


def _doubled(surface: Surface, name: str) -> list[Finding]:
    return _of_faces(
        "doubled faces",
        f"'{name}' has {{count}} lying exactly on another one.",
        "Delete the doubled faces (select all by trait: interior faces, or merge by distance).",
        surface, np.flatnonzero(doubled(surface)), ERROR,
    )  # fmt: skip


def _crossing(surface: Surface, name: str) -> list[Finding]:
    met = crossings(surface.vertices, surface.triangles)
    ordered = np.sort(surface.triangles, axis=1)[met.pairs]
    upon = met.overlapping & (ordered[:, 0] != ordered[:, 1]).any(axis=1)
    found = []
    for kind, message, which in (
        ("crossing faces", f"'{name}' has {{count}} running through each other.", ~met.overlapping),
        ("overlapping faces", f"'{name}' has {{count}} lying upon each other without sharing edges.", upon),
    ):
        mend = "Separate or unite the pieces there (a boolean union does)."
        for finding in _of_faces(kind, message, mend, surface, met.pairs[which].ravel(), ERROR):
            found.append(_at(finding, met.at[which]))
    return found


def _at(finding: Finding, points: np.ndarray) -> Finding:
    return Finding(**{**vars(finding), "points": _places(points[:MOST_PLACES])})


# The whole -----------------------------------------------------------------------------------------------------------


def _size(surface: Surface, name: str) -> list[Finding]:
    longest = float(np.ptp(surface.vertices, axis=0).max())
    if SMALLEST <= longest <= LARGEST:
        return []
    shown = f"{longest:.3g} m" if longest > LARGEST else f"{1e3 * longest:.3g} mm"
    return [
        Finding(
            "unlikely size",
            f"'{name}' is {shown} long, which is {'large' if longest > LARGEST else 'small'} for a product.",
            "Check the units: the file may be in millimetres and read as metres, or the other way round.",
            severity=WARNING,
        )
    ]


def _shells(surface: Surface, name: str) -> list[Finding]:
    """Of a surface that bounds a solid: which of its shells lie within others."""
    shell = shells(surface.triangles)
    count = int(shell.max()) + 1
    if count == 1:
        return []
    if count > MOST_SHELLS:
        return [Finding("many shells", f"'{name}' is made of {count} separate shells.", severity=NOTE)]
    corners = triangle_corners(surface)
    order = np.lexsort((-areas(corners), shell))
    largest = order[np.unique(shell[order], return_index=True)[1]]
    normal = np.cross(corners[largest, 1] - corners[largest, 0], corners[largest, 2] - corners[largest, 0])
    aside = ASIDE * diagonal(surface.vertices) * normal / np.linalg.norm(normal, axis=1, keepdims=True)
    middle = corners[largest].mean(axis=1)
    outside = windings(middle + aside, surface.vertices, surface.triangles) > 0.5
    within = windings(middle - aside, surface.vertices, surface.triangles) > 0.5
    nested = outside & within
    hollow = np.array([enclosed_volume(corners[shell == number]) < 0 for number in range(count)])
    found = []
    for number in np.flatnonzero(nested | hollow).tolist():
        of_shell = np.flatnonzero(shell == number)
        if nested[number]:
            message = f"A shell of {{count}} lies within the solid of '{name}' and is taken as part of it."
            mend = "If it is meant as a cavity, flip its normals; else delete it."
            found += _of_faces("nested solid", message, mend, surface, of_shell, WARNING)
        else:
            message = f"A shell of {{count}} within '{name}' bounds a cavity."
            found += _of_faces("cavity", message, "", surface, of_shell, NOTE)
    bodies = int(np.count_nonzero(~nested & ~hollow))
    if bodies > 1:
        found.append(Finding("separate shells", f"'{name}' is made of {bodies} separate bodies.", severity=NOTE))
    return found


def _thin(surface: Surface, name: str, size: float | None) -> list[Finding]:
    if not size:
        return []
    face, wall = thin_places(triangle_corners(surface), size)
    thin = np.isfinite(wall)
    return _of_faces(
        "thin walls",
        f"Walls of '{name}' are down to {1e3 * wall.min():.3g} mm, thinner than the size of {1e3 * size:.3g} mm.",
        "The tetrahedra there get flat; choose a smaller size if the heat across these walls matters.",
        surface, face[thin], WARNING,
    )  # fmt: skip
