"""Bar-Cohen & Rohsenow, Thermally optimum spacing of vertical, natural convection cooled, parallel plates,
J. Heat Transfer 106 (1984) 116-123: isothermal plates, as quoted in Incropera & DeWitt, Table 9.3 (from memory).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from fluxface.solver.case import Accuracy, Case, Convection, Part, Tag
from fluxface.solver.materials import Material
from fluxface.solver.physics import nusselt
from fluxface.solver.physics.film import film_law
from fluxface.solver.physics.patch import Patch
from probe import solved
from scipy.optimize import minimize_scalar
from shapes import box, facing, tagged


def channel(rayleigh: float) -> float:
    """The Nusselt number of a channel in air, from Ra_S S/L."""
    return float(nusselt.fin_channel(np.array(rayleigh), np.array(0.7)))


def best(value, low: float, high: float) -> float:
    """Where ``value`` of one variable is greatest between the bounds."""
    found = minimize_scalar(lambda at: -value(at), bounds=(low, high), method="bounded", options={"xatol": 1e-10})
    return float(found.x)


def optimum() -> float:
    """S (Ra_S / (S^3 L))^(1/4) at which a given volume full of plates sheds most: the greatest Nu / S^2.

    With S in units of (L / (Ra_S / S^3))^(1/4), the channel's Ra_S S/L is S^4.
    """
    return best(lambda spacing: channel(spacing**4) / spacing**2, 1.0, 6.0)


def test_limits_of_the_channel() -> None:
    """Narrow: fully developed flow, Nu = Ra S/L / 24. Wide: each plate by itself, Nu = 0.59 (Ra S/L)^(1/4)."""
    assert channel(0.01) == pytest.approx(0.01 / 24, rel=1e-3)
    assert channel(1e5) == pytest.approx(0.59 * 1e5**0.25, rel=2e-3)


def test_optimum_spacing() -> None:
    """2.71 in print, 2.71599 for the composite relation; Nu = 1.31 in print, 1.30901."""
    assert optimum() == pytest.approx(2.71, rel=0.005)
    assert optimum() == pytest.approx(2.7159917, abs=1e-4)
    assert channel(optimum() ** 4) == pytest.approx(1.31, rel=0.005)
    assert channel(optimum() ** 4) == pytest.approx(1.3090066, abs=1e-4)


def test_plates_of_a_textbook() -> None:
    """Çengel, Heat Transfer, example 9-3: plates 0.18 m high at 80 °C in air at 30 °C, 7.45 mm (from memory).

    With the air of that book's Table A-15 at 55 °C and 101.325 kPa: 1.847e-5 m2/s, Pr = 0.7215 (from memory).
    """
    viscosity, prandtl = 1.847e-5, 0.7215
    per_cube = 9.81 / (273.15 + 55) * 50 / viscosity**2 * prandtl
    assert optimum() * (0.18 / per_cube) ** 0.25 == pytest.approx(7.45e-3, rel=0.005)


WALL = np.array(
    [[[0.0, 0.0, 0.0], [0.1, 0.0, 0.1], [0.0, 0.0, 0.1]], [[0.0, 0.0, 0.0], [0.1, 0.0, 0.0], [0.1, 0.0, 0.1]]]
)


def coefficient(gap: float) -> float:
    """W/(m2 K) of plates 0.10 m high, measured on the faces, at 350 K in air at 300 K."""
    patch = Patch(WALL, np.tile([0.0, -1.0, 0.0], (2, 1)), np.full(2, 0.005), np.array([0.0, 0.0, -1.0]))
    law = film_law(Convection(ambient=300.0, correlation="fin_channel", gap=gap), patch)
    return float(law.coefficient(np.array([350.0]), np.array([0]))[0])


def test_own_plates() -> None:
    """The same evaluated with air of Incropera & DeWitt, Table A.4: 6.45727 mm and 5.70652 W/(m2 K)."""
    spacing = best(lambda gap: coefficient(gap) / gap, 2e-3, 20e-3)
    assert spacing == pytest.approx(6.45727e-3, rel=0.005)
    assert coefficient(spacing) == pytest.approx(5.70652, rel=0.005)


def test_own_plates_in_a_result(tmp_path: Path) -> None:
    """The coefficient at the optimum from case folder to result folder; the plate's metal is invented."""
    plate = tagged(tagged(box((0.005, 0.05, 0.1)), 0, facing("-x")), 1, facing("+x"))
    air = Convection(ambient=300.0, correlation="fin_channel", gap=6.45727e-3)
    part = Part("plate", Material("invented conductor", (1e5,)))
    tags = (Tag("held", temperature=350.0), Tag("fins", convection=air))
    result = solved(Case(plate, (part,), tags, accuracy=Accuracy(order=1)), tmp_path)
    assert result.tag("fins")["film"] == pytest.approx(5.70652, rel=0.005)
