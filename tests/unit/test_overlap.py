"""Overlap of unlike triangulations, touching parts and crossing parts, against plane geometry worked out by hand.

Areas and integrals follow from elementary geometry (own derivation, shown beside each check); there is no other source.
"""

from __future__ import annotations

import time
from itertools import pairwise

import numpy as np
import pytest
from fluxface.solver.geometry.overlap import (
    Overlap,
    covered_area,
    crossing_parts,
    default_gap,
    facet_rises,
    overlap,
    touching_parts,
)
from scipy.spatial import ConvexHull, Delaunay

pytestmark = pytest.mark.filterwarnings("error")

GAP = 1e-4


# Shapes ------------------------------------------------------------------------------------------------------------


def rectangle(low: tuple[float, float], high: tuple[float, float], count: int, seed: int, up: bool) -> np.ndarray:
    """A rectangle of the plane z = 0 in random triangles (F, 3, 3), facing up or down."""
    random = np.random.default_rng(seed)
    edge, ends = random.random(max(count // 10, 1)), np.array([0.0, 1.0])
    inner = random.random((count, 2))
    grid = [np.stack(np.broadcast_arrays(edge[:, None], ends), -1).reshape(-1, 2)]
    grid += [grid[0][:, ::-1], np.array([[0, 0], [0, 1], [1, 0], [1, 1.0]]), inner]
    points = np.concatenate(grid)
    flat = np.array(low) + points * (np.array(high) - np.array(low))
    corners = np.concatenate([flat, np.zeros((len(flat), 1))], axis=1)[Delaunay(points).simplices]
    area = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])[:, 2] / 2
    corners, area = corners[np.abs(area) > 1e-15], area[np.abs(area) > 1e-15]
    return np.where(((area > 0) == up)[:, None, None], corners, corners[:, ::-1])


def box(low: tuple[float, ...], high: tuple[float, ...]) -> np.ndarray:
    unit = np.array([[x, y, z] for x in (0, 1) for y in (0, 1) for z in (0, 1)])
    corners = np.array(low) + unit * (np.array(high) - np.array(low))
    quads = np.array([[0, 1, 3, 2], [4, 6, 7, 5], [0, 4, 5, 1], [2, 3, 7, 6], [0, 2, 6, 4], [1, 5, 7, 3]])
    return np.concatenate([corners[quads[:, [0, 1, 2]]], corners[quads[:, [0, 2, 3]]]])


def circle(count: int, radius: float, height: float, turn: float) -> np.ndarray:
    angle = np.arange(count) * 2 * np.pi / count + turn
    return np.stack([radius * np.cos(angle), radius * np.sin(angle), np.full(count, height)], axis=1)


def band(one: np.ndarray, other: np.ndarray) -> np.ndarray:
    """Quads between two closed rings of points (n, 3), as triangles; outward when ``other`` is above ``one``."""
    one_next, other_next = np.roll(one, -1, axis=0), np.roll(other, -1, axis=0)
    return np.concatenate([np.stack([one, one_next, other_next], 1), np.stack([one, other_next, other], 1)])


def shaft(count: int, radius: float, bottom: float, top: float, turn: float = 0.0) -> np.ndarray:
    low, high = circle(count, radius, bottom, turn), circle(count, radius, top, turn)
    hub_low, hub_high = np.tile([0, 0, bottom], (count, 1)), np.tile([0, 0, top], (count, 1))
    caps = [np.stack([hub, ring, np.roll(ring, -1, axis=0)], 1) for hub, ring in ((hub_high, high), (hub_low, low))]
    return np.concatenate([band(low, high), caps[0], caps[1][:, ::-1]])


def sleeve(count: int, bore: float, radius: float, bottom: float, top: float, turn: float = 0.0) -> np.ndarray:
    low, high, low_in, high_in = (
        circle(count, r, z, turn) for r, z in ((radius, bottom), (radius, top), (bore, bottom), (bore, top))
    )
    return np.concatenate([band(low, high), band(high, high_in), band(high_in, low_in), band(low_in, low)])


