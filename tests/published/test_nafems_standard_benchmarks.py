"""NAFEMS, The Standard NAFEMS Benchmarks: the steady thermal tests T2 and T4.

First in NAFEMS, Selected FE Benchmarks in Structural and Thermal Analysis (FEBSTA), rev. 1, 1986, as 9(iii) and 9(i).
The published targets are quoted from memory; beside each stands its own exact solution.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from fluxface.solver.case import Accuracy, Case, Convection, Part, Radiation, Tag
from fluxface.solver.materials import Material
from probe import ZERO_CELSIUS, solved
from scipy.constants import Stefan_Boltzmann
from scipy.optimize import brentq
from series import FilmCooledStrip
from shapes import blocks, box, facing, tagged


@pytest.mark.parametrize("order", [1, 2])
def test_t2_conduction_with_radiation(tmp_path: Path, order: int) -> None:
    """T2: a bar held at 1000 K at one end radiates from the other to 300 K."""
    length, conductivity, emissivity = 0.1, 55.6, 0.98
    bar = tagged(tagged(box((length, 0.01, 0.01)), 0, facing("-x")), 1, facing("+x"))
    tags = (Tag("A", temperature=1000.0), Tag("B", radiation=Radiation(emissivity, 300.0)))
    part = Part("bar", Material("T2", (conductivity,)))
    result = solved(Case(bar, (part,), tags, accuracy=Accuracy(order, size=0.005)), tmp_path)

    def surplus(end: float) -> float:
        return conductivity * (1000.0 - end) / length - emissivity * Stefan_Boltzmann * (end**4 - 300.0**4)

    exact = brentq(surplus, 300.0, 1000.0)
    end = result.tag("B")
    assert end["mean"] == pytest.approx(927.0, abs=0.1)  # NAFEMS T2, from memory
    assert end["mean"] == pytest.approx(927.008, abs=0.01)  # root of the balance with 5.67e-8 W/(m2 K4)
    assert end["mean"] == pytest.approx(exact, abs=1e-4)
    assert end["heat"] / end["area"] == pytest.approx(-40583.8, rel=1e-3)  # W/m2, of the same balance
    assert end["heat"] / end["area"] == pytest.approx(-conductivity * (1000.0 - exact) / length, rel=1e-5)
    assert end["split"]["radiation"] == end["heat"]


def test_t4_conduction_with_convection(tmp_path: Path) -> None:
    """T4: a rectangle 0.6 m x 1 m, its base AB at 100 °C, film-cooled on BC and CD, insulated on DA.

    The temperature's slope is singular at B, so the surface is divided more finely there.
    """
    width, height, depth, conductivity, film = 0.6, 1.0, 0.05, 52.0, 750.0
    x = np.array([0.0, 0.3, 0.45, 0.53, 0.57, 0.59, width])
    y = np.array([0.0, 0.01, 0.03, 0.07, 0.15, 0.3, 0.6, height])
    plate = blocks(x, y, np.array([0.0, depth]))
    for tag, side in enumerate(("-y", "+x", "+y")):
        plate = tagged(plate, tag, facing(side))
    air = Convection(ambient=ZERO_CELSIUS, coefficient=film)
    tags = (Tag("AB", temperature=ZERO_CELSIUS + 100.0), Tag("BC", convection=air), Tag("CD", convection=air))
    part = Part("plate", Material("T4", (conductivity,)))
    result = solved(Case(plate, (part,), tags, accuracy=Accuracy(size=0.04)), tmp_path)

    exact = FilmCooledStrip(width, height, conductivity, film)
    (at_e,) = result.celsius([(width, 0.2, depth / 2)])
    assert at_e == pytest.approx(18.3, abs=0.2)  # NAFEMS T4, from memory
    assert at_e == pytest.approx(18.2538, abs=0.05)  # the series
    assert 100.0 * exact.rise(width, 0.2) == pytest.approx(18.2538, abs=1e-4)
    assert result.tag("BC")["heat"] / depth == pytest.approx(-9217.98, rel=5e-3)
    assert 100.0 * exact.heat_off_side() == pytest.approx(9217.98, rel=1e-5)
    assert result.tag("CD")["heat"] / depth == pytest.approx(-1069.97, rel=5e-3)
    assert 100.0 * exact.heat_off_end() == pytest.approx(1069.97, rel=1e-5)
