"""Solving the sparse systems: a factorisation for small ones, multigrid-preconditioned Krylov methods for the rest."""

from __future__ import annotations

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.linalg import LinearOperator, SuperLU, cg, gmres, splu

from .multigrid import preconditioner

# Up to here a factorisation is as quick as a hierarchy: multigrid was the quicker one at 1 656 and at 3 947 unknowns.
DIRECT = 1_500
MOST_ITERATIONS = 500
RESTART = 50
# A preconditioner made for an earlier matrix is dropped when it takes this many times its first iterations.
STALE = 2.0


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
            return _factors(matrix).solve(load)
        if self._smooth is None:
            self._smooth, self._first_iterations = preconditioner(matrix, self._interpolation), 0
        solution, taken = self._krylov(matrix, load, reduction, self._smooth)
        self.method = "Krylov iteration with multigrid"
        self.iterations += taken
        self._first_iterations = self._first_iterations or taken
        if taken > STALE * self._first_iterations:
            self._smooth = None
        return solution


def _factors(matrix: csr_array) -> SuperLU:
    """Ordered as for a symmetric matrix and without pivoting, which a positive definite one does not need."""
    return splu(matrix.tocsc(), permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True})


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
