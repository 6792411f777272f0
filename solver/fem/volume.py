"""Volume terms of the weak form on straight-sided tetrahedra: conduction, heat released inside, means.

The map from the parent tetrahedron is affine, so an element's conduction matrix is a fixed tensor of the parent
contracted with the element's own metric V grad(xi_i) . K grad(xi_j). Cells are worked on some thousands at a time, so
that what is computed on the way stays in the processor's cache.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array

from ..parallel import slices
from .around import summed_at_nodes, summed_matrix
from .mesh import Mesh
from .reference import quadrature, shape_functions, shape_gradients

CELLS_AT_ONCE = 8192
EVERY = slice(None)
# The three coordinates, and the three edges of a cell from its first corner, one and two further on in their circle.
NEXT, AFTER = np.array([1, 2, 0]), np.array([2, 0, 1])
# The independent entries of a symmetric 3 x 3 tensor.
ROW, COLUMN = np.triu_indices(3)


@dataclass(frozen=True)
class Geometry:
    """volume: (M,) m3. gradients: (3, 3, M) 1/m, of parent coordinate xi_i (axis 0) along world axis k (axis 1)."""

    volume: np.ndarray
    gradients: np.ndarray


def geometry(mesh: Mesh, chosen: slice | np.ndarray = EVERY) -> Geometry:
    """The affine maps of the chosen cells: the gradients are the rows of the inverse Jacobian, by cofactors."""
    corners = mesh.nodes.take(mesh.cells[chosen, :4], axis=0)
    edges = np.subtract(corners[:, 1:].transpose(1, 2, 0), corners[:, 0].T, order="C")
    one, other = edges[NEXT], edges[AFTER]
    cofactors = one[:, NEXT] * other[:, AFTER] - one[:, AFTER] * other[:, NEXT]
    jacobian = (edges[0] * cofactors[0]).sum(axis=0)
    cofactors /= jacobian
    return Geometry(volume=jacobian / 6.0, gradients=cofactors)


def volumes(mesh: Mesh) -> np.ndarray:
    """(M,) m3."""
    pieces = slices(len(mesh.cells), CELLS_AT_ONCE)
    return np.concatenate([geometry(mesh, piece).volume for piece in pieces])


def metric(shape: Geometry, conductivity: np.ndarray) -> np.ndarray:
    """(6, M) W/K: V grad(xi_i) . K grad(xi_j) for i <= j; conductivity: (M,) if isotropic, or (3, 3, M), W/(m K)."""
    slopes, scaled = shape.gradients, shape.volume * conductivity
    flux = scaled * slopes if scaled.ndim == 1 else sum(slopes[:, k, None] * scaled[k] for k in range(3))
    return np.stack([(flux[i] * slopes[j]).sum(axis=0) for i, j in zip(ROW, COLUMN, strict=True)])


def conduction_rows(order: int) -> np.ndarray:
    """(n, 6, n): what row a of an element's conduction matrix takes of each entry of its metric.

    The integral of grad N_a . K grad N_b over the parent tetrahedron, exact.
    """
    points, weights = quadrature(3, 2 * (order - 1))
    slopes = shape_gradients(points, order)
    parent = np.einsum("q,qai,qbj->aijb", weights, slopes, slopes)
    mirrored = np.where(ROW == COLUMN, 0.0, 1.0)[:, None] * parent[:, COLUMN, ROW]
    return np.ascontiguousarray(parent[:, ROW, COLUMN] + mirrored)


def conduction_matrix(mesh: Mesh, tensors: np.ndarray) -> csr_array:
    """(N, N) W/K: the integral of grad N_a . K grad N_b; tensors (P, 3, 3) W/(m K) of each part."""
    isotropic = (tensors == tensors[:, :1, :1] * np.eye(3)).all()
    conductivity = tensors[:, 0, 0] if isotropic else tensors.transpose(1, 2, 0)
    metrics = np.empty((len(mesh.cells), len(ROW)))
    for piece in slices(len(mesh.cells), CELLS_AT_ONCE):
        metrics[piece] = metric(geometry(mesh, piece), conductivity[..., mesh.cell_part[piece]]).T
    rows = conduction_rows(mesh.order)
    return summed_matrix(mesh.cells, lambda local, cells: metrics.take(cells, axis=0) @ rows[local], len(mesh.nodes))


def heat_load(mesh: Mesh, volume: np.ndarray, heat_density: np.ndarray) -> np.ndarray:
    """(N,) W: the integral of N_a times heat_density (M,) W/m3; volume (M,) m3."""
    if not heat_density.any():
        return np.zeros(len(mesh.nodes))
    points, weights = quadrature(3, mesh.order)
    share = weights @ shape_functions(points, mesh.order)
    released = volume * heat_density
    return summed_at_nodes(mesh.cells, lambda local, cells: share[local] * released[cells, None], len(mesh.nodes))[:, 0]


def cell_means(mesh: Mesh, nodal: np.ndarray) -> np.ndarray:
    """(M,) mean over each cell of a nodal field (N,)."""
    points, weights = quadrature(3, mesh.order)
    share = weights @ shape_functions(points, mesh.order)
    return np.concatenate([nodal.take(mesh.cells[piece]) @ share for piece in slices(len(mesh.cells), CELLS_AT_ONCE)])


def gradients_at(shape: Geometry, local: np.ndarray, points: np.ndarray) -> np.ndarray:
    """(P, 3, M) gradient at barycentric points (P, 4) of cells of a field with nodal values local (M, n)."""
    slopes = shape_gradients(points, 1 if local.shape[1] == 4 else 2)
    along = slopes.transpose(0, 2, 1) @ local.T
    return (along[:, :, None] * shape.gradients).sum(axis=1)
