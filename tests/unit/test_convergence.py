"""Convergence to a smooth manufactured solution with flux through faceted curved faces and flat ones.

Ciarlet, The Finite Element Method for Elliptic Problems (1978; from memory): the error in L2 falls with the mesh size
to the power of the order plus one. The facets are the geometry, exactly, so that they add nothing to it.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from cases import mesh_of, metal
from fluxface.solver.case import Surface
from fluxface.solver.fem.boundary import face_points, film_matrix, flux_load
from fluxface.solver.fem.mesh import Mesh, quadratic
from fluxface.solver.fem.reference import quadrature, shape_functions
from fluxface.solver.fem.volume import geometry
from fluxface.solver.physics.conduction import constant_conduction
from scipy.sparse.linalg import splu
from shapes import blocks, cylinder, tube

CONDUCTIVITY, FILM = 3.0, 7.0

# A tetrahedron of ten nodes cut at its mid-sides: four small ones at the corners, and the octahedron between them into
# four more about one of its three diagonals, each given with the other corners going round it.
AT_CORNERS = [(0, 4, 6, 7), (4, 1, 5, 8), (6, 5, 2, 9), (7, 8, 9, 3)]
DIAGONALS = np.array([(4, 9), (5, 7), (6, 8)])
ROUND = np.array([(5, 6, 7, 8), (4, 6, 9, 8), (4, 5, 9, 7)])
EIGHTHS = np.array(
    [
        AT_CORNERS + [(*diagonal, ring[k], ring[(k + 1) % 4]) for k in range(4)]
        for diagonal, ring in zip(DIAGONALS, ROUND, strict=True)
    ]
)
QUARTERS = np.array([(0, 3, 5), (3, 1, 4), (5, 4, 2), (3, 4, 5)])


def field(x: np.ndarray) -> np.ndarray:
    """Harmonic, so that no heat need be released inside; x (..., 3)."""
    return 300.0 + np.exp(1.2 * x[..., 0]) * np.cos(1.2 * x[..., 1]) + np.sin(x[..., 1]) * np.sinh(x[..., 2])


def slope(x: np.ndarray) -> np.ndarray:
    u, v, w = np.moveaxis(x, -1, 0)
    wave = 1.2 * np.exp(1.2 * u)
    return np.stack(
        [
            wave * np.cos(1.2 * v),
            -wave * np.sin(1.2 * v) + np.cos(v) * np.sinh(w),
            np.sin(v) * np.cosh(w),
        ],
        axis=-1,
    )


def halved(mesh: Mesh) -> Mesh:
    """A mesh of 4-node tetrahedra cut into eight times as many, of the same shape all told.

    Along the shortest diagonal, so that the tetrahedra keep their quality from cut to cut:
    Zhang, Houston J. Math. 21 (1995) 541 (from memory).
    """
    ten = quadratic(mesh)
    ends = ten.nodes[ten.cells[:, DIAGONALS]]
    shortest = np.linalg.norm(ends[:, :, 1] - ends[:, :, 0], axis=2).argmin(axis=1)
    cells = np.take_along_axis(ten.cells[:, None], EIGHTHS[shortest].reshape(-1, 1, 32), axis=2).reshape(-1, 4)
    edges = ten.nodes[cells[:, 1:]] - ten.nodes[cells[:, :1]]
    backwards = np.linalg.det(edges) < 0
    return replace(
        ten,
        cells=np.where(backwards[:, None], cells[:, [0, 2, 1, 3]], cells),
        cell_part=np.repeat(mesh.cell_part, 8),
        boundary=ten.boundary[:, QUARTERS].reshape(-1, 3),
        boundary_tag=np.repeat(mesh.boundary_tag, 4),
        boundary_part=np.repeat(mesh.boundary_part, 4),
        boundary_face=np.repeat(mesh.boundary_face, 4),
    )


def normals(mesh: Mesh) -> np.ndarray:
    corners = mesh.nodes[mesh.boundary[:, :3]]
    along = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    return along / np.linalg.norm(along, axis=1, keepdims=True)


def solved(mesh: Mesh) -> np.ndarray:
    """(N,) K: the foot (z = 0) held, the head in air, flux through everything else."""
    normal = normals(mesh)
    held_facets, head = normal[:, 2] < -0.999, normal[:, 2] > 0.999
    matrix = constant_conduction(mesh, [metal(CONDUCTIVITY)])

    points = face_points(mesh.nodes, mesh.boundary, np.flatnonzero(~held_facets), 2 * mesh.order)
    position = points.shape @ mesh.nodes
    flux = CONDUCTIVITY * np.einsum("pi,pi->p", normal[points.facet], slope(position))
    load = flux_load(points, flux)
    in_air = np.where(head[points.facet], FILM, 0.0)
    matrix = matrix + film_matrix(points, in_air)
    load = load + flux_load(points, in_air * field(position))

    held = np.unique(mesh.boundary[held_facets])
    free = np.setdiff1d(np.arange(len(mesh.nodes)), held)
    temperature = field(mesh.nodes)
    rest = load[free] - matrix[free][:, held] @ temperature[held]
    temperature[free] = splu(matrix[free][:, free].tocsc(), permc_spec="MMD_AT_PLUS_A").solve(rest)
    return temperature


def error(mesh: Mesh) -> float:
    """The error's L2 norm, integrated with a rule well above the element's own."""
    points, weights = quadrature(3, 2 * mesh.order + 2)
    temperature = solved(mesh)
    found = temperature[mesh.cells] @ shape_functions(points, mesh.order).T
    position = np.einsum("pa,mai->mpi", points, mesh.nodes[mesh.cells[:, :4]])
    square = (found - field(position)) ** 2 @ weights
    return float(np.sqrt(geometry(mesh).volume @ square))


def notched() -> Surface:
    """A block with a notch cut into its head: flat faces alone."""
    filled = np.ones((3, 1, 2), bool)
    filled[1, :, 1] = False
    return blocks(np.array([0, 0.4, 0.7, 1.0]), np.array([0, 0.6]), np.array([0, 0.5, 0.8]), filled)


@pytest.mark.parametrize(("order", "size", "expected"), [(1, 0.25, 1.9), (2, 0.4, 2.9)])
@pytest.mark.parametrize(
    "surface",
    [cylinder(0.6, 0.5, 9), tube(0.3, 0.7, 0.5, 9), notched()],
    ids=["faceted cylinder", "faceted tube", "notched block"],
)
def test_order_in_the_mean(surface: Surface, order: int, size: float, expected: float) -> None:
    coarse = halved(mesh_of(surface, 1, size))
    errors = [error(mesh if order == 1 else quadratic(mesh)) for mesh in (coarse, halved(coarse))]
    assert np.log2(errors[0] / errors[1]) >= expected
