"""The parent triangle and tetrahedron: shape functions and quadrature.

Zienkiewicz & Taylor, The Finite Element Method, vol. 1 (the Lagrange elements; from memory): shape functions sum to
one, each is one at its own node and zero at the others.
"""

from __future__ import annotations

from itertools import product
from math import factorial, prod

import numpy as np
import pytest
from fluxface.solver.fem.reference import quadrature, shape_functions, shape_gradients

# Mid-side nodes as the result format lists them: triangles 01 12 20, tetrahedra 01 12 02 03 13 23 (VTK's order).
SIDES = {2: [(0, 1), (1, 2), (2, 0)], 3: [(0, 1), (1, 2), (0, 2), (0, 3), (1, 3), (2, 3)]}

elements = pytest.mark.parametrize(("dimension", "order"), list(product((2, 3), (1, 2))))


def nodes(dimension: int, order: int) -> np.ndarray:
    corners = np.eye(dimension + 1)
    return corners if order == 1 else np.concatenate([corners, corners[SIDES[dimension]].mean(axis=1)])


def some_points(dimension: int) -> np.ndarray:
    """Inside and outside: the identities hold everywhere."""
    inner = np.random.default_rng(1).uniform(-0.5, 1.5, (20, dimension))
    return barycentric(inner)


def barycentric(axes: np.ndarray) -> np.ndarray:
    return np.concatenate([1.0 - axes.sum(axis=1, keepdims=True), axes], axis=1)


@elements
def test_shape_functions_sum_to_one_and_their_slopes_to_zero(dimension: int, order: int) -> None:
    points = some_points(dimension)
    np.testing.assert_allclose(shape_functions(points, order).sum(axis=1), 1.0, rtol=0, atol=1e-13)
    np.testing.assert_allclose(shape_gradients(points, order).sum(axis=1), 0.0, rtol=0, atol=1e-13)


@elements
def test_each_shape_function_is_one_at_its_own_node_and_zero_at_the_others(dimension: int, order: int) -> None:
    own = nodes(dimension, order)
    np.testing.assert_array_equal(shape_functions(own, order), np.eye(len(own)))


@elements
def test_gradients_are_the_slopes_of_the_shape_functions(dimension: int, order: int) -> None:
    """By a complex step (Squire & Trapp, SIAM Review 40 (1998) 110), which is free of cancellation."""
    axes = some_points(dimension)[:, 1:]
    slopes = shape_gradients(barycentric(axes), order)
    for axis in range(dimension):
        stepped = barycentric(axes + 1e-30j * np.eye(dimension)[axis])
        np.testing.assert_allclose(slopes[:, :, axis], shape_functions(stepped, order).imag / 1e-30, atol=1e-13)


@elements
def test_gradients_against_finite_differences(dimension: int, order: int) -> None:
    """Central differences are exact for the quadratics at hand but for rounding."""
    axes, step = some_points(dimension)[:, 1:], 1e-3
    slopes = shape_gradients(barycentric(axes), order)
    for axis in range(dimension):
        shift = step * np.eye(dimension)[axis]
        ahead, behind = (shape_functions(barycentric(axes + way * shift), order) for way in (1, -1))
        np.testing.assert_allclose(slopes[:, :, axis], (ahead - behind) / (2 * step), atol=1e-11)


@pytest.mark.parametrize("degree", range(7))
@pytest.mark.parametrize("dimension", [2, 3])
def test_quadrature_is_exact_on_monomials_up_to_its_degree(dimension: int, degree: int) -> None:
    """The mean over a simplex of a product of powers of its barycentric coordinates.

    Eisenberg & Malvern, Int. J. Numer. Methods Eng. 7 (1973) 574 (from memory): in a tetrahedron
    a! b! c! d! 3! / (a + b + c + d + 3)!, in a triangle a! b! c! 2! / (a + b + c + 2)!.
    """
    points, weights = quadrature(dimension, degree)
    assert points.min() >= 0 and weights.min() > 0
    np.testing.assert_allclose(points.sum(axis=1), 1.0, rtol=0, atol=1e-14)
    np.testing.assert_allclose(weights.sum(), 1.0, rtol=1e-14)
    powers = [p for p in product(range(degree + 1), repeat=dimension + 1) if sum(p) <= degree]
    for power in powers:
        exact = prod(map(factorial, power)) * factorial(dimension) / factorial(sum(power) + dimension)
        assert weights @ np.prod(points**power, axis=1) == pytest.approx(exact, rel=1e-13)
