"""How many iterations the solver takes, whatever the size, the shape and the materials: counts, no times.

The bounds are stated here and hold the project's own solver; they come from no publication.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapes
from cases import case_of, mesh_of, metal
from fluxface.solver import pipeline
from fluxface.solver.case import Contact, Tag
from fluxface.solver.fem import linear_algebra
from fluxface.solver.fem.boundary import face_points, film_matrix, flux_load
from fluxface.solver.fem.mesh import Mesh, ordered, quadratic
from fluxface.solver.fem.multigrid import hierarchy, midside_interpolation
from fluxface.solver.fem.volume import conduction_matrix
from fluxface.solver.physics import steady
from fluxface.solver.physics.problem import put_together
from scipy.sparse import csr_array

REDUCTION = 1e-8
FILM, FLUX = 10.0, 1e4  # W/(m2 K), W/m2
# Kuhn's six tetrahedra of a cube: one for each order in which its three edges are walked.
WALKS = np.array([(0, 1, 2), (0, 2, 1), (1, 0, 2), (1, 2, 0), (2, 0, 1), (2, 1, 0)])


def grid(counts: tuple[int, int, int], size: tuple[float, float, float]) -> Mesh:
    """A box (m) of Kuhn's tetrahedra, inner nodes moved askew; its upper face is tagged 1, the lower one 0."""
    number = np.arange(np.prod(np.add(counts, 1))).reshape(np.add(counts, 1))
    nodes = np.stack(np.meshgrid(*(np.arange(c + 1.0) for c in counts), indexing="ij"), -1).reshape(-1, 3)
    start = np.stack(np.meshgrid(*map(np.arange, counts), indexing="ij"), -1).reshape(-1, 3)
    steps = np.zeros((6, 4, 3), int)
    steps[:, 1:] = np.cumsum(np.eye(3, dtype=int)[WALKS], axis=1)
    corners = start[:, None, None] + steps
    cells = number[tuple(np.moveaxis(corners, -1, 0))].reshape(-1, 4).astype(np.int32)
    odd = np.linalg.det(np.eye(3)[WALKS]) < 0
    flipped = np.tile(odd, len(start))
    cells[flipped] = cells[flipped][:, [0, 2, 1, 3]]
    inner = ((nodes > 0) & (nodes < counts)).all(axis=1)
    nodes[inner] += np.random.default_rng(1).uniform(-0.15, 0.15, (inner.sum(), 3))
    faces = cells[:, [(1, 2, 3), (0, 3, 2), (0, 1, 3), (0, 2, 1)]].reshape(-1, 3)
    height = nodes[faces, 2]
    lower, upper = (height == 0).all(axis=1), (height == counts[2]).all(axis=1)
    boundary = np.concatenate([faces[lower], faces[upper]])
    tag = np.repeat([0, 1], [lower.sum(), upper.sum()]).astype(np.int32)
    none = np.zeros(len(boundary), np.int32)
    return Mesh(nodes * np.divide(size, counts), cells, np.zeros(len(cells), np.int32), boundary, tag, none, none)


def iterations(mesh: Mesh, tensors: np.ndarray) -> int:
    """Flux below, film above, and the conduction of each part's tensor (P, 3, 3)."""
    heated, cooled = (
        face_points(mesh.nodes, mesh.boundary, np.flatnonzero(mesh.boundary_tag == tag), 2 * mesh.order)
        for tag in (0, 1)
    )
    matrix = csr_array(conduction_matrix(mesh, tensors) + film_matrix(cooled, FILM))
    load = flux_load(heated, FLUX)
    cycle = hierarchy(matrix, midside_interpolation(mesh) if mesh.order == 2 else None).cycle
    rise, taken = linear_algebra.conjugate_gradients(matrix, load[:, None], REDUCTION, cycle)
    assert np.linalg.norm(load - matrix @ rise[:, 0]) <= 1.01 * REDUCTION * np.linalg.norm(load)
    return taken


def isotropic(*conductivity: float) -> np.ndarray:
    return np.multiply.outer(conductivity, np.eye(3))


def block(cells_along: int, order: int = 1) -> Mesh:
    mesh = ordered(grid((cells_along,) * 3, (0.05, 0.05, 0.05)))
    return mesh if order == 1 else quadratic(mesh)


@pytest.mark.slow
def test_iterations_hardly_grow_with_the_number_of_nodes() -> None:
    small, large = (iterations(block(along), isotropic(160.0)) for along in (21, 66))  # 10,600 and 301,000 nodes
    assert small > 3
    assert large <= 1.5 * small


@pytest.mark.parametrize("order", [1, 2])
def test_flat_cells_of_thin_walls(order: int) -> None:
    wall = ordered(grid((60, 40, 2), (0.1, 0.06, 0.0008)))
    assert iterations(wall if order == 1 else quadratic(wall), isotropic(160.0)) <= 30


@pytest.mark.slow
@pytest.mark.parametrize("conductivity", [(100.0, 1.0, 1.0), (100.0, 100.0, 1.0)], ids=str)
@pytest.mark.parametrize("turned", [0.0, 35.0])
def test_orthotropy_of_a_hundred_to_one(conductivity: tuple[float, float, float], turned: float) -> None:
    surface = shapes.tagged(shapes.box((0.05, 0.04, 0.03)), 0, shapes.facing("-z"))
    mesh = ordered(mesh_of(shapes.tagged(surface, 1, shapes.facing("+z")), 1, 0.0019))
    axes = shapes.rotation((1, 2, 3), turned)
    taken = iterations(mesh, (axes @ np.diag(conductivity) @ axes.T)[None])
    assert taken <= 50


def test_layers_ten_thousand_times_less_conductive() -> None:
    mesh = block(21)
    layer = np.floor(mesh.nodes[mesh.cells].mean(axis=1)[:, 2] / 0.005).astype(np.int32) % 2
    assert iterations(replace(mesh, cell_part=layer), isotropic(160.0, 0.016)) <= 30


@pytest.mark.parametrize("contact", [Contact((0, 1), 1e5), Contact((0, 1), None)], ids=["conductance", "bond"])
def test_unlike_parts_in_contact(contact: Contact) -> None:
    lower = shapes.tagged(shapes.box((0.03, 0.03, 0.01), (5, 4, 1)), 0, shapes.facing("-z"))
    upper = shapes.tagged(shapes.box((0.03, 0.03, 0.02), (3, 7, 2), at=(0, 0, 0.01)), 1, shapes.facing("+z"))
    tags = [Tag("heated", heat_flux=FLUX), Tag("held", temperature=300.0)]
    materials = [metal(0.016), metal(160.0)]
    case = case_of(shapes.assembly(lower, upper), tags, material=materials, order=1, size=0.0018, contacts=(contact,))
    mesh = pipeline.meshed(case, lambda stage, fraction, text: None)[1]
    solution = steady.solve(put_together(case, mesh))
    assert len(mesh.nodes) > linear_algebra.DIRECT
    assert solution.method.startswith("Krylov")
    assert solution.iterations <= 40
