"""Newton's method on the nonlinear terms: its tangent is exact, and it settles from far off in a few steps.

Dennis & Schnabel, Numerical Methods for Unconstrained Optimization and Nonlinear Equations (1983), chapter 5 (from
memory): with the exact tangent the steps near the solution square the error.
"""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from cases import case_of, mesh_of, metal
from fluxface.solver import pipeline
from fluxface.solver.case import Case, Convection, Radiation, Tag
from fluxface.solver.materials import Material, Table
from fluxface.solver.physics import steady
from fluxface.solver.physics.laws import STEFAN_BOLTZMANN
from fluxface.solver.physics.problem import Problem, put_together
from scipy.optimize import brentq
from shapes import box, every, facing, irregular_solid, tagged

DRIFTING = Table((200.0, 500.0, 900.0), (60.0, 20.0, 45.0))
AXES = ((0.6, 0.8, 0.0), (-0.8, 0.6, 0.0), (0.0, 0.0, 1.0))
TERMS = {
    "radiation": (metal(), Tag("skin", radiation=Radiation(0.8, 300.0))),
    "tabled conductivity": (metal(DRIFTING), Tag("skin", convection=Convection(300.0, 20.0))),
    "tabled along askew axes": (
        Material("invented fibre", (DRIFTING, 5.0, Table((250.0, 850.0), (3.0, 9.0))), axes=AXES),
        Tag("skin", convection=Convection(300.0, 20.0)),
    ),
    "correlation": (metal(), Tag("skin", convection=Convection(300.0, correlation="natural"))),
    "all at once": (
        metal(DRIFTING),
        Tag("skin", radiation=Radiation(0.8, 280.0), convection=Convection(300.0, correlation="natural"), heat=2.0),
    ),
}


def problem_of(case: Case, size: float) -> Problem:
    return put_together(case, mesh_of(case.surface, case.accuracy.order, size))


@pytest.mark.parametrize("order", [1, 2])
@pytest.mark.parametrize("term", TERMS)
def test_tangent_against_finite_differences(term: str, order: int) -> None:
    """Term by term along random directions, at temperatures between the tables' knots, where the laws are smooth."""
    material, skin = TERMS[term]
    case = case_of(tagged(irregular_solid(), 0, every), [skin], material=material, heat=5.0, order=order)
    problem = problem_of(case, 0.03)
    nonlinear = steady.assembled(problem, 350.0).nonlinear
    assert nonlinear
    random = np.random.default_rng(7)
    nodes = len(problem.mesh.nodes)
    temperature = random.uniform(370.0, 470.0, nodes)
    step = 1e-2
    for one, _ in product(nonlinear, range(3)):
        direction = random.uniform(-1.0, 1.0, nodes)
        _, tangent = one.residual_and_tangent(temperature)
        ahead, behind = (one.residual_and_tangent(temperature + way * step * direction)[0] for way in (1.0, -1.0))
        slope = (ahead - behind) / (2.0 * step)
        np.testing.assert_allclose(tangent @ direction, slope, rtol=0, atol=1e-6 * np.abs(slope).max())


@pytest.mark.parametrize("order", [1, 2])
def test_tangent_of_the_whole_is_the_sum_of_its_terms(order: int) -> None:
    material, skin = TERMS["all at once"]
    case = case_of(tagged(irregular_solid(), 0, every), [skin], material=material, heat=5.0, order=order)
    system = steady.assembled(problem_of(case, 0.03), 350.0)
    rise = np.random.default_rng(8).uniform(20.0, 120.0, system.matrix.shape[0])
    residuals, tangent = system.residual_and_tangent(rise)
    terms = [term.residual_and_tangent(350.0 + rise) for term in system.nonlinear]
    np.testing.assert_allclose(np.sum(residuals[1:], axis=0), np.sum([residual for residual, _ in terms], axis=0))
    whole = system.matrix + sum(tangent for _, tangent in terms)
    assert abs(tangent - whole).max() <= 1e-14 * abs(whole).max()


def lamp(skin: Tag, material: Material, heat: float) -> Case:
    """A heated pad on a block, the rest of whose skin sheds."""
    solid = tagged(tagged(box((0.06, 0.04, 0.02)), 1, every), 0, facing("+z"))
    return case_of(solid, [Tag("pad", heat=heat), skin], material=material, size=0.012)


