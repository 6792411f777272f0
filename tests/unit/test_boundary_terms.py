"""The loads and matrices of surface terms, against their integrals in closed form.

Common practice, no source: a uniform flux q on a flat linear triangle of area A loads each of its nodes with q A / 3;
on a 6-node triangle the corners get nothing and each mid-side q A / 3.
"""

from __future__ import annotations

import numpy as np
import pytest
from cases import case_of, mesh_of
from fluxface.solver.case import Convection, Tag
from fluxface.solver.fem.boundary import face_points, film_matrix, flux_load, surface_jacobian
from fluxface.solver.fem.mesh import FACE_EDGES
from fluxface.solver.physics.problem import SOURCE, put_together
from shapes import box, cylinder, facing, rotation, tagged

Q = 731.0  # W/m2
H = 23.0  # W/(m2 K)

# A scalene triangle in the plane z = 0 and what it becomes in the other coordinate planes and tilted.
FLAT = np.array([[0.01, 0.02, 0.0], [0.05, 0.03, 0.0], [0.02, 0.07, 0.0]])
AREA = 0.5 * (0.04 * 0.05 - 0.01 * 0.01)
TURNS = {
    "xy": np.eye(3),
    "yz": rotation((1, 1, 1), 120.0),
    "zx": rotation((1, 1, 1), 240.0),
    "tilted": rotation((0.3, -1.0, 0.7), 37.0),
}
everywhere = pytest.mark.parametrize("turn", TURNS.values(), ids=TURNS.keys())
both_orders = pytest.mark.parametrize("order", [1, 2])

# h A times these: Zienkiewicz & Taylor, vol. 1 (from memory), mid-sides in the order 01 12 20.
LINEAR_MASS = (np.ones((3, 3)) + np.eye(3)) / 12.0
QUADRATIC_MASS = (
    np.array(
        [
            [6, -1, -1, 0, -4, 0],
            [-1, 6, -1, 0, 0, -4],
            [-1, -1, 6, -4, 0, 0],
            [0, 0, -4, 32, 16, 16],
            [-4, 0, 0, 16, 32, 16],
            [0, -4, 0, 16, 16, 32],
        ]
    )
    / 180.0
)
MASS = {1: LINEAR_MASS, 2: QUADRATIC_MASS}


def one_triangle(turn: np.ndarray, order: int) -> tuple[np.ndarray, np.ndarray]:
    """The triangle as nodes 2, 0, 3 (and 5, 1, 6) of eight; nodes 4 and 7 lie off it."""
    corners = FLAT @ turn.T
    middles = corners[FACE_EDGES].mean(axis=1)
    nodes = np.full((8, 3), 0.5)
    nodes[[2, 0, 3]], nodes[[5, 1, 6]] = corners, middles
    return nodes, np.array([[2, 0, 3] + [5, 1, 6] * (order == 2)])


def points_of(turn: np.ndarray, order: int):
    nodes, boundary = one_triangle(turn, order)
    return boundary[0], face_points(nodes, boundary, np.array([0]), 2 * order)


@everywhere
def test_uniform_flux_on_three_nodes(turn: np.ndarray) -> None:
    mine, points = points_of(turn, 1)
    load = flux_load(points, Q)
    np.testing.assert_allclose(load[mine], Q * AREA / 3.0, rtol=1e-12)
    assert not np.delete(load, mine).any()


@everywhere
def test_uniform_flux_on_six_nodes(turn: np.ndarray) -> None:
    mine, points = points_of(turn, 2)
    load = flux_load(points, Q)
    np.testing.assert_allclose(load[mine[:3]], 0.0, rtol=0, atol=1e-14 * Q * AREA)
    np.testing.assert_allclose(load[mine[3:]], Q * AREA / 3.0, rtol=1e-12)
    assert not np.delete(load, mine).any()