def ball(count: int, radius: float, centre: tuple[float, float, float] = (0, 0, 0), turn: float = 0.0) -> np.ndarray:
    """Points spread evenly on a sphere and their convex hull."""
    order = np.arange(count) + 0.5
    polar, azimuth = np.arccos(1 - 2 * order / count), np.pi * (1 + 5**0.5) * order + turn
    points = np.stack([np.cos(azimuth) * np.sin(polar), np.sin(azimuth) * np.sin(polar), np.cos(polar)], axis=1)
    corners = points[ConvexHull(points).simplices]
    across = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    outward = np.einsum("fi,fi->f", across, corners.mean(axis=1)) > 0
    return np.where(outward[:, None, None], corners, corners[:, ::-1]) * radius + np.array(centre)


def hollow(outside: np.ndarray, cavity: np.ndarray) -> np.ndarray:
    return np.concatenate([outside, cavity[:, ::-1]])


def areas(corners: np.ndarray) -> np.ndarray:
    return np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1) / 2


def rotation(seed: int) -> np.ndarray:
    turn = np.linalg.qr(np.random.default_rng(seed).standard_normal((3, 3)))[0]
    return turn * np.sign(np.linalg.det(turn))


def assembly(*parts: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    return np.concatenate(parts), np.repeat(np.arange(len(parts)), [len(part) for part in parts])


# Plane overlap -----------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def shifted() -> tuple[np.ndarray, np.ndarray, Overlap]:
    """Rectangles [0, 1] x [0, 1] and [0.3, 1.4] x [0.2, 0.9] in unlike triangles: they share 0.7 x 0.7."""
    first = rectangle((0, 0), (1, 1), 300, 1, up=True)
    second = rectangle((0.3, 0.2), (1.4, 0.9), 200, 2, up=False)
    return first, second, overlap(first, second, GAP)


def test_area_is_exact(shifted):
    assert shifted[2].area.sum() == pytest.approx(0.7 * 0.7, rel=1e-12)


def test_barycentric_coordinates_sum_to_one_and_stay_inside(shifted):
    for barycentric in (shifted[2].first_barycentric, shifted[2].second_barycentric):
        assert np.abs(barycentric.sum(axis=2) - 1).max() < 1e-14
        assert barycentric.min() > -1e-12


def test_both_sides_name_the_same_points(shifted):
    first, second, shared = shifted
    here = np.einsum("kcv,kvx->kcx", shared.first_barycentric, first[shared.first])
    there = np.einsum("kcv,kvx->kcx", shared.second_barycentric, second[shared.second])
    assert np.abs(here - there).max() < 1e-13
    assert areas(here) == pytest.approx(shared.area, rel=1e-9, abs=1e-16)


def test_integral_of_a_linear_function_is_the_same_from_both_sides(shifted):
    first, second, shared = shifted
    slope = np.array([2.0, -3.0, 0.0])
    # Over [0.3, 1] x [0.2, 0.9] the mean of 5 + 2x - 3y is its value at the centre (0.65, 0.55).
    exact = 0.49 * (5 + 2 * 0.65 - 3 * 0.55)
    for corners, index, barycentric in (
        (first, shared.first, shared.first_barycentric),
        (second, shared.second, shared.second_barycentric),
    ):
        nodal = 5 + corners[index] @ slope
        integral = np.einsum("k,kcv,kv->", shared.area / 3, barycentric, nodal)
        assert integral == pytest.approx(exact, rel=1e-12)


def test_each_triangle_of_coinciding_faces_is_covered_once():
    first = rectangle((0, 0), (1, 1), 300, 3, up=True)
    second = rectangle((0, 0), (1, 1), 200, 4, up=False)
    shared = overlap(first, second, GAP)
    assert covered_area(shared.first, shared.area, len(first)) == pytest.approx(areas(first), rel=1e-9, abs=1e-15)
    assert covered_area(shared.second, shared.area, len(second)) == pytest.approx(areas(second), rel=1e-9, abs=1e-15)


def test_square_turned_by_45_degrees():
    # A unit square and itself turned by 45 degrees share a regular octagon of inradius 1/2: 2 (sqrt 2 - 1).
    first = rectangle((-0.5, -0.5), (0.5, 0.5), 200, 5, up=True)
    second = rectangle((-0.5, -0.5), (0.5, 0.5), 100, 6, up=False)
    half = np.sqrt(0.5)
    second = second @ np.array([[half, half, 0], [-half, half, 0], [0, 0, 1]])
    assert overlap(first, second, GAP).area.sum() == pytest.approx(2 * (np.sqrt(2) - 1), rel=1e-12)


def shared_by_two_triangles(one: np.ndarray, other: np.ndarray) -> float:
    """Area both (3, 2) cover: the hull of the corners inside the other and of the crossings of the edges."""

    def holds(triangle: np.ndarray, points: np.ndarray) -> np.ndarray:
        barycentric = np.linalg.solve(np.vstack([triangle.T, np.ones(3)]), np.vstack([points.T, np.ones(len(points))]))
        return (barycentric > -1e-12).all(axis=0)

    found = [one[holds(other, one)], other[holds(one, other)]]
    for i in range(3):
        for j in range(3):
            step, cross_step = one[i - 1] - one[i], other[j - 1] - other[j]
            s, t = np.linalg.solve(np.stack([step, -cross_step], 1), other[j] - one[i])
            if 0 <= s <= 1 and 0 <= t <= 1:
                found.append((one[i] + s * step)[None])
    points = np.concatenate(found)
    return float(ConvexHull(points).volume) if len(points) > 2 else 0.0


def test_single_triangles_agree_with_another_way_of_clipping():
    random = np.random.default_rng(7)
    seen = set()
    for one, other in random.random((200, 2, 3, 2)):
        first, second = (np.concatenate([flat, np.zeros((3, 1))], axis=1)[None] for flat in (one, other))
        for side, up in ((first, 1), (second, -1)):
            if np.cross(side[0, 1] - side[0, 0], side[0, 2] - side[0, 0])[2] * up < 0:
                side[:] = side[:, ::-1]
        shared = overlap(first, second, GAP)
        seen.add(len(shared.area))
        assert shared.area.sum() == pytest.approx(shared_by_two_triangles(one, other), abs=1e-13)
    assert seen >= {0, 1, 2, 3, 4}  # from apart to hexagons


@pytest.mark.parametrize("scale", [1e-3, 1.0, 1e3])
def test_moving_turning_and_scaling_change_nothing(shifted, scale):
    first, second, shared = shifted
    turn, move = rotation(8) * scale, np.array([3.0, -2.0, 5.0]) * scale
    moved = overlap(first @ turn + move, second @ turn + move, GAP * scale)
    assert moved.area.sum() == pytest.approx(0.49 * scale**2, rel=1e-12)
    there = covered_area(moved.first, moved.area, len(first)) / scale**2
    assert there == pytest.approx(covered_area(shared.first, shared.area, len(first)), abs=1e-13)


def test_swapping_the_sides_swaps_the_overlap():
    first, second = shaft(24, 1, 0, 1), sleeve(40, 1, 2, 0, 1, turn=0.1)
    there, back = overlap(first, second, GAP), overlap(second, first, GAP)
    assert back.area.sum() == pytest.approx(there.area.sum(), rel=1e-10)
    assert covered_area(back.second, back.area, len(first)) == pytest.approx(
        covered_area(there.first, there.area, len(first)), rel=1e-9, abs=1e-12
    )


def test_sizes_far_apart():
    # Two triangles of metres under cells from micrometres up: the shared square is the whole of the fine one.
    steps = np.concatenate([[0.0], np.cumsum(np.geomspace(1e-6, 1e-1, 40))])
    x, y = np.meshgrid(steps, steps, indexing="ij")
    points = np.stack([x, y, np.zeros_like(x)], axis=-1)
    quads = [points[:-1, :-1], points[1:, :-1], points[1:, 1:], points[:-1, 1:]]
    fine = np.concatenate(
        [np.stack([quads[k] for k in order], 2).reshape(-1, 3, 3) for order in ((0, 1, 2), (0, 2, 3))]
    )
    coarse = rectangle((-50, -50), (50, 50), 0, 9, up=False)
    shared = overlap(fine, coarse, GAP)
    assert covered_area(shared.first, shared.area, len(fine)) == pytest.approx(areas(fine), rel=1e-9)
    assert shared.area.sum() == pytest.approx(steps[-1] ** 2, rel=1e-12)


# Gap and facing ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("distance", "area"), [(0.99, 1.0), (-0.99, 1.0), (1.01, 0.0), (-1.01, 0.0)])
def test_gap_is_respected_either_way(distance, area):
    first = rectangle((0, 0), (1, 1), 50, 10, up=True)
    second = rectangle((0, 0), (1, 1), 40, 11, up=False) + np.array([0, 0, distance * GAP])
    assert overlap(first, second, GAP).area.sum() == pytest.approx(area, rel=1e-12)


def test_wedge_is_in_contact_as_far_as_it_is_narrow_enough():
    # Faces that part by the angle t from a common edge are 2 s sin(t/2) apart along the mean normal at the distance s.
    angle, gap = np.radians(10), 0.05
    first = rectangle((0, 0), (1, 1), 60, 12, up=True)
    second = rectangle((0, 0), (1, 1), 50, 13, up=False)
    tilt = np.array([[np.cos(angle), 0, np.sin(angle)], [0, 1, 0], [-np.sin(angle), 0, np.cos(angle)]])
    assert overlap(first, second @ tilt, gap).area.sum() == pytest.approx(gap / (2 * np.sin(angle / 2)), rel=1e-12)


def test_faces_that_look_the_same_way_do_not_touch():
    face = rectangle((0, 0), (1, 1), 50, 14, up=True)
    assert len(overlap(face, face, GAP).area) == 0


def test_faces_across_an_edge_do_not_touch():
    wall = rectangle((0, 0), (1, 1), 50, 15, up=True)[:, :, [2, 1, 0]]
    assert len(overlap(rectangle((0, 0), (1, 1), 50, 15, up=True), wall, GAP).area) == 0


def test_nothing_against_something():
    nothing, face = np.zeros((0, 3, 3)), rectangle((0, 0), (1, 1), 5, 16, up=True)
    for first, second in ((nothing, face), (face, nothing), (nothing, nothing)):
        shared = overlap(first, second, GAP)
        assert shared.area.shape == (0,) and shared.first_barycentric.shape == (0, 3, 3)
    assert covered_area(shared.first, shared.area, 4).tolist() == [0, 0, 0, 0]
    assert touching_parts(nothing, np.zeros(0, dtype=int)) == crossing_parts(nothing, np.zeros(0, dtype=int)) == []


def test_triangles_without_area_are_passed_over():
    first, second = rectangle((0, 0), (1, 1), 20, 17, up=True), rectangle((0, 0), (1, 1), 20, 18, up=False)
    spoilt = np.concatenate([first, np.repeat(first[:2, :1], 3, axis=1)])
    assert overlap(spoilt, second, GAP).area.sum() == pytest.approx(1.0, rel=1e-12)


# Curved faces ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("inner", "outer"), [(32, 32), (32, 48), (12, 64), (64, 12), (100, 16), (11, 11)])
def test_shaft_meets_a_bore_of_unlike_facets(inner, outer):
    corners, part = assembly(shaft(inner, 1, 0, 1), sleeve(outer, 1, 2, 0, 1, turn=0.1))
    [(i, j, area)] = touching_parts(corners, part)
    # An inscribed polygon's perimeter falls short of the circle's by less than its rise over the radius.
    assert (i, j) == (0, 1)
    assert area == pytest.approx(2 * np.pi, rel=1 - np.cos(np.pi / min(inner, outer)))
    assert crossing_parts(corners, part) == []


def test_ball_meets_a_socket_of_unlike_facets():
    socket = hollow(box((-2, -2, -2), (2, 2, 2)), ball(700, 1, turn=0.4))
    corners, part = assembly(socket, ball(500, 1))
    assert touching_parts(corners, part)[0][2] == pytest.approx(4 * np.pi, rel=0.01)
    assert crossing_parts(corners, part) == []


def test_a_true_clearance_stays_open():
    # The rises are 0.0048 and 0.0021 of the radius; 0.02 is air.
    assert touching_parts(*assembly(shaft(32, 1, 0, 1), sleeve(48, 1.02, 2, 0, 1))) == []


def test_a_round_face_over_a_plane_one_gains_nothing_by_its_facets():
    roller = shaft(32, 1, 0, 1, turn=np.pi / 32)[:, :, [2, 0, 1]]
    height = np.cos(np.pi / 32) + 2 * GAP
    assert len(overlap(roller, box((-2, -2, -2), (2, 2, -height)), GAP).area) == 0


@pytest.mark.parametrize("columns", [1, 4])
@pytest.mark.parametrize("rows", [1, 5])
def test_rise_of_a_cylinders_facets_does_not_depend_on_how_they_are_cut(columns, rows):
    # A chord of the unit circle is 1 - cos(pi/n) below it at its middle.
    corner, height = circle(24, 1, 0, 0), np.linspace(0, 1, rows + 1)
    share = np.arange(columns)[:, None] / columns
    ring = np.concatenate([a + share * (b - a) for a, b in zip(corner, np.roll(corner, -1, axis=0), strict=True)])
    tube = np.concatenate(
        [band(ring + np.array([0, 0, low]), ring + np.array([0, 0, high])) for low, high in pairwise(height)]
    )
    true = 1 - np.cos(np.pi / 24)
    convex, concave = facet_rises(tube)
    assert (convex > true).all() and (convex < 1.6 * true).all() and not concave.any()
    convex, concave = facet_rises(tube[:, ::-1])
    assert (concave > true).all() and (concave < 1.6 * true).all() and not convex.any()


def test_rise_of_a_plane_face_beside_a_fillet_is_the_fillets():
    # A 10 x 10 plate whose long edges are rounded by 0.1 in steps of 15 degrees.
    angle = np.radians(np.arange(0, 91, 15))
    arc = np.stack([0.1 * np.sin(angle), 0.1 * np.cos(angle) - 0.1], axis=1)
    profile = np.concatenate([[[-10.0, 0.0]], arc])
    low, high = (np.insert(profile, 1, y, axis=1) for y in (0.0, 10.0))
    quads = np.stack([low[:-1], low[1:], high[1:], high[:-1]], axis=1)
    convex, _ = facet_rises(np.concatenate([quads[:, [0, 1, 2]], quads[:, [0, 2, 3]]]))
    assert 0 < convex[0] < 0.01


# Parts -------------------------------------------------------------------------------------------------------------


def test_touching_parts_are_found_with_their_areas():
    corners, part = assembly(
        box((0, 0, 0), (4, 4, 1)), box((1, 1, 1), (2, 3, 2)), box((2, 1, 1), (3, 3, 1.5)), box((0, 0, 5), (1, 1, 6))
    )
    found = touching_parts(corners @ rotation(19), part)
    assert [pair[:2] for pair in found] == [(0, 1), (0, 2), (1, 2)]
    assert [pair[2] for pair in found] == pytest.approx([2.0, 2.0, 1.0], rel=1e-12)


def test_default_gap_is_of_the_pairs_diagonal():
    low, high = box((0, 0, 0), (1, 2, 1)), box((0, 0, 1), (1, 2, 2))
    gap = default_gap(low, high)
    assert gap == pytest.approx(1e-4 * 3)  # diagonal of 1 x 2 x 2
    for lift, touches in ((0.99, True), (1.01, False)):
        assert bool(touching_parts(*assembly(low, high + np.array([0, 0, lift * gap])))) is touches


PLATE = box((-5, -5, 0), (5, 5, 1))
HOLLOW = hollow(PLATE, box((-1, -1, 0.3), (1, 1, 0.6)))

CROSSING = {
    "bolt through a plate": (PLATE, shaft(24, 1, -3, 4)),
    "bars of one height": (box((-5, -1, 0), (5, 1, 1)), box((-1, -5, 0), (1, 5, 1))),
    "sunk block": (PLATE, box((-1, -1, 0.95), (1, 1, 2))),
    "sunk block of the same outline": (PLATE, box((-5, -5, 0.95), (5, 5, 2))),
    "the same part twice": (PLATE, PLATE),
    "inside the material": (PLATE, box((-1, -1, 0.3), (1, 1, 0.6))),
    "inside the material, flush with its face": (PLATE, box((-1, -1, 0.3), (1, 1, 1))),
    "one of two pieces inside": (PLATE, np.concatenate([box((-1, -1, 3), (1, 1, 9)), box((0, 0, 0.3), (1, 1, 0.6))])),
    "in a hollow, too tall for it": (HOLLOW, box((-0.5, -0.5, 0.3), (0.5, 0.5, 0.65))),
    "shaft too thick for its bore": (sleeve(48, 0.98, 2, 0, 1), shaft(32, 1, -1, 2)),
    "balls": (ball(500, 1), ball(700, 1, (1.95, 0, 0))),
    "ball out of centre in its socket": (
        hollow(box((-2, -2, -2), (2, 2, 2)), ball(700, 1, turn=0.4)),
        ball(500, 1, (0.05, 0, 0)),
    ),
}
SOUND = {
    "block on a plate": (PLATE, box((-1, -1, 1), (1, 1, 2))),
    "block sunk by less than the gap": (PLATE, box((-1, -1, 0.9995), (1, 1, 2))),
    "same outline": (PLATE, box((-5, -5, 1), (5, 5, 2))),
    "side by side": (PLATE, box((5, -5, 0), (6, 5, 1))),
    "corner to corner": (PLATE, box((5, 5, 1), (6, 6, 2))),
    "fills a hollow": (HOLLOW, box((-1, -1, 0.3), (1, 1, 0.6))),
    "loose in a hollow": (HOLLOW, box((-0.5, -0.5, 0.4), (0.5, 0.5, 0.5))),
    "long shaft in a bore": (sleeve(48, 1, 2, 0, 1), shaft(32, 1, -1, 2, turn=0.07)),
    "apart": (PLATE, box((-1, -1, 4), (1, 1, 5))),
}


@pytest.mark.parametrize("name", CROSSING)
@pytest.mark.parametrize("seed", [None, 20, 21])
def test_crossing_parts_are_found(name, seed):
    turn = np.eye(3) if seed is None else rotation(seed) * 1e-3
    corners, part = assembly(*CROSSING[name])
    [crossing] = crossing_parts(corners @ turn, part)
    assert crossing.parts == (0, 1)
    assert crossing.points.shape == (len(crossing.points), 3)


@pytest.mark.parametrize("name", SOUND)
@pytest.mark.parametrize("seed", [None, 20, 21])
def test_parts_that_do_not_cross_are_left_alone(name, seed):
    turn = np.eye(3) if seed is None else rotation(seed) * 1e-3
    corners, part = assembly(*SOUND[name])
    assert crossing_parts(corners @ turn, part) == []


def test_crossing_points_lie_in_both():
    [crossing] = crossing_parts(*assembly(*CROSSING["bolt through a plate"]))
    x, y, z = crossing.points.T
    assert (np.hypot(x, y) < 1).all() and (z > 0).all() and (z < 1).all()


def test_many_parts_are_judged_pair_by_pair():
    parts = [box((k, 0, 0), (k + 1, 1, 1)) for k in range(5)] + [box((1.5, 0.25, 0.25), (2.5, 0.75, 0.75))]
    corners, part = assembly(*parts)
    assert [crossing.parts for crossing in crossing_parts(corners, part)] == [(1, 5), (2, 5)]
    assert [pair[:2] for pair in touching_parts(corners, part)] == [(k, k + 1) for k in range(4)]


@pytest.mark.slow
def test_fifty_thousand_faces_a_side():
    first = rectangle((0, 0), (1, 1), 22_500, 22, up=True)
    second = rectangle((0, 0), (1, 1), 22_500, 23, up=False)
    began = time.perf_counter()
    shared = overlap(first, second, GAP)
    took = time.perf_counter() - began
    print(f"\n{len(first)} x {len(second)} faces: {len(shared.area)} pieces in {took:.2f} s")
    assert shared.area.sum() == pytest.approx(1.0, rel=1e-12)
