"""Solving the sparse systems: a factorisation for small ones, multigrid-preconditioned Krylov methods for the rest."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.linalg import LinearOperator, gmres, splu

from .multigrid import Hierarchy, hierarchy
from .products import in_rows

# Up to here a factorisation takes less time than setting up a hierarchy (tests/bench prints both).
DIRECT = 4_000
MOST_ITERATIONS = 500
RESTART = 50
# A preconditioner made for an earlier matrix is dropped when it takes this many times its first iterations.
STALE = 2.0

Precondition = Callable[[np.ndarray], np.ndarray]


class LinearSolver:
    """Solves one system after another whose matrices are alike, with one preconditioner as long as it serves.

    symmetric: whether the matrices are symmetric; if not, they must be near a symmetric positive definite one.
    """

    def __init__(self, symmetric: bool, interpolation: csr_array | None) -> None:
        self.iterations = 0
        self.method = "direct factorisation"
        self._symmetric = symmetric
        self._interpolation = interpolation
        self._hierarchy: Hierarchy | None = None
        self._first_iterations = 0

    def solve(self, matrix: csr_array, load: np.ndarray, reduction: float) -> np.ndarray:
        """(n,) solution with its residual at most ``reduction`` of the load's norm."""
        if matrix.shape[0] <= DIRECT:
            self.iterations += 1
            return splu(matrix.tocsc()).solve(load)
        if self._hierarchy is None:
            self._hierarchy, self._first_iterations = hierarchy(matrix, self._interpolation), 0
        krylov = conjugate_gradients if self._symmetric else minimal_residuals
        solution, taken = krylov(matrix, load[:, None], reduction, self._hierarchy.cycle)
        self.method = "Krylov iteration with multigrid"
        self.iterations += taken
        self._first_iterations = self._first_iterations or taken
        if taken > STALE * self._first_iterations:
            self._hierarchy = None
        return solution[:, 0]

    def solve_all(self, matrix: csr_array, loads: np.ndarray, reduction: float) -> np.ndarray:
        """Solutions (n, k) for loads (n, k) of one symmetric matrix, in step: each to its own load's ``reduction``."""
        if matrix.shape[0] <= DIRECT:
            return splu(matrix.tocsc()).solve(loads)
        if self._hierarchy is None:
            self._hierarchy, self._first_iterations = hierarchy(matrix, self._interpolation), 0
        return conjugate_gradients(matrix, loads, reduction, self._hierarchy.cycle)[0]


def conjugate_gradients(
    matrix: csr_array, loads: np.ndarray, reduction: float, precondition: Precondition
) -> tuple[np.ndarray, int]:
    """Solutions (n, k) for loads (n, k), each by itself but in step, and the iterations taken.

    Hestenes & Stiefel, J. Res. Nat. Bur. Stand. 49 (1952) 409.
    """
    rows = in_rows(matrix)
    solution, residual = np.zeros_like(loads), loads.copy()
    enough = reduction * np.linalg.norm(loads, axis=0)
    direction, before = np.zeros_like(loads), np.ones(loads.shape[1])
    for iteration in range(MOST_ITERATIONS):
        if (np.linalg.norm(residual, axis=0) <= enough).all():
            return solution, iteration
        corrected = precondition(residual)
        now = _dots(residual, corrected)
        direction *= now / before
        direction += corrected
        product = rows @ direction
        # A column that is solved to the last digit stays as it is.
        step = np.divide(now, _dots(direction, product), out=np.zeros_like(now), where=now > 0)
        solution += step * direction
        residual -= step * product
        before = np.where(now > 0, now, 1.0)
    return solution, MOST_ITERATIONS


def _dots(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """(k,) the scalar products of columns (n, k)."""
    return np.einsum("nk,nk->k", first, second)


def minimal_residuals(
    matrix: csr_array, loads: np.ndarray, reduction: float, precondition: Precondition
) -> tuple[np.ndarray, int]:
    """The same for one load (n, 1) and a matrix that need not be symmetric.

    Saad & Schultz, SIAM J. Sci. Stat. Comput. 7 (1986) 856.
    """
    residuals: list[float] = []
    solution, _ = gmres(
        matrix, loads[:, 0], rtol=reduction, restart=RESTART, maxiter=MOST_ITERATIONS // RESTART,
        M=LinearOperator(matrix.shape, matvec=lambda load: precondition(load.reshape(-1, 1))[:, 0], dtype=float),
        callback=residuals.append, callback_type="pr_norm",
    )  # fmt: skip
    return solution[:, None], len(residuals)