@both_orders
def test_loads_are_the_same_in_every_plane_and_whichever_way_the_face_looks(order: int) -> None:
    loads = [flux_load(points_of(turn, order)[1], Q) for turn in TURNS.values()]
    np.testing.assert_allclose(loads, np.broadcast_to(loads[0], np.shape(loads)), rtol=1e-12, atol=1e-14 * Q * AREA)
    nodes, boundary = one_triangle(TURNS["tilted"], order)
    other_way = boundary[:, [0, 2, 1] + [5, 4, 3] * (order == 2)]
    np.testing.assert_allclose(
        flux_load(face_points(nodes, other_way, np.array([0]), 2), Q), loads[0], rtol=1e-12, atol=1e-14 * Q * AREA
    )


@both_orders
def test_a_flux_that_varies_along_the_face(order: int) -> None:
    """A flux that the shape functions hold exactly loads the nodes with the mass matrix times its nodal values."""
    mine, points = points_of(TURNS["tilted"], order)
    nodal = np.random.default_rng(5).uniform(-1, 1, len(mine))
    by_node = np.zeros(8)
    by_node[mine] = nodal
    load = flux_load(points, points.shape @ by_node)
    np.testing.assert_allclose(load[mine], AREA * MASS[order] @ nodal, rtol=0, atol=1e-14 * AREA)


@everywhere
@both_orders
def test_film_matrix_is_the_consistent_one(turn: np.ndarray, order: int) -> None:
    mine, points = points_of(turn, order)
    matrix = film_matrix(points, H).toarray()
    np.testing.assert_allclose(matrix[np.ix_(mine, mine)], H * AREA * MASS[order], rtol=0, atol=1e-13 * H * AREA)
    off = np.setdiff1d(np.arange(8), mine)
    assert not matrix[off].any() and not matrix[:, off].any()


@everywhere
def test_surface_jacobian_is_twice_the_area(turn: np.ndarray) -> None:
    """Of the parent triangle, whose area is one half."""
    jacobian = surface_jacobian(FLAT @ turn.T, np.arange(3)[None])
    np.testing.assert_allclose(jacobian, 2.0 * AREA, rtol=1e-12)


@both_orders
def test_all_of_the_flux_on_many_faces_arrives_and_none_off_them(order: int) -> None:
    mesh = mesh_of(tagged(box((0.03, 0.05, 0.02)), 0, facing("+y")), order, 0.01)
    facets = np.flatnonzero(mesh.boundary_tag == 0)
    points = face_points(mesh.nodes, mesh.boundary, facets, 2 * order)
    load = flux_load(points, Q)
    assert load.sum() == pytest.approx(Q * 0.03 * 0.02, rel=1e-12)
    on_face = np.isclose(mesh.nodes[:, 1], 0.05, rtol=0, atol=1e-12)
    assert not load[~on_face].any()
    assert set(np.flatnonzero(on_face)) == set(np.unique(mesh.boundary[facets]))
    matrix = film_matrix(points, H)
    assert matrix.sum() == pytest.approx(H * 0.03 * 0.02, rel=1e-12)


@both_orders
def test_a_given_total_is_spread_over_the_measured_area(order: int) -> None:
    """The wall of a cylinder in twelve facets measures twelve chords times its height, not 2 pi r times it."""
    radius, height, total = 0.02, 0.05, 12.0
    wall = tagged(cylinder(radius, height, 12), 0, lambda centres, normals: abs(normals[:, 2]) < 0.5)
    case = case_of(
        tagged(wall, 1, facing("-z")),
        [Tag("wall", heat=total), Tag("foot", convection=Convection(300.0, 10.0))],
        order=order,
        size=0.01,
    )
    problem = put_together(case, mesh_of(case.surface, order, 0.01))
    patch = problem.patches[0]
    area = 12 * 2.0 * radius * np.sin(np.pi / 12) * height
    assert patch.area == pytest.approx(area, rel=1e-12)
    assert patch.laws[SOURCE].source == pytest.approx(total / area, rel=1e-12)
    assert flux_load(patch.points, patch.laws[SOURCE].source).sum() == pytest.approx(total, rel=1e-12)
