"""A manufactured solution in a cube, and the nodal loads that textbooks print.

Roache, Verification and Validation in Computational Science and Engineering, 1998: choose the temperature, derive what
it needs, and see the error fall at the elements' own order. Here every face carries one number (held, insulated, or a
film), and the heat released inside alone varies from place to place. A case gives each part one figure for that, so
the checks begin behind the case's door: at the problem put together from case and mesh.

Orders of L2 and H1 errors: Zienkiewicz & Taylor, The Finite Element Method, vol. 1; Hughes, The Finite Element
Method, 1987: one more than the order of the element, and the order itself.
"""

from __future__ import annotations

from itertools import permutations

import numpy as np
import pytest
from fluxface.solver.case import Accuracy, Case, Convection, Part, Tag
from fluxface.solver.fem.boundary import face_points, flux_load
from fluxface.solver.fem.mesh import Mesh, quadratic
from fluxface.solver.fem.reference import quadrature, shape_functions
from fluxface.solver.fem.volume import geometry, gradients_at, heat_load
from fluxface.solver.geometry.tetrahedra import outer_faces
from fluxface.solver.materials import Material
from fluxface.solver.physics.problem import Problem, held_nodes, put_together
from fluxface.solver.physics.steady import assembled
from scipy.sparse.linalg import spsolve
from shapes import box

SIDE, CONDUCTIVITY, AMBIENT = 0.1, 15.0, 300.0
FILM = CONDUCTIVITY * np.tan(1.0) / SIDE
SOURCE = CONDUCTIVITY * (1.25 * np.pi**2 + 1.0) / SIDE**2  # W/m3 per kelvin above the ambient
HELD, COOLED = 0, 1


def rise(x: np.ndarray) -> np.ndarray:
    """K above the ambient at x (..., 3) m."""
    x, y, z = np.moveaxis(x / SIDE, -1, 0)
    return 40.0 * np.sin(np.pi * x) * np.cos(np.pi * y / 2.0) * np.cos(z)


def rise_gradient(x: np.ndarray) -> np.ndarray:
    x, y, z = np.moveaxis(x / SIDE, -1, 0)
    u, v, w = np.pi * x, np.pi * y / 2.0, z
    along = (
        np.pi * np.cos(u) * np.cos(v) * np.cos(w),
        -np.pi / 2.0 * np.sin(u) * np.sin(v) * np.cos(w),
        -np.sin(u) * np.cos(v) * np.sin(w),
    )
    return 40.0 / SIDE * np.stack(along, axis=-1)


def cube(divisions: int, order: int) -> Mesh:
    """The cube in ``divisions``^3 small ones, each in six tetrahedra about its diagonal (Kuhn's division)."""
    count = divisions + 1
    index = np.stack(np.meshgrid(*[np.arange(count)] * 3, indexing="ij"), axis=-1).reshape(-1, 3)
    lowest = index[(index < divisions).all(axis=1)]
    steps = np.array([np.cumsum(np.eye(3, dtype=int)[list(way)], axis=0) for way in permutations(range(3))])
    paths = np.concatenate([np.zeros((6, 1, 3), int), steps], axis=1)
    cells = (lowest[:, None, None] + paths).reshape(-1, 4, 3) @ (count**2, count, 1)
    edges = index[cells[:, 1:]] - index[cells[:, :1]]
    cells = np.where((np.linalg.det(edges) < 0)[:, None], cells[:, [0, 2, 1, 3]], cells)
    boundary = outer_faces(cells)
    centre = index[boundary].mean(axis=1) / divisions
    tag = np.full(len(boundary), -1)
    tag[np.isclose(centre[:, 2], 1.0)] = COOLED
    tag[np.isclose(centre[:, 0], 0.0) | np.isclose(centre[:, 0], 1.0) | np.isclose(centre[:, 1], 1.0)] = HELD
    none = np.zeros(len(boundary), int)
    mesh = Mesh(SIDE / divisions * index, cells, np.zeros(len(cells), int), boundary, tag, none, none)
    return mesh if order == 1 else quadratic(mesh)


def problem_of(mesh: Mesh) -> Problem:
    tags = Tag("held", temperature=AMBIENT), Tag("cooled", convection=Convection(AMBIENT, coefficient=FILM))
    part = Part("cube", Material("invented", (CONDUCTIVITY,)))
    return put_together(Case(box((SIDE, SIDE, SIDE)), (part,), tags, accuracy=Accuracy(mesh.order)), mesh)


