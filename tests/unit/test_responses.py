"""A linear case is the sum of its responses: any set of loads is had without solving for it."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from cases import case_of, metal
from fluxface.solver import pipeline
from fluxface.solver.answers.responses import loads_of
from fluxface.solver.case import Case, Contact, Convection, Radiation, Tag
from fluxface.solver.errors import Trouble
from fluxface.solver.keeping import Kept
from fluxface.solver.materials import Table
from fluxface.solver.result import Responses
from shapes import assembly, box, facing, moved, tagged

AIR = Convection(ambient=298.0, coefficient=9.0)


def block(order: int = 2, size: float = 0.008) -> Case:
    """An invented block: heat under it, a flux from one side, air on top and on what is untagged, a held end."""
    surface = box((0.08, 0.05, 0.02))
    for number, side in enumerate(("-z", "+x", "+z", "-x")):
        surface = tagged(surface, number, facing(side))
    tags = [
        Tag("pad", heat=3.0),
        Tag("sun", heat_flux=400.0, convection=replace(AIR, ambient=305.0)),
        Tag("top", convection=AIR),
        Tag("end", temperature=320.0),
    ]
    return case_of(surface, tags, heat=0.5, untagged=Tag("untagged", convection=AIR), order=order, size=size)


def pair() -> Case:
    """Two invented blocks, one upon the other through a filler, the lower one in air."""
    lower = tagged(box((0.06, 0.06, 0.01)), 0, facing("-z"))
    upper = tagged(moved(box((0.03, 0.03, 0.01)), shift=(0.015, 0.015, 0.01)), 1, facing("+z"))
    return case_of(
        assembly(lower, upper),
        [Tag("foot", convection=AIR), Tag("chip", heat=2.0)],
        material=[metal(200.0), metal(20.0)],
        contacts=(Contact((0, 1), 3000.0),),
        size=0.006,
    )


def changed(case: Case, factor: float) -> Case:
    """Every load of the case another one."""

    def other(tag: Tag) -> Tag:
        air = tag.convection and replace(tag.convection, ambient=tag.convection.ambient * (1 + 0.1 * factor))
        held = tag.temperature and tag.temperature * (1 + 0.05 * factor)
        return replace(
            tag, heat=-factor * tag.heat, heat_flux=3 * factor * tag.heat_flux, convection=air, temperature=held
        )

    parts = tuple(replace(part, heat=part.heat * 2 * factor) for part in case.parts)
    return replace(case, tags=tuple(map(other, case.tags)), untagged=other(case.untagged), parts=parts)


def summed(responses: Responses, key: str, values: np.ndarray) -> np.ndarray:
    return values @ getattr(responses, key)


@pytest.mark.parametrize("make", [block, lambda: block(order=1, size=0.02), pair], ids=["block", "coarse", "pair"])
def test_other_loads_are_had_without_solving(make: Callable[[], Case]) -> None:
    kept, case = Kept(), make()
    pipeline.solve(case, kept=kept)
    responses = pipeline.respond(case, kept)
    assert {"mesh", "matrix", "solver"} <= set(kept.reused)
    for some in (case, changed(case, 1.0), changed(case, 0.3)):
        values = np.array([load.value for load in loads_of(some)])
        solved = pipeline.solve(some)
        temperature = summed(responses, "temperature", values)
        assert temperature == pytest.approx(solved.field.temperature, rel=1e-8)
        rows, parts = solved.summary["tags"], solved.summary["parts"]
        assert summed(responses, "tag_mean", values) == pytest.approx([row["mean"] for row in rows], rel=1e-8)
        assert summed(responses, "tag_heat", values) == pytest.approx([row["heat"] for row in rows], rel=1e-6, abs=1e-8)
        assert summed(responses, "part_mean", values) == pytest.approx([row["mean"] for row in parts], rel=1e-8)
        assert summed(responses, "part_heat", values) == pytest.approx([row["heat"] for row in parts], rel=1e-8)


def test_loads_are_named_by_what_carries_them() -> None:
    case = block()
    responses = pipeline.respond(case, Kept())
    told = [(load["owner"], load["name"], load["key"]) for load in json.loads(responses.loads.tobytes())]
    assert told == [
        ("tag", "pad", "heat"),
        ("tag", "sun", "heat_flux"),
        ("tag", "sun", "ambient"),
        ("tag", "top", "ambient"),
        ("tag", "end", "temperature"),
        ("untagged", "untagged", "ambient"),
        ("part", "part 0", "heat"),
    ]
    assert responses.values.tolist() == [3.0, 400.0, 305.0, 298.0, 320.0, 298.0, 0.5]


@pytest.mark.parametrize("why", ["radiates", "film of 'top'", "conductivity of 'part 0'"])
def test_what_is_not_linear_is_told(why: str) -> None:
    case = block()
    pad, sun, top, end = case.tags
    if why == "radiates":
        top = replace(top, radiation=Radiation(0.9, 298.0))
    elif "film" in why:
        top = replace(top, convection=Convection(298.0, correlation="natural"))
    else:
        table = metal(Table((300.0, 400.0), (10.0, 20.0)))
        case = replace(case, parts=(replace(case.parts[0], material=table),))
    with pytest.raises(Trouble, match=why):
        pipeline.respond(replace(case, tags=(pad, sun, top, end)), Kept())
