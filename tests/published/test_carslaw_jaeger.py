"""Carslaw & Jaeger, Conduction of Heat in Solids, 2nd ed. 1959: conductivity that varies with temperature or direction.

The closed forms are those of sec. 1.6 (Kirchhoff's transformation) and sec. 1.17 to 1.20 (crystals); also in Özisik,
Heat Conduction, 2nd ed. 1993, ch. 10 and 15. The cases' dimensions are invented.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from fluxface.solver.case import Accuracy, Case, Part, Surface, Tag
from fluxface.solver.materials import Material, Table
from probe import ZERO_CELSIUS, Solved, solved
from shapes import blocks, box, facing, moved, polar, rotation, tagged

# Sec. 1.6 ------------------------------------------------------------------------------------------------------------

REFERENCE, SLOPE = 12.0, 0.002  # conductivity 12 (1 + 0.002 (T - 20 °C)) W/(m K), a straight line, so two entries do
WARMING = Material(
    "warming", (Table((ZERO_CELSIUS + 20.0, ZERO_CELSIUS + 620.0), (REFERENCE, REFERENCE * (1.0 + SLOPE * 600.0))),)
)
HOT, COLD = 600.0, 100.0  # °C


def potential(celsius: float) -> float:
    """W/m: the integral of the conductivity from 20 °C, which obeys Laplace's equation."""
    above = celsius - 20.0
    return REFERENCE * (above + 0.5 * SLOPE * above**2)


def celsius_of(potential: float) -> float:
    return 20.0 + (np.sqrt(1.0 + 2.0 * SLOPE * potential / REFERENCE) - 1.0) / SLOPE


def between_hot_and_cold(wall: Surface, size: float, folder: Path) -> Solved:
    """The wall with tag 0 held hot and tag 1 cold."""
    tags = Tag("hot", temperature=ZERO_CELSIUS + HOT), Tag("cold", temperature=ZERO_CELSIUS + COLD)
    return solved(Case(wall, (Part("wall", WARMING),), tags, accuracy=Accuracy(size=size)), folder)


def test_slab_whose_conductivity_varies(tmp_path: Path) -> None:
    thickness, side = 0.05, 0.02
    wall = tagged(tagged(box((thickness, side, side)), 0, facing("-x")), 1, facing("+x"))
    result = between_hot_and_cold(wall, 0.004, tmp_path)
    flux = (potential(HOT) - potential(COLD)) / thickness
    middle = celsius_of(0.5 * (potential(HOT) + potential(COLD)))
    assert (flux, middle) == pytest.approx((199200.0, 386.833), rel=1e-5)
    assert result.tag("hot")["heat"] / side**2 == pytest.approx(flux, rel=1e-5)
    assert result.tag("cold")["heat"] / side**2 == pytest.approx(-flux, rel=1e-5)
    assert result.celsius([(thickness / 2, side / 2, side / 2)]) == pytest.approx(middle, abs=0.01)


def test_hollow_cylinder_whose_conductivity_varies(tmp_path: Path) -> None:
    """A quarter of a pipe of radii 20 and 60 mm, hot inside, in facets."""
    inner, outer, height, probed = 0.02, 0.06, 0.01, 0.04
    facets = np.linspace(0.0, np.pi / 2, 25)
    pipe = blocks(np.array([inner, outer]), facets, np.array([0.0, height]))
    pipe = tagged(tagged(pipe, 0, facing("-x")), 1, facing("+x"))
    result = between_hot_and_cold(polar(pipe), 0.004, tmp_path)
    heat = 2.0 * np.pi * (potential(HOT) - potential(COLD)) / np.log(outer / inner)
    share = np.log(probed / inner) / np.log(outer / inner)
    there = celsius_of((1.0 - share) * potential(HOT) + share * potential(COLD))
    assert (heat, there) == pytest.approx((56963.2, 321.703), rel=1e-5)
    assert 4.0 * result.tag("hot")["heat"] / height == pytest.approx(heat, rel=1e-3)
    assert result.celsius([(probed * np.cos(0.7), probed * np.sin(0.7), height / 2)]) == pytest.approx(there, abs=0.3)


