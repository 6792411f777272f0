"""Tetrahedra that fill a part: TetGen with facet markers, so that every boundary triangle knows its polygon and tag.

Si, TetGen, a Delaunay-based quality tetrahedral mesh generator, ACM Trans. Math. Software 41 (2015) 11.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ..case import Accuracy, Surface
from ..errors import Trouble
from ..fem.mesh import CELL_FACES, Mesh, face_keys
from ..parallel import slices
from .apart import Apart, run_apart
from .boxes import boxes, boxes_of, meeting
from .edges import edges_of, groups, neighbours
from .sizing import (
    COMPACT_CELLS,
    FLAT_CELLS,
    LARGEST_CELL,
    LONGEST_EDGE,
    MEAN_CELL,
    POINTS_OF_WALLS,
    REGULAR,
    points_of_walls,
    size_by_default,
)
from .splitting import split_to_size
from .surface import area_vectors, areas, centred, distances, enclosed_volume, triangle_corners, winding_numbers

# Narrow facets ask for ever more points; when the size is ours to choose, this many are enough.
ADDED_POINTS_BY_DEFAULT = 40_000
# Quadratic nodes per corner node: one for each edge more, of which a large mesh has about seven a corner.
NODES_PER_CORNER = {1: 1.0, 2: 7.5}
# Radians: triangles that meet at less are one plane. Between the rounding of single-precision coordinates on a flat
# face and the turn from one facet to the next of the finest curved surface.
FLAT = 3e-4
FLATTEST = 1e-13  # of the cube of the longest edge: the least volume of a cell
CELLS_AT_ONCE = 8192  # so that what is computed on the way stays in the cache
# Of the unit diagonal: how far a boundary triangle's middle usually lies from its modelled face, and how much wider one
# is sought where none is so near.
REACH, WIDER = 1e-6, 10.0
# s: where a size is given, and where it is ours to choose, with so much more for each triangle.
SECONDS, SECONDS_BY_DEFAULT, SECONDS_PER_FACE = 900, 45, 4e-4
# Axes that no modelled edge follows.
ASKEW = np.linalg.qr(np.array([[0.31, 0.77, 0.29], [-0.61, 0.43, 0.53], [0.71, -0.13, 0.59]]))[0]


@dataclass(frozen=True)
class Attempt:
    """One way to ask the mesher. switches: added to the usual ones. turned: the part in axes that no edge follows.

    patience: the share of the time that it is given; what takes longer seldom ends.
    """

    switches: str = ""
    turned: bool = False
    patience: float = 1.0


# What one way refuses another often takes: which predicates come out as zero depends on axes and tolerance. Measured.
ATTEMPTS = (Attempt(), Attempt(turned=True), Attempt("T1e-12"))
KEEPING_FACETS = (Attempt("Y", patience=0.4),)
KEPT = 5.0  # of the size: the longest edge of a facet that is kept as it is


def fill(surface: Surface, name: str, part: int, accuracy: Accuracy, finest: np.ndarray | None = None) -> Mesh:
    """4-node tetrahedra within the closed surface of one part.

    finest: (F,) m, the longest edge each triangle shall have; infinite, or None for all, where the part's size will do.
    Raises Trouble of kind "geometry" when the surface cannot be filled, "limits" when it would take too many nodes.
    """
    expected = expected_nodes(surface, accuracy)
    if expected > accuracy.max_nodes:
        raise _too_many(name, expected, accuracy)
    unit, centre, scale = centred(surface)
    corners = triangle_corners(unit)
    size = accuracy.size / scale if accuracy.size else size_by_default(enclosed_volume(corners))
    flat = points_of_walls(corners, size) > POINTS_OF_WALLS
    longest = np.full(len(corners), np.inf) if finest is None else finest / scale
    if flat and accuracy.size:
        longest = np.minimum(longest, LONGEST_EDGE * size)
    unit = _split(unit, longest, name, accuracy)
    switches = _switches(size, FLAT_CELLS if flat else COMPACT_CELLS, accuracy)
    try:
        filled = _filled(unit, (centre, scale), switches, ATTEMPTS, name, accuracy)
    except Trouble as trouble:
        if not may_be_mended(trouble):
            raise
        # Facets that the mesher cannot split, or splits without end, it often takes as they are; they may only not be
        # far too large for the size.
        unit = _split(unit, np.full(len(unit.triangles), KEPT * size), name, accuracy)
        try:
            filled = _filled(unit, (centre, scale), switches, KEEPING_FACETS, name, accuracy)
        except Trouble:
            raise trouble from trouble.__cause__
    return Mesh(
        nodes=filled.nodes * scale + centre,
        cells=filled.cells,
        cell_part=np.full(len(filled.cells), part, np.int32),
        boundary=filled.boundary,
        boundary_tag=filled.tag,
        boundary_part=np.full(len(filled.boundary), part, np.int32),
        boundary_face=unit.face[filled.face],
    )


@dataclass(frozen=True)
class _Filled:
    """nodes (N, 3) of unit diagonal, cells (M, 4), boundary (B, 3); its tags and the surface's triangles there (B,)."""

    nodes: np.ndarray
    cells: np.ndarray
    boundary: np.ndarray
    tag: np.ndarray
    face: np.ndarray


