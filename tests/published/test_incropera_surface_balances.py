"""Incropera, DeWitt, Bergman & Lavine, Fundamentals of Heat and Mass Transfer, 6th ed. 2007, sec. 1.3: energy balances.

Bodies of the kind of Examples 1.2 and 1.6 (from memory), with dimensions of our own: what enters through a surface or
is released inside leaves by convection and radiation, and the exact temperature is the root of that balance.
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
from shapes import box, every, facing, tagged


@pytest.mark.parametrize("order", [1, 2])
def test_plate_cooled_by_convection_and_radiation(tmp_path: Path, order: int) -> None:
    """A plate heated at its back: its front is as the surface balance says, its back hotter by q t/k."""
    thickness, conductivity, flux, film, emissivity, ambient = 0.006, 0.3, 2000.0, 10.0, 0.85, 298.15
    plate = tagged(tagged(box((0.1, 0.1, thickness)), 0, facing("-z")), 1, facing("+z"))
    tags = (
        Tag("back", heat_flux=flux),
        Tag("front", convection=Convection(ambient, coefficient=film), radiation=Radiation(emissivity, ambient)),
    )
    part = Part("plate", Material("plate", (conductivity,)))
    result = solved(Case(plate, (part,), tags, accuracy=Accuracy(order, 0.01)), tmp_path)

    def lost(front: float) -> float:
        return film * (front - ambient) + emissivity * Stefan_Boltzmann * (front**4 - ambient**4)

    exact = brentq(lambda front: lost(front) - flux, ambient, 1000.0)
    front, back = result.tag("front"), result.tag("back")
    assert exact == pytest.approx(405.684, abs=1e-3)
    assert front["mean"] == pytest.approx(exact, abs=1e-5)
    assert back["mean"] == pytest.approx(445.684, abs=1e-3)
    assert back["max"] - front["min"] == pytest.approx(flux * thickness / conductivity, abs=1e-5)
    assert front["split"]["convection"] / front["area"] == pytest.approx(-film * (exact - ambient), rel=1e-7)
    assert front["heat"] == pytest.approx(-back["heat"], rel=1e-9)


def test_block_cooled_by_radiation_alone(tmp_path: Path) -> None:
    """20 W released in a 40 mm cube of high conductivity: at one temperature to a tenth of a kelvin."""
    side, heat, emissivity, ambient = 0.04, 20.0, 0.9, 293.15
    block = tagged(box((side, side, side)), 0, every)
    part = Part("block", Material("block", (400.0,)), heat=heat)
    tag = Tag("skin", radiation=Radiation(emissivity, ambient))
    result = solved(Case(block, (part,), (tag,), accuracy=Accuracy(size=0.008)), tmp_path)
    exact = (ambient**4 + heat / (6.0 * side**2 * emissivity * Stefan_Boltzmann)) ** 0.25
    assert exact == pytest.approx(468.576, abs=1e-3)
    assert result.tag("skin")["mean"] == pytest.approx(exact, abs=1e-3)
    assert result.summary["hottest"]["temperature"] == pytest.approx(exact, abs=0.1)
    assert result.summary["coldest"]["temperature"] == pytest.approx(exact, abs=0.1)
    assert result.tag("skin")["split"]["radiation"] == pytest.approx(-heat, rel=1e-9)


def test_total_heat_over_faces_of_different_size(tmp_path: Path) -> None:
    """Eq. 1.12c, and the definition of a total: 12 W over a top of 24 cm2 and a side of 12 cm2 are 3333 W/m2 on both.

    The bottom sheds it through a film to 20 °C.
    """
    length, width, height = 0.06, 0.04, 0.02
    block = tagged(tagged(box((length, width, height)), 0, facing("+z")), 0, facing("-y"))
    block = tagged(block, 1, facing("-z"))
    tags = Tag("heated", heat=12.0), Tag("bottom", convection=Convection(ZERO_CELSIUS + 20.0, coefficient=100.0))
    case = Case(block, (Part("block", Material("block", (1.0,))),), tags, accuracy=Accuracy(size=0.005))
    result = solved(case, tmp_path / "together")
    heated, bottom = result.tag("heated"), result.tag("bottom")
    assert heated["area"] == pytest.approx(length * width + length * height, rel=1e-12)
    assert heated["heat"] / heated["area"] == pytest.approx(10000.0 / 3.0, rel=1e-10)
    assert bottom["heat"] == pytest.approx(-12.0, rel=1e-8)
    assert bottom["mean"] - ZERO_CELSIUS == pytest.approx(20.0 + 12.0 / (100.0 * length * width), rel=1e-9)
    assert (result.summary["balance"]["in"], result.summary["balance"]["out"]) == pytest.approx((12.0, -12.0), rel=1e-8)

    # The same as two tags of that flux: their watts, and not a temperature changes.
    apart = tagged(block, 2, facing("-y"))
    tags = Tag("top", heat_flux=10000.0 / 3.0), tags[1], Tag("side", heat_flux=10000.0 / 3.0)
    parted = solved(Case(apart, case.parts, tags, accuracy=case.accuracy), tmp_path / "apart")
    assert parted.tag("top")["heat"] == pytest.approx(8.0, rel=1e-10)
    assert parted.tag("side")["heat"] == pytest.approx(4.0, rel=1e-10)
    places = np.random.default_rng(1).uniform(0.05, 0.95, (50, 3)) * (length, width, height)
    assert parted.kelvin(places) == pytest.approx(result.kelvin(places), rel=1e-6)
