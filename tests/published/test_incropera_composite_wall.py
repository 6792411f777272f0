"""Incropera, DeWitt, Bergman & Lavine, Fundamentals of Heat and Mass Transfer, 6th ed. 2007, sec. 3.1.4: contacts.

A composite wall with contact resistances (of the size of Table 3.1, from memory) between its layers and convection on
both sides. Its temperatures are straight lines, which both orders of element hold exactly.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from fluxface.solver.case import Accuracy, Case, Contact, Convection, Part, Tag
from fluxface.solver.materials import Material
from probe import ZERO_CELSIUS, solved
from shapes import assembly, box, facing, tagged, within

SIDE = 0.030
THICKNESS, CONDUCTIVITY = (0.010, 0.020, 0.015), (50.0, 0.8, 180.0)
CONDUCTANCES = (3000.0, 8000.0)
LEFT, RIGHT = Convection(ZERO_CELSIUS + 80.0, coefficient=50.0), Convection(ZERO_CELSIUS + 25.0, coefficient=12.0)


@pytest.mark.parametrize("order", [1, 2])
def test_composite_wall(tmp_path: Path, order: int) -> None:
    starts = np.concatenate([[0.0], np.cumsum(THICKNESS)])
    # Divided unlike each other, so that no triangle of one layer meets its like on the next.
    divisions = (1, 1, 1), (2, 3, 5), (1, 2, 1)
    layers = [
        box((thickness, SIDE, SIDE), division, at=(start, 0.0, 0.0))
        for thickness, division, start in zip(THICKNESS, divisions, starts[:-1], strict=True)
    ]
    wall = assembly(*layers)
    wall = tagged(tagged(wall, 0, facing("-x")), 1, facing("+x"))
    wall = tagged(wall, -1, within((1e-6, -1.0, -1.0), (starts[-1] - 1e-6, 1.0, 1.0)))
    parts = tuple(Part(f"layer {i}", Material(f"layer {i}", (k,))) for i, k in enumerate(CONDUCTIVITY))
    contacts = tuple(Contact((i, i + 1), conductance) for i, conductance in enumerate(CONDUCTANCES))
    tags = Tag("left", convection=LEFT), Tag("right", convection=RIGHT)
    result = solved(Case(wall, parts, tags, contacts=contacts, accuracy=Accuracy(order, 0.004)), tmp_path)

    bulk = [t / k for t, k in zip(THICKNESS, CONDUCTIVITY, strict=True)]
    steps = 1.0 / 50.0, bulk[0], 1.0 / CONDUCTANCES[0], bulk[1], 1.0 / CONDUCTANCES[1], bulk[2], 1.0 / 12.0
    flux = 55.0 / sum(steps)
    exact = 80.0 - flux * np.cumsum(steps)[:-1]
    assert flux == pytest.approx(426.109, rel=1e-6)
    assert exact == pytest.approx([71.4778, 71.3926, 71.2506, 60.5978, 60.5446, 60.5091], abs=1e-4)

    assert result.tag("left")["heat"] / SIDE**2 == pytest.approx(flux, rel=1e-8)
    assert result.tag("right")["heat"] / SIDE**2 == pytest.approx(-flux, rel=1e-8)
    middle = SIDE / 2
    ends = [(i, x) for i in range(3) for x in (starts[i], starts[i + 1])]
    found = [result.celsius([(x, middle, middle)], part=part)[0] for part, x in ends]
    assert found == pytest.approx(exact, abs=1e-6)
    for contact, conductance in zip(result.summary["contacts"], CONDUCTANCES, strict=True):
        assert contact["area"] == pytest.approx(SIDE**2, rel=1e-9)
        assert abs(contact["heat"]) == pytest.approx(flux * SIDE**2, rel=1e-8)
        assert abs(contact["drop"]) == pytest.approx(flux / conductance, rel=1e-8)
    assert {tag["name"] for tag in result.summary["tags"]} == {"left", "right", "untagged"}
