"""The parent triangle and tetrahedron: shape functions, their gradients, quadrature.

Points are barycentric coordinates (P, d + 1), so that one formula serves both shapes.
Zienkiewicz & Taylor, The Finite Element Method, vol. 1: the standard Lagrange elements.
"""

from __future__ import annotations

import numpy as np
from scipy.special import roots_jacobi

from .mesh import CELL_EDGES, FACE_EDGES


def _edges_of(points: np.ndarray) -> np.ndarray:
    return FACE_EDGES if points.shape[1] == 3 else CELL_EDGES


def shape_functions(points: np.ndarray, order: int) -> np.ndarray:
    """(P, n) value of each node's shape function; points (P, d + 1); nodes: the corners, then the mid-sides."""
    if order == 1:
        return points
    i, j = _edges_of(points).T
    return np.concatenate([points * (2.0 * points - 1.0), 4.0 * points[:, i] * points[:, j]], axis=1)


def shape_gradients(points: np.ndarray, order: int) -> np.ndarray:
    """(P, n, d) slopes along the parent axes, on which the last d barycentric coordinates are measured."""
    count, corners = points.shape
    slopes = np.broadcast_to(np.eye(corners), (count, corners, corners))
    if order == 2:
        i, j = _edges_of(points).T
        of_corners = slopes * (4.0 * points - 1.0)[:, :, None]
        of_sides = 4.0 * (slopes[:, i] * points[:, j, None] + slopes[:, j] * points[:, i, None])
        slopes = np.concatenate([of_corners, of_sides], axis=1)
    return slopes[:, :, 1:] - slopes[:, :, :1]


# On the triangle: (a, a, 1 - 2a) and its turns with a weight each, for each a. Closed forms (from memory).
FEWEST_POINTS = {
    (2, 2): ((1 / 6,), (1 / 3,)),
    (2, 4): (
        tuple((8 - np.sqrt(10) + sign * np.sqrt(38 - 44 * np.sqrt(0.4))) / 18 for sign in (1, -1)),
        tuple((620 + sign * np.sqrt(213125 - 53320 * np.sqrt(10))) / 3720 for sign in (1, -1)),
    ),
}


def _thrice(share: float) -> np.ndarray:
    return np.full((3, 3), share) + (1.0 - 3.0 * share) * np.eye(3)


def quadrature(dimension: int, degree: int) -> tuple[np.ndarray, np.ndarray]:
    """Points (Q, d + 1) and weights (Q,), summing to 1, exact for polynomials of ``degree`` on the simplex.

    Stroud, Approximate Calculation of Multiple Integrals (1971): the conical product of Gauss-Jacobi rules. Triangles
    are integrated over so often that rules of fewer points pay: Dunavant, Int. J. Numer. Methods Eng. 21 (1985) 1129.
    """
    if (dimension, degree) in FEWEST_POINTS:
        shares, masses = FEWEST_POINTS[dimension, degree]
        return np.concatenate([_thrice(share) for share in shares]), np.repeat(masses, 3)
    count = degree // 2 + 1
    rest, weights = np.ones((1, 1)), np.ones(1)
    points = np.zeros((1, 0))
    for left in range(dimension, 0, -1):
        roots, masses = roots_jacobi(count, left - 1.0, 0.0)
        share = 0.5 * (roots + 1.0)
        points = np.concatenate([np.repeat(points, count, axis=0), np.outer(rest[:, 0], share).reshape(-1, 1)], axis=1)
        rest = np.outer(rest[:, 0], 1.0 - share).reshape(-1, 1)
        weights = np.outer(weights, masses / masses.sum()).ravel()
    return np.concatenate([rest, points], axis=1), weights