def _filled(
    unit: Surface,
    frame: tuple[np.ndarray, float],
    switches: str,
    attempts: Sequence[Attempt],
    name: str,
    accuracy: Accuracy,
) -> _Filled:
    """What fills the surface of unit diagonal. frame: centre (3,) and diagonal, m, of the part itself."""
    corners = triangle_corners(unit)
    markers = _flat_patches(unit) + 1
    found = _tetrahedralise(unit, markers, switches, attempts, name, accuracy)
    cells = _within(found["points"], found["cells"], found["regions"], corners)
    boundary = outer_faces(cells)
    marker = _markers_of(boundary, found["faces"], found["markers"], len(found["points"]))
    points, cells, boundary = _used(found["points"], cells, boundary)
    _check_cells(points, cells, name, *frame)
    _check_faithful(points, boundary, marker, corners, markers, name)
    tag_of = np.empty(markers.max() + 1, np.int32)
    tag_of[markers] = unit.tag
    face = _lying_on(points[boundary].mean(axis=1), marker, corners, markers)
    return _Filled(points, cells, boundary, tag_of[marker], face)


def _flat_patches(surface: Surface) -> np.ndarray:
    """(F,) a number for each set of triangles of one tag that lie in one plane, to mark them as one facet.

    TetGen may unite facets of one mark, even at an angle of a degree, which changes the volume; facets of unlike marks
    in one plane but for rounding it keeps apart, at which it often fails.
    """
    vectors = area_vectors(triangle_corners(surface))
    normal = vectors / np.maximum(np.linalg.norm(vectors, axis=1, keepdims=True), np.finfo(float).tiny)
    one, other, _ = neighbours(edges_of(surface.triangles))
    one, other = one // 3, other // 3
    turn = np.linalg.norm(np.cross(normal[one], normal[other]), axis=1)
    flat = (turn < FLAT) & (np.einsum("ni,ni->n", normal[one], normal[other]) > 0)
    flat &= surface.tag[one] == surface.tag[other]
    return groups(one[flat], other[flat], len(normal))


def _split(unit: Surface, longest: np.ndarray, name: str, accuracy: Accuracy) -> Surface:
    per_triangle = 0.5 * NODES_PER_CORNER[accuracy.order]  # a closed surface has half as many vertices
    # No triangle whose edges are that long is larger than the equilateral one.
    fewest = len(longest) + float((areas(triangle_corners(unit)) / (np.sqrt(0.1875) * longest**2)).sum())
    if fewest * per_triangle > accuracy.max_nodes:
        raise _too_many(name, fewest * per_triangle, accuracy)
    return split_to_size(unit, longest)


def expected_nodes(surface: Surface, accuracy: Accuracy) -> float:
    """How many nodes the inside of a part takes, whatever its surface asks for besides."""
    unit, _, scale = centred(surface)
    volume = enclosed_volume(triangle_corners(unit))
    size = accuracy.size / scale if accuracy.size else size_by_default(volume)
    return volume / (MEAN_CELL * REGULAR * size**3) / 5.5 * NODES_PER_CORNER[accuracy.order]


def _too_many(name: str, nodes: float, accuracy: Accuracy) -> Trouble:
    return Trouble(
        "limits",
        f"'{name}' at this size would take about {nodes:.2g} nodes, above the bound of {accuracy.max_nodes}.",
        "Choose a larger size, or raise the bound on nodes.",
    )


def _switches(size: float, shape: str, accuracy: Accuracy) -> str:
    # s0: no smoothing pass, which takes most of the time; the bound of 10 degrees removes the slivers it would.
    # A: number the regions, so that cavities can be told from solid.
    return f"pq{shape}a{LARGEST_CELL * REGULAR * size**3:.12e}As0S{_most_added(accuracy)}Q"


