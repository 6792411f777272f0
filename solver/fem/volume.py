"""Volume terms of the weak form on straight-sided tetrahedra: conduction, heat released inside, means.

The map from the parent tetrahedron is affine, so an element's conduction matrix is a fixed tensor of the parent
contracted with the element's own metric V grad(xi_i) . K grad(xi_j): one matrix product for all elements.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array, csr_array

from .mesh import Mesh
from .reference import quadrature, shape_functions, shape_gradients


@dataclass(frozen=True)
class Geometry:
    """volume: (M,) m3. gradients: (3, 3, M) 1/m, of parent coordinate xi_i (axis 0) along world axis k (axis 1)."""

    volume: np.ndarray
    gradients: np.ndarray


def geometry(mesh: Mesh) -> Geometry:
    """The affine maps of all cells: the gradients are the rows of the inverse Jacobian, by cofactors."""
    corners = np.ascontiguousarray(mesh.nodes.T)[:, mesh.cells[:, :4]]
    a, b, c = (corners[:, :, local] - corners[:, :, 0] for local in (1, 2, 3))
    cofactors = np.stack([np.cross(u, v, axis=0) for u, v in ((b, c), (c, a), (a, b))])
    jacobian = np.einsum("km,km->m", a, cofactors[0])
    return Geometry(volume=jacobian / 6.0, gradients=cofactors / jacobian)


def metric(shape: Geometry, conductivity: np.ndarray) -> np.ndarray:
    """(3, 3, M) W/K: V grad(xi_i) . K grad(xi_j); conductivity (M, 3, 3) W/(m K)."""
    flux = np.einsum("ikm,mkl->ilm", shape.gradients, conductivity)
    return np.einsum("ilm,jlm->ijm", flux, shape.gradients) * shape.volume


def conduction_blocks(order: int, metrics: np.ndarray) -> np.ndarray:
    """(n, n, M) W/K conduction matrix of each element, its conductivity uniform; metrics (3, 3, M).

    The integral of grad N_a . K grad N_b, exact.
    """
    points, weights = quadrature(3, 2 * (order - 1))
    slopes = shape_gradients(points, order)
    parent = np.einsum("q,qai,qbj->abij", weights, slopes, slopes)
    nodes = parent.shape[0]
    return (parent.reshape(nodes * nodes, 9) @ metrics.reshape(9, -1)).reshape(nodes, nodes, -1)


def assemble(connectivity: np.ndarray, blocks: np.ndarray, size: int) -> csr_array:
    """(N, N) matrix of element blocks (n, n, M); connectivity (M, n)."""
    nodes = connectivity.T
    rows = np.broadcast_to(nodes[:, None], blocks.shape)
    columns = np.broadcast_to(nodes[None], blocks.shape)
    return coo_array((blocks.ravel(), (rows.ravel(), columns.ravel())), shape=(size, size)).tocsr()


def heat_load(mesh: Mesh, shape: Geometry, heat_density: np.ndarray) -> np.ndarray:
    """(N,) W: the integral of N_a times heat_density (M,) W/m3."""
    points, weights = quadrature(3, mesh.order)
    share = weights @ shape_functions(points, mesh.order)
    loads = np.outer(shape.volume * heat_density, share)
    return np.bincount(mesh.cells.ravel(), loads.ravel(), len(mesh.nodes))


def cell_means(mesh: Mesh, nodal: np.ndarray) -> np.ndarray:
    """(M,) mean over each cell of a nodal field (N,)."""
    points, weights = quadrature(3, mesh.order)
    return nodal[mesh.cells] @ (weights @ shape_functions(points, mesh.order))


def gradients_at(mesh: Mesh, shape: Geometry, nodal: np.ndarray, points: np.ndarray) -> np.ndarray:
    """(P, M, 3) gradient of a nodal field (N,) at barycentric points (P, 4) of every cell."""
    along = np.einsum("pai,ma->pmi", shape_gradients(points, mesh.order), nodal[mesh.cells], optimize=True)
    return np.einsum("pmi,ijm->pmj", along, shape.gradients)
