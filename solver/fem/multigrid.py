"""One V-cycle of algebraic multigrid as a preconditioner: aggregation by PyAMG, smoothing by Chebyshev polynomials.

Quadratic elements have one level more on top: the exact Galerkin matrix of the linear functions on the same cells.

Vanek, Mandel & Brezina, Computing 56 (1996) 179 (smoothed aggregation); Adams, Brezina, Hu & Tuminaro,
J. Comput. Phys. 188 (2003) 593 (polynomial smoothers).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyamg
from scipy.sparse import coo_array, csc_array, csr_array, csr_matrix
from scipy.sparse.linalg import LinearOperator, SuperLU, splu

from .mesh import CELL_EDGES, Mesh

# Couplings below this share of their neighbours' are left out of the aggregation, so that aggregates keep to one side
# of thin insulation.
WEAK = 0.05
COARSEST = 500
POWER_STEPS = 8
# The smoother damps the upper part of the spectrum, from this share of the largest eigenvalue; the coarse level does
# the rest.
DAMPED_FROM = 0.25


@dataclass(frozen=True)
class Level:
    """matrix: (n, n). prolongation: (n, c) from the next level. inverse_diagonal: (n,). largest: of D^-1 A, a bound."""

    matrix: csr_array
    prolongation: csr_array
    restriction: csr_array
    inverse_diagonal: np.ndarray
    largest: float


@dataclass(frozen=True)
class Hierarchy:
    levels: tuple[Level, ...]
    coarsest: SuperLU

    def cycle(self, load: np.ndarray, depth: int = 0) -> np.ndarray:
        """(n,) an approximate solution for ``load`` (n,): smooth, correct from the next level, smooth."""
        if depth == len(self.levels):
            return self.coarsest.solve(load)
        level = self.levels[depth]
        solution = _smooth(level, load)
        coarse = level.restriction @ (load - level.matrix @ solution)
        solution += level.prolongation @ self.cycle(coarse, depth + 1)
        solution += _smooth(level, load - level.matrix @ solution)
        return solution


def preconditioner(matrix: csr_array, interpolation: csr_array | None) -> LinearOperator:
    """One V-cycle for a symmetric positive definite matrix (n, n); interpolation: (n, c) from linear functions."""
    levels = []
    if interpolation is not None:
        levels.append(_level(matrix, interpolation))
        matrix = csr_array(interpolation.T @ matrix @ interpolation)
    aggregated = pyamg.smoothed_aggregation_solver(
        csr_matrix(matrix),
        strength=("symmetric", {"theta": WEAK}),
        max_coarse=COARSEST,
        presmoother=None,
        postsmoother=None,
    ).levels
    levels += [_level(csr_array(level.A), csr_array(level.P)) for level in aggregated[:-1]]
    hierarchy = Hierarchy(tuple(levels), splu(csc_array(aggregated[-1].A)))
    shape = hierarchy.levels[0].matrix.shape if levels else matrix.shape
    return LinearOperator(shape, matvec=hierarchy.cycle, dtype=float)


def _level(matrix: csr_array, prolongation: csr_array) -> Level:
    inverse_diagonal = 1.0 / matrix.diagonal()
    return Level(
        matrix=matrix,
        prolongation=prolongation,
        restriction=csr_array(prolongation.T),
        inverse_diagonal=inverse_diagonal,
        largest=_largest_eigenvalue(matrix, inverse_diagonal),
    )


def _largest_eigenvalue(matrix: csr_array, inverse_diagonal: np.ndarray) -> float:
    """Of D^-1 A, a little above what a few steps of the power method find."""
    vector = np.random.default_rng(0).standard_normal(len(inverse_diagonal))
    for _ in range(POWER_STEPS):
        vector /= np.linalg.norm(vector)
        vector = inverse_diagonal * (matrix @ vector)
    return 1.1 * float(np.linalg.norm(vector))


def _smooth(level: Level, load: np.ndarray) -> np.ndarray:
    """(n,) two steps of the Chebyshev iteration for D^-1 A from zero; a symmetric operation on ``load`` (n,)."""
    centre = 0.5 * level.largest * (1.0 + DAMPED_FROM)
    radius = 0.5 * level.largest * (1.0 - DAMPED_FROM)
    first = level.inverse_diagonal * load / centre
    left = load - level.matrix @ first
    share = 1.0 / (2.0 * centre - radius**2 / centre)
    return first + share * (2.0 * level.inverse_diagonal * left + radius**2 / centre * first)


def midside_interpolation(mesh: Mesh) -> csr_array | None:
    """(N, corners) linear interpolation from a quadratic mesh's corner nodes to all its nodes; None if it is linear."""
    if mesh.order == 1:
        return None
    corners = int(mesh.cells[:, :4].max()) + 1
    ends = np.repeat(np.arange(len(mesh.nodes))[:, None], 2, axis=1)
    ends[mesh.cells[:, 4:]] = mesh.cells[:, CELL_EDGES]
    rows = np.repeat(np.arange(len(mesh.nodes)), 2)
    halves = np.full(len(rows), 0.5)
    return coo_array((halves, (rows, ends.ravel())), shape=(len(mesh.nodes), corners)).tocsr()
