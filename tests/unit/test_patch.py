"""Patch tests: fields that the elements hold exactly come out exactly, on meshes without any regularity.

Irons & Razzaque (1972), in Zienkiewicz & Taylor, The Finite Element Method, vol. 1 (from memory): a linear field, and
on quadratic elements a quadratic one, must be reproduced whatever the mesh and however the conditions are mixed.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from cases import case_of, mesh_of, metal
from fluxface.solver import pipeline
from fluxface.solver.case import Convection, Surface, Tag
from fluxface.solver.fem.boundary import SurfacePoints, face_points, film_matrix, flux_load
from fluxface.solver.fem.mesh import Mesh
from fluxface.solver.fem.volume import heat_load, volumes
from fluxface.solver.materials import Material
from fluxface.solver.physics.conduction import constant_conduction
from scipy.sparse.linalg import splu
from shapes import box, centres_and_normals, hull, irregular_solid, moved, rotation, tagged

both_orders = pytest.mark.parametrize("order", [1, 2])

AXES = rotation((1.0, 0.4, 0.1), 29.0)
LAMINATE = Material("invented laminate", (60.0, 20.0, 5.0), axes=tuple(map(tuple, AXES)))
TENSOR = AXES.T @ np.diag(LAMINATE.conductivity) @ AXES  # W/(m K)
GRADIENT = np.array([310.0, -170.0, 440.0])  # K/m
CURVATURE = np.array([[900.0, 250.0, 0.0], [250.0, -400.0, 610.0], [0.0, 610.0, 1500.0]])  # K/m2
FILM = 35.0  # W/(m2 K)

Field = Callable[[np.ndarray], np.ndarray]


def linear(x: np.ndarray) -> np.ndarray:
    return 350.0 + x @ GRADIENT


def linear_slope(x: np.ndarray) -> np.ndarray:
    return np.broadcast_to(GRADIENT, x.shape)


def quadratic(x: np.ndarray) -> np.ndarray:
    return linear(x) + 0.5 * np.einsum("...i,ij,...j->...", x, CURVATURE, x)


def quadratic_slope(x: np.ndarray) -> np.ndarray:
    return GRADIENT + x @ CURVATURE


def temperatures_with_mixed_faces(mesh: Mesh, field: Field, slope: Field, heat_density: float) -> np.ndarray:
    """(N,) the element solution where a third of the faces is held, a third given its flux, a third in moving air."""
    kind = mesh.boundary_face % 3
    size = len(mesh.nodes)
    matrix = constant_conduction(mesh, [LAMINATE])
    load = heat_load(mesh, volumes(mesh), np.full(len(mesh.cells), heat_density))

    def points_and_flux(of_kind: int) -> tuple[SurfacePoints, np.ndarray, np.ndarray]:
        points = face_points(mesh.nodes, mesh.boundary, np.flatnonzero(kind == of_kind), 2 * mesh.order)
        position = points.shape @ mesh.nodes
        corners = mesh.nodes[mesh.boundary[points.facet, :3]]
        normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        normal /= np.linalg.norm(normal, axis=1, keepdims=True)
        return points, position, np.einsum("pi,ij,pj->p", normal, TENSOR, slope(position))

    points, _, flux = points_and_flux(1)
    load = load + flux_load(points, flux)
    points, position, flux = points_and_flux(2)
    matrix = matrix + film_matrix(points, FILM)
    # The air at each point is as warm as it must be for the film to pass the field's own flux.
    load = load + flux_load(points, FILM * field(position) + flux)

    held = np.unique(mesh.boundary[kind == 0])
    free = np.setdiff1d(np.arange(size), held)
    temperature = np.zeros(size)
    temperature[held] = field(mesh.nodes[held])
    rest = load[free] - matrix[free][:, held] @ temperature[held]
    temperature[free] = splu(matrix[free][:, free].tocsc()).solve(rest)
    return temperature


@both_orders
def test_a_linear_field_on_mixed_faces(order: int) -> None:
    mesh = mesh_of(irregular_solid(), order, 0.012)
    found = temperatures_with_mixed_faces(mesh, linear, linear_slope, 0.0)
    np.testing.assert_allclose(found, linear(mesh.nodes), rtol=1e-9)


def test_a_quadratic_field_on_mixed_faces() -> None:
    mesh = mesh_of(irregular_solid(), 2, 0.012)
    found = temperatures_with_mixed_faces(mesh, quadratic, quadratic_slope, -np.sum(TENSOR * CURVATURE))
    np.testing.assert_allclose(found, quadratic(mesh.nodes), rtol=1e-9)


def test_a_quadratic_field_is_not_held_by_linear_elements() -> None:
    """That the tests here can fail: the same check finds the error that linear elements must make."""
    mesh = mesh_of(irregular_solid(), 1, 0.012)
    found = temperatures_with_mixed_faces(mesh, quadratic, quadratic_slope, -np.sum(TENSOR * CURVATURE))
    assert np.abs(found - quadratic(mesh.nodes)).max() > 1e-3


# Through the case: the same, as far as tags can say it --------------------------------------------------------------

LEAN = rotation((0.2, 1.0, -0.5), 63.0)
ALONG = LEAN[:, 2]
DROP = 900.0  # K/m along ALONG
HEIGHT = 0.04


def leaning_frustum() -> Surface:
    """Between unlike polygons in parallel planes, its axis along ALONG: foot 0, head 1, each side a tag from 2 on."""
    lower = [(0, 0, 0), (0.06, -0.01, 0), (0.08, 0.03, 0), (0.03, 0.07, 0), (-0.02, 0.04, 0)]
    upper = [(0.01, 0.01, HEIGHT), (0.07, 0.0, HEIGHT), (0.05, 0.05, HEIGHT)]
    solid = moved(hull(np.array(lower + upper)), turn=LEAN, shift=(0.3, -0.2, 1.1))
    looks = centres_and_normals(solid)[1] @ ALONG
    tag = np.where(looks > 0, 1, 0)
    sides = np.abs(looks) < 1 - 1e-9
    tag[sides] = 2 + np.arange(np.count_nonzero(sides))
    return replace(solid, tag=tag.astype(np.int32))


@both_orders
@pytest.mark.parametrize("upper", ["convection", "temperature"])
def test_a_linear_field_through_the_case(order: int, upper: str) -> None:
    """Foot held, head in air or held, each side with the flux of the field through it; orthotropic, axes askew."""
    solid = leaning_frustum()
    foot = (solid.vertices @ ALONG).min()

    def field(x: np.ndarray) -> np.ndarray:
        return 400.0 - DROP * (x @ ALONG - foot)

    into = centres_and_normals(solid)[1] @ TENSOR @ (-DROP * ALONG)
    head, film = 400.0 - DROP * HEIGHT, 80.0
    air = Convection(head + float(ALONG @ TENSOR @ (-DROP * ALONG)) / film, film)
    head_terms = {"convection": air} if upper == "convection" else {"temperature": head}
    sides = np.argsort(solid.tag)[np.count_nonzero(solid.tag < 2) :]
    tags = [
        Tag("foot", temperature=400.0),
        Tag("head", **head_terms),
        *(Tag(f"side {side}", heat_flux=into[side]) for side in sides),
    ]
    case = case_of(solid, tags, material=LAMINATE, order=order, size=0.015)
    solved = pipeline.solve(case)
    np.testing.assert_allclose(solved.field.temperature, field(solved.field.nodes), rtol=1e-9)
    exact = TENSOR @ (DROP * ALONG)
    for flux in (solved.field.cell_heat_flux, solved.field.heat_flux):
        np.testing.assert_allclose(flux, np.broadcast_to(exact, flux.shape), rtol=0, atol=1e-8 * np.abs(exact).max())


def test_a_quadratic_field_through_the_case() -> None:
    """Heat released evenly in a slab between two faces in air: T = air + q a / h + q (a^2 - z^2) / (2 k).

    Incropera & DeWitt, Fundamentals of Heat and Mass Transfer, section 3.5.1 (from memory); sides insulated.
    """
    half, density, film = 0.02, 2.0e5, 50.0
    solid = moved(box((0.05, 0.03, 2 * half)), shift=(0, 0, -half))
    solid = tagged(solid, 0, lambda centres, normals: np.abs(normals[:, 2]) > 0.9)
    turn = rotation((1.0, 2.0, 0.5), 41.0)
    case = case_of(
        moved(solid, turn=turn),
        [Tag("air", convection=Convection(300.0, film))],
        material=metal(0.8),
        heat=density * 0.05 * 0.03 * 2 * half,
        size=0.01,
    )
    solved = pipeline.solve(case)
    height = solved.field.nodes @ turn[:, 2]
    exact = 300.0 + density * half / film + density * (half**2 - height**2) / (2 * 0.8)
    np.testing.assert_allclose(solved.field.temperature, exact, rtol=1e-9)
