"""Exact solutions, from a case through meshing and solving to the reported numbers.

Incropera & DeWitt, Fundamentals of Heat and Mass Transfer, chapter 3 (formulas from memory); the numbers are invented.
"""

from __future__ import annotations

import numpy as np
import pytest
from cases import case_of, metal
from fluxface.solver import pipeline
from fluxface.solver.case import Convection, Tag
from fluxface.solver.geometry.surface import enclosed_volume, triangle_corners
from fluxface.solver.pipeline import Solved
from shapes import box, every, facing, sphere, tagged, tube


def tag_of(solved: Solved, name: str) -> dict:
    return next(tag for tag in solved.summary["tags"] if tag["name"] == name)


def air(ambient: float, coefficient: float) -> dict[str, Convection]:
    return {"convection": Convection(ambient, coefficient)}


# Plane wall -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("order", [1, 2])
def test_plane_wall_with_air_on_both_sides(order: int) -> None:
    """Section 3.1: three resistances in a row, 1/h1 + L/k + 1/h2 for each square metre."""
    thickness, width, height, conductivity = 0.025, 0.06, 0.04, 0.9
    inside, outside, film_inside, film_outside = 350.0, 280.0, 12.0, 45.0
    wall = box((thickness, width, height))
    wall = tagged(tagged(wall, 0, facing("-x")), 1, facing("+x"))
    case = case_of(
        wall,
        [Tag("inside", **air(inside, film_inside)), Tag("outside", **air(outside, film_outside))],
        material=metal(conductivity),
        order=order,
        size=0.012,
    )
    solved = pipeline.solve(case)
    flux = (inside - outside) / (1 / film_inside + thickness / conductivity + 1 / film_outside)
    warm = inside - flux / film_inside
    exact = warm - flux * solved.field.nodes[:, 0] / conductivity
    np.testing.assert_allclose(solved.field.temperature, exact, rtol=1e-9)
    assert tag_of(solved, "inside")["heat"] == pytest.approx(flux * width * height, rel=1e-9)
    assert tag_of(solved, "outside")["heat"] == pytest.approx(-flux * width * height, rel=1e-9)
    assert tag_of(solved, "inside")["mean"] == pytest.approx(warm, rel=1e-9)


# Straight rectangular fin ---------------------------------------------------------------------------------------------

LENGTH, THICKNESS, WIDTH = 0.05, 0.002, 0.006
FIN_CONDUCTIVITY, FIN_FILM, BASE, ROOM = 180.0, 30.0, 380.0, 300.0


def solved_fin(tip: Tag) -> Solved:
    """A slice of a long fin, held at its base: its flanks in air, the cuts of the slice insulated."""
    fin = tagged(box((LENGTH, WIDTH, THICKNESS)), 0, facing("-x"))
    fin = tagged(fin, 1, lambda centres, normals: np.abs(normals[:, 2]) > 0.9)
    tags = [Tag("base", temperature=BASE), Tag("flanks", **air(ROOM, FIN_FILM)), tip]
    return pipeline.solve(case_of(tagged(fin, 2, facing("+x")), tags, material=metal(FIN_CONDUCTIVITY), size=0.0013))


