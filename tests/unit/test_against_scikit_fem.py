"""The same mesh and the same problem in an independent library: matrix, load and temperatures agree.

Gustafsson & McBain, scikit-fem: a Python package for finite element assembly, J. Open Source Software 5 (2020) 2369.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
from cases import case_of, mesh_of, metal
from fluxface.solver.case import Convection, Tag
from fluxface.solver.fem.mesh import Mesh
from fluxface.solver.physics import steady
from fluxface.solver.physics.problem import Problem, put_together
from scipy.sparse import csr_array
from scipy.spatial import cKDTree
from shapes import irregular_solid
from skfem import Basis, BilinearForm, ElementTetP1, ElementTetP2, FacetBasis, LinearForm, MeshTet, condense, solve
from skfem.helpers import dot, grad

CONDUCTIVITY, HEAT, FLUX, FILM, AMBIENT, HELD = 17.0, 3.5, 2200.0, 60.0, 290.0, 340.0
TAGS = [
    Tag("warmed", heat_flux=FLUX),
    Tag("in air", convection=Convection(AMBIENT, FILM), heat_flux=0.1 * FLUX),
    Tag("held", temperature=HELD),
]


@dataclass(frozen=True)
class Reference:
    """The library's matrix (N, N) W/K, load (N,) W and temperatures (N,) K, in this project's node numbers."""

    matrix: csr_array
    load: np.ndarray
    temperature: np.ndarray


def problem_of(order: int) -> Problem:
    solid = irregular_solid()
    surface = type(solid)(**{**vars(solid), "tag": (solid.face % 3).astype(np.int32)})
    case = case_of(surface, TAGS, material=metal(CONDUCTIVITY), heat=HEAT, order=order, size=0.008)
    return put_together(case, mesh_of(surface, order, 0.008))


def facets_in(library: MeshTet, mesh: Mesh, tag: int) -> np.ndarray:
    """The library's numbers of the boundary triangles of a tag, found by their centres."""
    centres = library.p[:, library.facets].mean(axis=1).T
    mine = mesh.nodes[mesh.boundary[mesh.boundary_tag == tag, :3]].mean(axis=1)
    distance, number = cKDTree(centres).query(mine)
    assert distance.max() < 1e-12
    return number


def reference(problem: Problem) -> Reference:
    mesh = problem.mesh
    element = ElementTetP1() if mesh.order == 1 else ElementTetP2()
    corners = mesh.cells[:, :4]
    library = MeshTet(mesh.nodes[: corners.max() + 1].T, corners.T.astype(np.int64))
    inside = Basis(library, element, intorder=4)
    on = [FacetBasis(library, element, facets=facets_in(library, mesh, tag), intorder=4) for tag in range(3)]
    volume = problem.volume.sum()

    conduction = BilinearForm(lambda u, v, w: CONDUCTIVITY * dot(grad(u), grad(v)))
    film = BilinearForm(lambda u, v, w: FILM * u * v)
    released = LinearForm(lambda v, w: HEAT / volume * v)
    warmed = LinearForm(lambda v, w: FLUX * v)
    aired = LinearForm(lambda v, w: (FILM * AMBIENT + 0.1 * FLUX) * v)
    matrix = (conduction.assemble(inside) + film.assemble(on[1])).tocsr()
    load = released.assemble(inside) + warmed.assemble(on[0]) + aired.assemble(on[1])
    held = inside.get_dofs(facets_in(library, mesh, 2))
    temperature = solve(*condense(matrix, load, x=np.full(len(load), HELD), D=held))

    distance, place = cKDTree(inside.doflocs.T).query(mesh.nodes)
    assert distance.max() < 1e-12 and len(np.unique(place)) == len(mesh.nodes) == len(load)
    return Reference(csr_array(matrix[place][:, place]), load[place], temperature[place])


@pytest.mark.parametrize("order", [1, 2])
def test_matrix_load_and_temperatures_agree(order: int) -> None:
    problem = problem_of(order)
    theirs = reference(problem)
    ours = steady.assembled(problem, reference=0.0)
    assert abs(ours.matrix - theirs.matrix).max() <= 1e-9 * abs(theirs.matrix).max()
    # Linear elements share their loads evenly; quadratic corners get next to none, hence the scale of the largest.
    np.testing.assert_allclose(ours.load, theirs.load, rtol=0, atol=1e-9 * np.abs(theirs.load).max())
    temperature = steady.solve(problem).temperature
    np.testing.assert_allclose(temperature, theirs.temperature, rtol=1e-9)
    assert np.ptp(temperature) > 1.0