def _most_added(accuracy: Accuracy) -> int:
    most = int(accuracy.max_nodes / NODES_PER_CORNER[accuracy.order])
    return most if accuracy.size else min(most, ADDED_POINTS_BY_DEFAULT)


def _tetrahedralise(
    unit: Surface, markers: np.ndarray, switches: str, attempts: Sequence[Attempt], name: str, accuracy: Accuracy
) -> dict[str, np.ndarray]:
    """TetGen's points, cells, regions, faces and markers for the surface of unit diagonal."""
    seconds = SECONDS if accuracy.size else round(SECONDS_BY_DEFAULT + SECONDS_PER_FACE * len(unit.triangles))
    refusals = []
    for attempt in attempts:
        axes = ASKEW if attempt.turned else np.eye(3)
        surface = {
            "points": unit.vertices @ axes if attempt.turned else unit.vertices,
            "facets": unit.triangles,
            "markers": markers.astype(np.int32),
        }
        try:
            found = run_apart("tetrahedra", surface, switches + attempt.switches, attempt.patience * seconds)
        except Apart as apart:
            refusals.append(apart)
            if apart.kind in ("missing", "time", "memory"):
                break
            continue
        if accuracy.size and len(found["points"]) - len(unit.vertices) >= _most_added(accuracy):
            raise _too_many(name, len(found["points"]) * NODES_PER_CORNER[accuracy.order], accuracy)
        if attempt.turned:
            found["points"] = found["points"] @ axes.T
            found["points"][: len(unit.vertices)] = unit.vertices
        return found
    raise _refusal(name, refusals, seconds) from refusals[-1]


def may_be_mended(trouble: Trouble) -> bool:
    """Whether another surface may do where this is said of filling one: a geometry, or a mesher that did not end."""
    cause = trouble.__cause__
    return trouble.kind == "geometry" or (isinstance(cause, Apart) and cause.kind == "time")


def _refusal(name: str, refusals: list[Apart], seconds: float) -> Trouble:
    if refusals[-1].kind == "missing":
        return Trouble("geometry", f"The mesher could not start: {refusals[-1].text}.", "Install Fluxface again.")
    if refusals[-1].kind == "time":
        return Trouble(
            "limits",
            f"Filling '{name}' with tetrahedra took longer than {seconds:g} s.",
            "Choose a larger size or simplify the part.",
        )
    if refusals[-1].kind == "memory":
        return Trouble(
            "limits",
            f"There is not enough memory to fill '{name}' with tetrahedra.",
            "Choose a larger size, simplify the part, or close other programs.",
        )
    if all(refusal.kind == "crashed" for refusal in refusals):
        return Trouble(
            "geometry",
            f"The mesher broke down on '{name}'.",
            "Look for crossing, doubled or needle-thin faces, unite or remove them, or choose another size.",
        )
    if any("self-intersect" in refusal.text for refusal in refusals):
        return Trouble(
            "geometry",
            f"Faces of '{name}' run through each other, so it cannot be filled with tetrahedra.",
            "Separate or unite the crossing faces (a boolean union does) and run again.",
        )
    return Trouble(
        "geometry",
        f"'{name}' could not be filled with tetrahedra; its surface probably crosses or touches itself.",
        "Look for crossing, doubled or needle-thin faces, unite or remove them, and run again.",
    )


def _within(points: np.ndarray, cells: np.ndarray, regions: np.ndarray, corners: np.ndarray) -> np.ndarray:
    """The cells of solid regions, each with positive volume; TetGen also fills cavities."""
    a, b, c = (points[cells[:, local]] - points[cells[:, 0]] for local in (1, 2, 3))
    six_volumes = np.einsum("mi,mi->m", a, np.cross(b, c))
    cells = np.where((six_volumes < 0)[:, None], cells[:, [0, 2, 1, 3]], cells)
    order = np.lexsort((-np.abs(six_volumes), regions))
    names, first = np.unique(regions[order], return_index=True)
    largest = order[first]
    solid = winding_numbers(points[cells[largest]].mean(axis=1), corners) > 0.5
    return cells[np.isin(regions, names[solid])].astype(np.int32)