@pytest.mark.parametrize("tip_in_air", [False, True], ids=["adiabatic tip", "convective tip"])
def test_straight_fin(tip_in_air: bool) -> None:
    """Table 3.4, cases A (convective tip) and B (adiabatic tip), for a fin so thin that its theory holds to 1e-4.

    The theory takes the temperature as even across the fin, which it is to h t / (2 k) = 1.7e-4.
    """
    perimeter, section = 2 * WIDTH, WIDTH * THICKNESS
    m = np.sqrt(FIN_FILM * perimeter / (FIN_CONDUCTIVITY * section))
    tip = FIN_FILM / (m * FIN_CONDUCTIVITY) if tip_in_air else 0.0
    scale = np.sqrt(FIN_FILM * perimeter * FIN_CONDUCTIVITY * section) * (BASE - ROOM)
    sinh, cosh = np.sinh(m * LENGTH), np.cosh(m * LENGTH)
    heat = scale * (sinh + tip * cosh) / (cosh + tip * sinh)

    solved = solved_fin(Tag("tip", **air(ROOM, FIN_FILM)) if tip_in_air else Tag("tip"))
    rest = LENGTH - solved.field.nodes[:, 0]
    profile = (np.cosh(m * rest) + tip * np.sinh(m * rest)) / (cosh + tip * sinh)
    assert tag_of(solved, "base")["heat"] == pytest.approx(heat, rel=2e-4)
    np.testing.assert_allclose((solved.field.temperature - ROOM) / (BASE - ROOM), profile, rtol=0, atol=2e-4)


# Hollow cylinder and sphere: faceted, so that the error falls with the facets -----------------------------------------


def outward(centres: np.ndarray, normals: np.ndarray) -> np.ndarray:
    """(F,) the cosine of the angle by which a face looks away from the z axis."""
    return (centres[:, :2] * normals[:, :2]).sum(axis=1) / np.hypot(*centres[:, :2].T)


def error_of_tube(around: int) -> float:
    """The largest error of a tube with flux on its bore and air outside, as a share of its rise above the air.

    Section 3.3.1: radial conduction, T = air + q ri / (h ro) + q ri ln(ro / r) / k.
    """
    inner, outer, height, conductivity, flux, film, ambient = 0.01, 0.025, 0.01, 2.0, 4000.0, 25.0, 295.0
    wall = tube(inner, outer, height, around)
    wall = tagged(wall, 0, lambda centres, normals: outward(centres, normals) < -0.9)
    wall = tagged(wall, 1, lambda centres, normals: outward(centres, normals) > 0.9)
    tags = [Tag("bore", heat_flux=flux), Tag("outside", **air(ambient, film))]
    solved = pipeline.solve(case_of(wall, tags, material=metal(conductivity), size=0.006))
    radius = np.hypot(solved.field.nodes[:, 0], solved.field.nodes[:, 1])
    exact = flux * inner / (film * outer) + flux * inner * np.log(outer / radius) / conductivity
    return float(np.abs(solved.field.temperature - ambient - exact).max() / exact.max())


def test_hollow_cylinder_with_flux_inside_and_air_outside() -> None:
    errors = [error_of_tube(around) for around in (12, 24, 48)]
    orders = np.log2(np.divide(errors[:-1], errors[1:]))
    assert errors[-1] < 2e-3
    assert (orders > 1.8).all()


def error_of_sphere(subdivisions: int) -> float:
    """The largest error of a sphere with even heat inside and air outside, as a share of its rise above the air.

    Section 3.5.2: T = air + q R / (3 h) + q (R^2 - r^2) / (6 k), q in W/m3.
    """
    radius, conductivity, density, film, ambient = 0.03, 0.6, 5.0e4, 15.0, 295.0
    ball = tagged(sphere(radius, subdivisions), 0, every)
    volume = enclosed_volume(triangle_corners(ball))
    case = case_of(
        ball, [Tag("skin", **air(ambient, film))], material=metal(conductivity), heat=density * volume, size=0.01
    )
    solved = pipeline.solve(case)
    square = (solved.field.nodes**2).sum(axis=1)
    exact = density * radius / (3 * film) + density * (radius**2 - square) / (6 * conductivity)
    assert solved.summary["hottest"]["at"] == pytest.approx([0, 0, 0], abs=0.2 * radius)
    return float(np.abs(solved.field.temperature - ambient - exact).max() / exact.max())


def test_sphere_with_even_heat_and_air_outside() -> None:
    errors = [error_of_sphere(subdivisions) for subdivisions in (1, 2, 3)]
    orders = np.log2(np.divide(errors[:-1], errors[1:]))
    assert errors[-1] < 5e-3
    assert (orders > 1.8).all()
