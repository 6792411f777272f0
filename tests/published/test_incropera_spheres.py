"""Incropera, DeWitt, Bergman & Lavine, Fundamentals of Heat and Mass Transfer, 6th ed. 2007: spheres.

Closed forms of sec. 3.3.2 (the hollow sphere; also Carslaw & Jaeger, Conduction of Heat in Solids, 2nd ed. 1959,
sec. 9.2) and of sec. 3.5.2 and App. C (heat released evenly). The spheres are faceted, their corners on the radius: the
facets' area and the volume are less than the sphere's by a share that falls with the square of a facet's size, and so
does the error.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from fluxface.solver.case import Accuracy, Case, Convection, Part, Tag
from fluxface.solver.materials import Material
from probe import ZERO_CELSIUS, Solved, solved
from shapes import every, hollow_sphere, sphere, tagged

INWARDS = (1.0, 2.0, 3.0) / np.sqrt(14.0)  # no direction of the icosahedron's corners, edges or faces


def heated_hollow_sphere(subdivisions: int, folder: Path) -> Solved:
    """Radii 50 and 80 mm, 2.5 W/(m K); 4000 W/m2 enter inside, a film of 30 W/(m2 K) to 20 °C outside."""
    shell = tagged(hollow_sphere(0.05, 0.08, subdivisions), 1, every)
    shell = tagged(shell, 0, lambda centres, normals: (centres * normals).sum(axis=1) < 0)
    tags = (
        Tag("inside", heat_flux=4000.0),
        Tag("outside", convection=Convection(ambient=ZERO_CELSIUS + 20.0, coefficient=30.0)),
    )
    part = Part("shell", Material("shell", (2.5,)))
    return solved(Case(shell, (part,), tags, accuracy=Accuracy(size=0.012)), folder)


def test_hollow_sphere(tmp_path: Path) -> None:
    heat = 4000.0 * 4.0 * np.pi * 0.05**2
    outer = 20.0 + heat / (30.0 * 4.0 * np.pi * 0.08**2)
    inner = outer + heat / (4.0 * np.pi * 2.5) * (1.0 / 0.05 - 1.0 / 0.08)
    assert (heat, outer, inner) == pytest.approx((125.664, 72.0833, 102.083), rel=1e-5)

    errors = []
    for subdivisions in (2, 3, 4):
        result = heated_hollow_sphere(subdivisions, tmp_path)
        found = result.tag("inside")["heat"], *(result.tag(name)["mean"] for name in ("outside", "inside"))
        errors.append(np.abs(np.array(found) - (heat, outer + ZERO_CELSIUS, inner + ZERO_CELSIUS)))
    assert errors[-1][0] < 0.005 * heat
    assert errors[-1][1] < 0.007 * (outer - 20.0)
    assert errors[-1][2] < 0.007 * (inner - 20.0)
    by_facets = np.array(errors)[:, [0, 2]]
    assert (by_facets[:-1] > 3.5 * by_facets[1:]).all()


def test_sphere_with_heat_inside(tmp_path: Path) -> None:
    """Radius 30 mm, 2 W/(m K), 100 kW/m3 released; a film of 40 W/(m2 K) to 25 °C."""
    radius, conductivity, released, film = 0.03, 2.0, 1e5, 40.0
    surface = 25.0 + released * radius / (3.0 * film)
    centre = surface + released * radius**2 / (6.0 * conductivity)
    heat = released * 4.0 / 3.0 * np.pi * radius**3
    assert (surface, centre, heat) == pytest.approx((50.0, 57.5, 11.3097), rel=1e-5)

    ball = tagged(sphere(radius, 4), 0, every)
    tag = Tag("surface", convection=Convection(ambient=ZERO_CELSIUS + 25.0, coefficient=film))
    part = Part("ball", Material("ball", (conductivity,)), heat_density=released)
    result = solved(Case(ball, (part,), (tag,), accuracy=Accuracy(size=0.005)), tmp_path)
    assert result.tag("surface")["mean"] - ZERO_CELSIUS == pytest.approx(surface, rel=2e-3)
    assert result.celsius([(0.0, 0.0, 0.0)]) == pytest.approx(centre, rel=2e-3)
    assert result.part("ball")["heat"] == pytest.approx(heat, rel=5e-3)
    assert result.tag("surface")["heat"] == pytest.approx(-result.part("ball")["heat"], rel=1e-9)
    for share in (0.25, 0.5, 0.75):
        inside = surface + (centre - surface) * (1.0 - share**2)
        assert result.celsius([share * radius * INWARDS]) == pytest.approx(inside, rel=2e-3)