def outer_faces(cells: np.ndarray) -> np.ndarray:
    """(B, 3) the outward faces that belong to one cell alone; cells (M, 4) of positive volume."""
    faces = cells[:, CELL_FACES].reshape(-1, 3)
    keys = face_keys(faces, cells.max() + 1)
    order = np.argsort(keys)
    keys = keys.take(order)
    changes = np.concatenate([[True], keys[1:] != keys[:-1], [True]])
    return faces.take(order[changes[1:] & changes[:-1]], axis=0)


def _markers_of(boundary: np.ndarray, faces: np.ndarray, markers: np.ndarray, nodes: int) -> np.ndarray:
    """(B,) the facet marker of each boundary triangle, out of TetGen's marked faces."""
    keys = face_keys(np.concatenate([boundary, faces]), nodes)
    wanted, known = keys[: len(boundary)], keys[len(boundary) :]
    order = np.argsort(known)
    at = order[np.clip(np.searchsorted(known, wanted, sorter=order), 0, len(known) - 1)]
    return np.where(known[at] == wanted, markers[at], 0)


def _lying_on(places: np.ndarray, marker: np.ndarray, corners: np.ndarray, modelled_marker: np.ndarray) -> np.ndarray:
    """(B,) the modelled triangle (F, 3, 3) nearest to each place (B, 3), among those of its own marker."""
    nearest, least = np.zeros(len(places), np.int64), np.full(len(places), np.inf)
    reach, modelled = REACH, boxes_of(corners)
    while len(missed := np.flatnonzero(np.isinf(least))) and reach < 1:
        # Facets that turn a little from one to the next are one to the mesher, which then leaves them by as much.
        for i, j in meeting(boxes(places[missed], places[missed]), modelled, reach):
            i = missed[i]
            apart = np.where(marker[i] == modelled_marker[j], distances(places[i], corners[j]), np.inf)
            # Of several candidates for one place the last written stays, and that shall be the nearest.
            order = np.argsort(-apart)
            order = order[apart[order] < least[i[order]]]
            least[i[order]], nearest[i[order]] = apart[order], j[order]
        reach *= WIDER
    return nearest


def _used(points: np.ndarray, cells: np.ndarray, boundary: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Without the points that no cell uses."""
    used, numbers = np.unique(cells, return_inverse=True)
    return points[used], numbers.reshape(cells.shape).astype(np.int32), np.searchsorted(used, boundary).astype(np.int32)


def _check_cells(points: np.ndarray, cells: np.ndarray, name: str, centre: np.ndarray, scale: float) -> None:
    """Refuse a mesh with cells so flat that their gradients are rounding alone."""
    flat = np.concatenate([_flat(points, cells[piece]) for piece in slices(len(cells), CELLS_AT_ONCE)])
    if flat.any():
        raise Trouble(
            "geometry",
            f"Tetrahedra of '{name}' come out flat, as its surface has needle-thin faces or tiny edges.",
            "Merge vertices or dissolve edges there and run again.",
            points=(points[cells[flat]].mean(axis=1) * scale + centre).tolist(),
        )


def _flat(points: np.ndarray, cells: np.ndarray) -> np.ndarray:
    """(M,) whether cells (M, 4) have next to no volume for their longest edge."""
    corners = points.take(cells.T, axis=0).transpose(0, 2, 1)
    a, b, c = sides = corners[1:] - corners[0]
    longest = np.sqrt((np.concatenate([sides, sides - sides[[1, 2, 0]]]) ** 2).sum(axis=1).max(axis=0))
    return (a * np.cross(b, c, axis=0)).sum(axis=0) / 6 < FLATTEST * longest**3


def _check_faithful(
    points: np.ndarray,
    boundary: np.ndarray,
    marker: np.ndarray,
    corners: np.ndarray,
    modelled_marker: np.ndarray,
    name: str,
) -> None:
    """Refuse a mesh whose facets are not those of the surface: a silently wrong volume or area is the worst outcome."""
    kinds = modelled_marker.max() + 1
    meshed = np.bincount(marker, areas(points[boundary]), kinds)
    modelled = np.bincount(modelled_marker, areas(corners), kinds)
    volume, filled = enclosed_volume(corners), enclosed_volume(points[boundary])
    if np.abs(meshed - modelled).sum() > 1e-3 * modelled.sum() or abs(filled - volume) > 1e-3 * volume:
        raise Trouble(
            "geometry",
            f"The tetrahedra of '{name}' do not fill what its surface encloses.",
            "Look for shells inside each other, or crossing or doubled faces, and run again.",
        )