RADIATION, FILM = Radiation(0.9, 293.0), Convection(293.0, 15.0)
STILL_AIR = Convection(293.0, correlation="natural")
FAR_OFF = {
    "radiation alone": lamp(Tag("skin", radiation=RADIATION), metal(), 12.0),
    "radiation alone, into the cold": lamp(Tag("skin", radiation=Radiation(0.9, 3.0)), metal(), 12.0),
    "radiation and drifting conductivity": lamp(Tag("skin", radiation=RADIATION), metal(DRIFTING), 40.0),
    "radiation off a poor conductor": lamp(Tag("skin", radiation=RADIATION), metal(0.2), 5.0),
    "drifting conductivity": lamp(Tag("skin", convection=FILM), metal(DRIFTING), 40.0),
    "still air": lamp(Tag("skin", convection=STILL_AIR), metal(), 6.0),
    "still air and radiation": lamp(Tag("skin", convection=STILL_AIR, radiation=RADIATION), metal(DRIFTING), 12.0),
}


@pytest.mark.parametrize("start", [3.0, 50.0, 5000.0])
@pytest.mark.parametrize("name", FAR_OFF)
def test_settles_from_far_off_in_few_steps(name: str, start: float) -> None:
    """Newton's step on T^4 alone takes a quarter off a temperature far too high; then it squares the error.

    Allowed are the steps from 5000 K down by quarters, and five. From the solver's own start a handful is enough.
    """
    problem = problem_of(FAR_OFF[name], 0.012)
    near, far = steady.solve(problem), steady.solve(problem, start=start)
    quarters = np.log(5000.0 / near.temperature.mean()) / np.log(4.0 / 3.0)
    assert near.steps <= 5
    assert far.steps <= quarters + 5
    np.testing.assert_allclose(far.temperature, near.temperature, rtol=1e-8)


def test_linear_problems_take_one_step() -> None:
    """Or two, where a first solution is refined."""
    problem = problem_of(lamp(Tag("skin", convection=Convection(293.0, 15.0)), metal(), 12.0), 0.012)
    assert steady.solve(problem).steps <= 2


def test_radiation_alone_sheds_all_the_heat() -> None:
    """A good conductor is at one temperature, T^4 = ambient^4 + P / (emissivity sigma A): the law itself."""
    case = lamp(Tag("skin", radiation=Radiation(0.9, 293.0)), metal(1e7), 12.0)
    summary = pipeline.solve(case).summary
    pad, skin = summary["tags"][:2]
    exact = (293.0**4 + 12.0 / (0.9 * STEFAN_BOLTZMANN * skin["area"])) ** 0.25
    assert skin["mean"] == pytest.approx(exact, rel=1e-6)
    assert skin["split"]["radiation"] == pytest.approx(-12.0, rel=1e-9)
    assert pad["heat"] == pytest.approx(12.0, rel=1e-12)
    assert summary["balance"]["relative_gap"] < 1e-9


def test_radiation_and_air_share_the_heat() -> None:
    """A good conductor again: h (T - air) + emissivity sigma (T^4 - room^4) = P / A, solved for itself here."""
    area = 2 * (0.06 * 0.04 + 0.06 * 0.02 + 0.04 * 0.02) - 0.06 * 0.04
    skin = Tag("skin", radiation=Radiation(0.7, 285.0), convection=Convection(300.0, 8.0))
    summary = pipeline.solve(lamp(skin, metal(1e7), 12.0)).summary

    def surplus(temperature: float) -> float:
        radiated = 0.7 * STEFAN_BOLTZMANN * (temperature**4 - 285.0**4)
        return 12.0 / area - 8.0 * (temperature - 300.0) - radiated

    exact = brentq(surplus, 300.0, 800.0, xtol=1e-9)
    row = summary["tags"][1]
    assert row["mean"] == pytest.approx(exact, rel=1e-6)
    assert row["split"]["convection"] == pytest.approx(-8.0 * area * (exact - 300.0), rel=1e-5)


def test_nothing_to_do_is_ambient_everywhere() -> None:
    """No heat at all: the part is as warm as the room it radiates to."""
    case = lamp(Tag("skin", radiation=Radiation(0.9, 293.0)), metal(DRIFTING), 0.0)
    solved = pipeline.solve(case)
    np.testing.assert_allclose(solved.field.temperature, 293.0, rtol=1e-9)
    assert solved.summary["balance"]["in"] == pytest.approx(0.0, abs=1e-9)
