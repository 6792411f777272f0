"""Boundary terms of the weak form: surface integrals over triangles by quadrature in the parent triangle.

A set of quadrature points holds the rows of shape functions as one sparse matrix S (P, N). With the weights w, the
surface Jacobian in them, everything else follows: the load of a flux q is S' (w q), the matrix of a film is
S' diag(w h) S, and the temperature at the points is S T. Nodes off the faces have no column in S: exactly zero.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array, diags_array, vstack

from .reference import quadrature, shape_functions


@dataclass(frozen=True)
class SurfacePoints:
    """facet: (P,) triangle of each point. weight: (P,) m2. shape: (P, N) shape functions of the triangle's nodes."""

    facet: np.ndarray
    weight: np.ndarray
    shape: csr_array

    @property
    def area(self) -> float:
        return float(self.weight.sum())


def surface_jacobian(nodes: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(B,) m2 |dx/dxi x dx/deta| of the map from the parent triangle, the same all over straight-sided ones.

    nodes: (N, 3) m. triangles: (B, 3).
    """
    x, y, z = (along.take(triangles.T[1:]) - along.take(triangles.T[0]) for along in nodes.T.copy())
    return np.sqrt(
        (y[0] * z[1] - z[0] * y[1]) ** 2 + (z[0] * x[1] - x[0] * z[1]) ** 2 + (x[0] * y[1] - y[0] * x[1]) ** 2
    )


def points_at(
    boundary: np.ndarray, facet: np.ndarray, barycentric: np.ndarray, weight: np.ndarray, size: int
) -> SurfacePoints:
    """Points given one by one: facet (P,) into boundary (B, 3 or 6), barycentric (P, 3), weight (P,) m2."""
    values = shape_functions(barycentric, 1 if boundary.shape[1] == 3 else 2)
    return _points(boundary, facet, values, weight, size)


def _points(
    boundary: np.ndarray, facet: np.ndarray, values: np.ndarray, weight: np.ndarray, size: int
) -> SurfacePoints:
    """values: (P, 3 or 6) of the shape functions of each point's triangle."""
    starts = values.shape[1] * np.arange(len(facet) + 1, dtype=np.int32)
    nodes = boundary.take(facet, axis=0)
    return SurfacePoints(facet, weight, csr_array((values.ravel(), nodes.ravel(), starts), (len(facet), size)))


def face_points(nodes: np.ndarray, boundary: np.ndarray, facets: np.ndarray, degree: int) -> SurfacePoints:
    """A rule of ``degree`` on each of the triangles ``facets`` (K,) of boundary (B, 3 or 6); nodes (N, 3) m."""
    points, weights = quadrature(2, degree)
    # The parent triangle has area 1/2, and the weights sum to 1.
    weight = 0.5 * weights * surface_jacobian(nodes, boundary[facets, :3])[:, None]
    values = np.tile(shape_functions(points, 1 if boundary.shape[1] == 3 else 2), (len(facets), 1))
    return _points(boundary, np.repeat(facets, len(points)), values, weight.ravel(), len(nodes))


def both(first: SurfacePoints, second: SurfacePoints) -> SurfacePoints:
    """The points of two sets as one."""
    return SurfacePoints(
        np.concatenate([first.facet, second.facet]),
        np.concatenate([first.weight, second.weight]),
        csr_array(vstack([first.shape, second.shape])),
    )


def flux_load(points: SurfacePoints, flux: np.ndarray | float) -> np.ndarray:
    """(N,) W: the integral of N_a times flux, (P,) or uniform, W/m2."""
    return points.shape.T @ (points.weight * flux)


def film_matrix(points: SurfacePoints, coefficient: np.ndarray | float) -> csr_array:
    """(N, N) W/K: the integral of N_a N_b times a coefficient, (P,) or uniform, W/(m2 K)."""
    return csr_array(points.shape.T @ diags_array(points.weight * coefficient) @ points.shape)