# Sec. 1.17 to 1.20 ---------------------------------------------------------------------------------------------------

WIDTH, HEIGHT, DEPTH, ALONG, ACROSS = 0.3, 0.2, 0.02, 40.0, 2.5
PROBED = np.array([(0.15, 0.10, 0.01), (0.15, 0.15, 0.01), (0.075, 0.15, 0.01)])


def stretched_series(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """°C in the rectangle whose side y = HEIGHT is at 100 °C, the others at 0 °C.

    With y stretched by sqrt(ALONG/ACROSS) it is an isotropic one: the sum over odd n of
    400/(n pi) sin(n pi x/WIDTH) sinh(q y)/sinh(q HEIGHT), q the stretched n pi/WIDTH.
    """
    n = np.arange(1, 200, 2)[:, None]
    q = n * np.pi / WIDTH * np.sqrt(ALONG / ACROSS)
    ratio = np.exp(q * (y - HEIGHT)) * (1.0 - np.exp(-2.0 * q * y)) / (1.0 - np.exp(-2.0 * q * HEIGHT))
    return (400.0 / (n * np.pi) * np.sin(n * np.pi * x / WIDTH) * ratio).sum(axis=0)


@pytest.mark.parametrize(
    ("turn", "axes", "conductivity"),
    [
        (np.eye(3), None, (ALONG, ACROSS, 1.0)),
        (np.eye(3), ((0, 1, 0), (0, 0, 1), (1, 0, 0)), (ACROSS, 1.0, ALONG)),
        (rotation((1.0, 2.0, 3.0), 40.0), "with the plate", (ALONG, ACROSS, 1.0)),
    ],
    ids=["world axes", "axes in another order", "turned plate"],
)
def test_orthotropic_rectangle(
    tmp_path: Path,
    turn: np.ndarray,
    axes: tuple[tuple[float, float, float], ...] | str | None,
    conductivity: tuple[float, float, float],
) -> None:
    plate = blocks(
        np.array([0.0, 0.02, 0.06, 0.15, 0.24, 0.28, WIDTH]), np.array([0.0, 0.1, 0.16, HEIGHT]), np.array([0.0, DEPTH])
    )
    for side in ("-x", "+x", "-y"):
        plate = tagged(plate, 1, facing(side))
    plate = moved(tagged(plate, 0, facing("+y")), turn=turn)
    directions = tuple(map(tuple, turn.T.tolist())) if axes == "with the plate" else axes
    part = Part("plate", Material("orthotropic", conductivity, directions))
    tags = Tag("hot", temperature=ZERO_CELSIUS + 100.0), Tag("cold", temperature=ZERO_CELSIUS)
    result = solved(Case(plate, (part,), tags, accuracy=Accuracy(size=0.01)), tmp_path)
    exact = stretched_series(*PROBED.T[:2])
    assert exact == pytest.approx([1.93023, 15.6007, 11.1424], rel=1e-5)
    assert result.celsius(PROBED @ turn.T) == pytest.approx(exact, abs=0.05)


def test_rectangle_of_equal_conductivities(tmp_path: Path) -> None:
    """In the middle of a square with one side at 100 °C and the others at 0 °C it is 25 °C, by symmetry."""
    square = box((0.2, 0.2, DEPTH))
    for side in ("-x", "+x", "-y"):
        square = tagged(square, 1, facing(side))
    square = tagged(square, 0, facing("+y"))
    part = Part("square", Material("equal", (7.0, 7.0, 7.0)))
    tags = Tag("hot", temperature=ZERO_CELSIUS + 100.0), Tag("cold", temperature=ZERO_CELSIUS)
    result = solved(Case(square, (part,), tags, accuracy=Accuracy(size=0.01)), tmp_path)
    assert result.celsius([(0.1, 0.1, DEPTH / 2)]) == pytest.approx(25.0, abs=0.02)
