"""Solving the sparse systems: a factorisation for small ones, multigrid-preconditioned Krylov methods for the rest."""

from __future__ import annotations

import numpy as np
import pyamg
from pyamg.multilevel import MultilevelSolver
from pyamg.relaxation.smoothing import change_smoothers
from scipy.sparse import coo_array, csr_array, csr_matrix
from scipy.sparse.linalg import LinearOperator, cg, gmres, splu

from .mesh import CELL_EDGES, Mesh

# Up to here a factorisation takes less time than setting up a hierarchy (tests/bench prints both).
DIRECT = 4_000
# Couplings below this share of their neighbours' are left out of the aggregation, so that it keeps to one side of
# thin insulation.
WEAK = 0.05
MOST_ITERATIONS = 500
RESTART = 50
# A preconditioner made for an earlier matrix is dropped when it takes this many times its first iterations.
STALE = 2.0


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


def preconditioner(matrix: csr_array, interpolation: csr_array | None) -> LinearOperator:
    """One V-cycle for a symmetric positive definite matrix (n, n).

    interpolation: (n, c) from a coarser space of the same unknowns, or None. With it, the cycle goes over the exact
    Galerkin matrix there; below that, over smoothed aggregation.

    Vanek, Mandel & Brezina, Computing 56 (1996) 179 (aggregation). The smoother is symmetric Gauss-Seidel: polynomial
    ones in the matrix itself lose their way where parts of unlike conductivity meet.
    """
    fine = csr_matrix(matrix)
    coarse = fine if interpolation is None else csr_matrix(interpolation.T @ fine @ interpolation)
    levels = pyamg.smoothed_aggregation_solver(coarse, strength=("symmetric", {"theta": WEAK}), max_coarse=300).levels
    if interpolation is not None:
        top = MultilevelSolver.Level()
        top.A, top.P, top.R = fine, csr_matrix(interpolation), csr_matrix(interpolation.T)
        levels = [top, *levels]
    hierarchy = MultilevelSolver(levels, coarse_solver="splu")
    smoother = ("gauss_seidel", {"sweep": "symmetric"})
    change_smoothers(hierarchy, presmoother=smoother, postsmoother=smoother)
    return hierarchy.aspreconditioner(cycle="V")


class LinearSolver:
    """Solves one system after another whose matrices are alike, with one preconditioner as long as it serves.

    symmetric: whether the matrices are symmetric; if not, they must be near a symmetric positive definite one.
    """

    def __init__(self, symmetric: bool, interpolation: csr_array | None) -> None:
        self.iterations = 0
        self.method = "direct factorisation"
        self._krylov = _conjugate_gradients if symmetric else _minimal_residuals
        self._interpolation = interpolation
        self._smooth: LinearOperator | None = None
        self._first_iterations = 0

    def solve(self, matrix: csr_array, load: np.ndarray, reduction: float) -> np.ndarray:
        """(n,) solution with its residual at most ``reduction`` of the load's norm."""
        if matrix.shape[0] <= DIRECT:
            self.iterations += 1
            return splu(matrix.tocsc()).solve(load)
        if self._smooth is None:
            self._smooth, self._first_iterations = preconditioner(matrix, self._interpolation), 0
        solution, taken = self._krylov(matrix, load, reduction, self._smooth)
        self.method = "Krylov iteration with multigrid"
        self.iterations += taken
        self._first_iterations = self._first_iterations or taken
        if taken > STALE * self._first_iterations:
            self._smooth = None
        return solution


def _conjugate_gradients(
    matrix: csr_array, load: np.ndarray, reduction: float, smooth: LinearOperator
) -> tuple[np.ndarray, int]:
    """Hestenes & Stiefel, J. Res. Nat. Bur. Stand. 49 (1952) 409."""
    residuals: list[None] = []
    solution, _ = cg(
        matrix, load, rtol=reduction, maxiter=MOST_ITERATIONS, M=smooth, callback=lambda _: residuals.append(None)
    )
    return solution, len(residuals)


def _minimal_residuals(
    matrix: csr_array, load: np.ndarray, reduction: float, smooth: LinearOperator
) -> tuple[np.ndarray, int]:
    """Saad & Schultz, SIAM J. Sci. Stat. Comput. 7 (1986) 856."""
    residuals: list[float] = []
    solution, _ = gmres(
        matrix, load, rtol=reduction, restart=RESTART, maxiter=MOST_ITERATIONS // RESTART, M=smooth,
        callback=residuals.append, callback_type="pr_norm",
    )  # fmt: skip
    return solution, len(residuals)
