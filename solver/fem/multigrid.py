"""One V-cycle of algebraic multigrid as a preconditioner: smoothed aggregation, smoothing by Chebyshev polynomials.

Quadratic elements have one level more on top: the exact Galerkin matrix of the linear functions on the same cells.

Vanek, Mandel & Brezina, Computing 56 (1996) 179 (smoothed aggregation); Adams, Brezina, Hu & Tuminaro,
J. Comput. Phys. 188 (2003) 593 (polynomial smoothers).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from pyamg.aggregation import standard_aggregation
from scipy.linalg import eigh_tridiagonal
from scipy.sparse import csc_array, csr_array, csr_matrix
from scipy.sparse.linalg import SuperLU, splu

from ..parallel import side_by_side
from .around import stacked
from .mesh import CELL_EDGES, Mesh
from .products import Rows, in_pieces, in_rows, product

# Couplings below this share of their nodes' largest are left out of the aggregation, so that aggregates keep to one
# side of thin insulation and lie along what conducts best.
WEAK = 0.25
DAMPING = 2.0 / 3.0
COARSEST = 500
LANCZOS_STEPS = 10
# The smoother damps the upper part of the spectrum, from this share of the largest eigenvalue; the coarse level does
# the rest.
DAMPED_FROM = 0.25


@dataclass(frozen=True)
class Level:
    """matrix: (n, n). prolongation: (n, c) from the next level, and carried: (n, c) its product with the matrix.

    Smoothing: see _smoother; first, second: (n, 1).
    """

    matrix: Rows
    prolongation: Rows
    carried: Rows
    restriction: Rows
    first: np.ndarray
    second: np.ndarray
    growth: float

    def smoothed(self, loads: np.ndarray) -> np.ndarray:
        """(n, k) two steps of the Chebyshev iteration from zero; a symmetric operation on loads (n, k)."""
        solution = self.first * loads
        change = self.second * self.matrix.left(loads, solution)
        solution *= self.growth
        solution += change
        return solution


@dataclass(frozen=True)
class Hierarchy:
    levels: tuple[Level, ...]
    coarsest: SuperLU

    def cycle(self, loads: np.ndarray, depth: int = 0) -> np.ndarray:
        """(n, k) approximate solutions for loads (n, k): smooth, correct from the next level, smooth."""
        if depth == len(self.levels):
            return self.coarsest.solve(loads)
        level = self.levels[depth]
        solution = level.smoothed(loads)
        left = level.matrix.left(loads, solution)
        coarse = self.cycle(level.restriction @ left, depth + 1)
        solution += level.prolongation @ coarse
        solution += level.smoothed(level.carried.left(left, coarse))  # fewer entries than the matrix itself has
        return solution


def hierarchy(matrix: csr_array, interpolation: csr_array | None) -> Hierarchy:
    """For a symmetric positive definite matrix (n, n); interpolation: (n, c) from linear functions, if there is one."""
    levels = []
    if interpolation is not None:
        level, matrix = _coarsened(matrix, interpolation)
        levels.append(level)
    while matrix.shape[0] > COARSEST:
        level, matrix = _coarsened(matrix, _smoothed_aggregates(matrix))
        levels.append(level)
    return Hierarchy(tuple(levels), splu(csc_array(matrix)))


def _coarsened(matrix: csr_array, prolongation: csr_array) -> tuple[Level, csr_array]:
    """A level, and the Galerkin matrix of the next."""
    restriction = csr_array(prolongation.T)
    carried = product(matrix, prolongation)
    operators = in_rows(matrix), in_rows(prolongation), in_rows(carried), in_rows(restriction)
    return Level(*operators, *_smoother(*_scaling(matrix))), product(restriction, carried)


def _smoother(inverse_diagonal: np.ndarray, largest: float) -> tuple[np.ndarray, np.ndarray, float]:
    """What two Chebyshev steps for D^-1 A from zero come to: x = a b and then c x + e (b - A x); a, e and c."""
    inverse_diagonal = inverse_diagonal[:, None]
    centre, radius = 0.5 * largest * (1.0 + DAMPED_FROM), 0.5 * largest * (1.0 - DAMPED_FROM)
    share = 1.0 / (2.0 * centre - radius**2 / centre)
    return inverse_diagonal / centre, 2.0 * share * inverse_diagonal, 1.0 + share * radius**2 / centre


def _smoothed_aggregates(matrix: csr_array) -> csr_array:
    """(n, c) prolongation: one on each aggregate of strongly coupled nodes, smoothed by one damped Jacobi step.

    The step is that of the strong couplings alone, the others lumped: its largest eigenvalue is at most 2, and what
    was left out of the aggregates does not fill the next matrix.
    """
    strong = _strong_couplings(matrix)
    aggregates = csr_array(standard_aggregation(csr_matrix(strong))[0], dtype=float)
    step = product(strong, aggregates)
    diagonal = strong.sum(axis=1) + np.maximum(matrix.sum(axis=1), 0.0)
    step.data *= np.repeat(DAMPING / np.where(diagonal > 0, diagonal, 1.0), np.diff(step.indptr))
    aggregates.data *= 1.0 - DAMPING
    return aggregates + step


def _strong_couplings(matrix: csr_array) -> csr_array:
    """(n, n) the sizes of negative entries off the diagonal that are not small beside the largest of both their rows.

    A cell that is flat, or conducts along one axis above all, has large positive entries too: its diagonal says less.
    """
    largest = np.sqrt(np.maximum(-np.minimum.reduceat(matrix.data, matrix.indptr[:-1]), 0.0))

    def of_rows(rows: csr_array, of_row: np.ndarray) -> csr_array:
        least = np.repeat(WEAK * of_row, np.diff(rows.indptr)) * largest.take(rows.indices)
        kept = np.flatnonzero((rows.data < 0) & (-rows.data >= least))
        starts = np.searchsorted(kept, rows.indptr).astype(np.int32)
        return csr_array((-rows.data[kept], rows.indices[kept], starts), shape=rows.shape)

    rows = in_pieces(matrix)
    of_row = np.split(largest, np.cumsum([block.shape[0] for block in rows])[:-1])
    return stacked(side_by_side(lambda pair: of_rows(*pair), zip(rows, of_row, strict=True)))


def _scaling(matrix: csr_array) -> tuple[np.ndarray, float]:
    """(n,) 1 over the diagonal D, and the largest eigenvalue of D^-1 A, or a little more.

    The largest Ritz value of some Lanczos steps and its residual: Parlett, The Symmetric Eigenvalue Problem (1980).
    """
    inverse_diagonal = 1.0 / matrix.diagonal()
    rows, scale = in_rows(matrix), np.sqrt(inverse_diagonal)[:, None]
    vector = np.random.default_rng(0).standard_normal((matrix.shape[0], 1))
    vector /= np.linalg.norm(vector)
    before, along, across = np.zeros_like(vector), [], [0.0]
    for _ in range(LANCZOS_STEPS):
        following = scale * (rows @ (scale * vector)) - across[-1] * before
        along.append(float(np.vdot(vector, following)))
        following -= along[-1] * vector
        across.append(float(np.linalg.norm(following)))
        before, vector = vector, following / across[-1]
    values, vectors = eigh_tridiagonal(along, across[1:-1])
    return inverse_diagonal, float(values[-1] + across[-1] * abs(vectors[-1, -1]))


def midside_interpolation(mesh: Mesh) -> csr_array:
    """(N, corners) linear interpolation from a quadratic mesh's corner nodes to all its nodes."""
    corners = int(mesh.cells[:, :4].max()) + 1
    middles = len(mesh.nodes) - corners
    ends = np.empty((middles, 2), np.int32)
    ends[mesh.cells[:, 4:] - corners] = mesh.cells[:, CELL_EDGES]
    starts = np.concatenate([np.arange(corners), corners + 2 * np.arange(middles + 1)])
    columns = np.concatenate([np.arange(corners, dtype=np.int32), ends.ravel()])
    values = np.repeat([1.0, 0.5], [corners, 2 * middles])
    return csr_array((values, columns, starts), shape=(len(mesh.nodes), corners))