def places(mesh: Mesh, barycentric: np.ndarray) -> np.ndarray:
    """(P, M, 3) m of barycentric points (P, 4) in every cell."""
    return np.einsum("pa,mai->pmi", barycentric, mesh.nodes[mesh.cells[:, :4]])


def solved(problem: Problem) -> np.ndarray:
    """(N,) K above the ambient."""
    mesh = problem.mesh
    system = assembled(problem, AMBIENT)
    points, weights = quadrature(3, mesh.order + 4)
    released = SOURCE * rise(places(mesh, points))
    shares = np.einsum("p,pm,pa,m->ma", weights, released, shape_functions(points, mesh.order), problem.volume)
    load = system.load + np.bincount(mesh.cells.ravel(), shares.ravel(), len(mesh.nodes))
    nodes, held, _ = held_nodes(problem)
    assert (held == AMBIENT).all()
    free = np.setdiff1d(np.arange(len(mesh.nodes)), nodes)
    found = np.zeros(len(mesh.nodes))
    found[free] = spsolve(system.matrix[free][:, free].tocsc(), load[free], permc_spec="MMD_AT_PLUS_A")
    return found


def errors(divisions: int, order: int) -> tuple[float, float]:
    """The L2 norms of the error and of its gradient."""
    problem = problem_of(cube(divisions, order))
    mesh = problem.mesh
    found = solved(problem)
    points, weights = quadrature(3, 2 * order + 4)
    values = shape_functions(points, order) @ found[mesh.cells].T - rise(places(mesh, points))
    slopes = gradients_at(geometry(mesh), found[mesh.cells], points).transpose(0, 2, 1)
    slopes -= rise_gradient(places(mesh, points))
    squares = values**2, (slopes**2).sum(axis=-1)
    value, slope = (float(np.sqrt(weights @ square @ problem.volume)) for square in squares)
    return value, slope


# As an independent program measured them on the same meshes, from pair to pair.
@pytest.mark.parametrize(
    ("order", "divisions", "of_value", "of_slope"),
    [(1, (4, 8, 16), (1.91894, 1.97565), (0.966341, 0.990160)), (2, (2, 4, 8), (2.92951, 2.98390), (1.85912, 1.94321))],
    ids=["4-node", "10-node"],
)
def test_rates_of_convergence(
    order: int, divisions: tuple[int, ...], of_value: tuple[float, float], of_slope: tuple[float, float]
) -> None:
    found = np.array([errors(count, order) for count in divisions])
    rates = np.log2(found[:-1] / found[1:])
    assert rates[-1, 0] >= {1: 1.85, 2: 2.85}[order]
    assert rates[-1, 1] >= {1: 0.95, 2: 1.9}[order]
    assert rates == pytest.approx(np.stack([of_value, of_slope], axis=1), abs=3e-3)


def test_nodal_loads_of_uniform_heat() -> None:
    """Cook, Malkus, Plesha & Witt, Concepts and Applications of Finite Element Analysis: shares of a uniform load.

    Of a face's: a third to each corner of a 3-node triangle; to a 6-node one's mid-sides, and nothing to its corners.
    Of a volume's: a quarter to each of four nodes; of ten, -1/20 to the corners and 1/5 to the mid-edges.
    """
    faces = {1: [1 / 3] * 3, 2: [0.0] * 3 + [1 / 3] * 3}
    volumes = {1: [0.25] * 4, 2: [-0.05] * 4 + [0.2] * 6}
    for order in (1, 2):
        mesh = cube(1, order)
        problem = problem_of(mesh)
        triangle = mesh.boundary[:1]
        area = 0.5 * np.linalg.norm(np.cross(*np.diff(mesh.nodes[triangle[0, :3]], axis=0)))
        load = flux_load(face_points(mesh.nodes, mesh.boundary, np.array([0]), 2), 700.0)
        assert load[triangle[0]] == pytest.approx(np.array(faces[order]) * 700.0 * area, rel=1e-12, abs=1e-15)
        assert not np.delete(load, triangle[0]).any()

        alone = np.zeros(len(mesh.cells))
        alone[0] = 9e5
        load = heat_load(mesh, problem.volume, alone)
        expected = np.array(volumes[order]) * 9e5 * problem.volume[0]
        assert load[mesh.cells[0]] == pytest.approx(expected, rel=1e-12)
        assert not np.delete(load, mesh.cells[0]).any()
