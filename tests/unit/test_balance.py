"""Heat is neither made nor lost: the balance closes on any mesh, with any mix of terms, however the part is turned.

Hughes, The Finite Element Method (1987), section 2.10 (from memory): with the reactions of held faces taken from the
residual of the unconstrained system, the balance is exact whatever the mesh.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from cases import case_of, mesh_of, metal
from fluxface.solver import pipeline
from fluxface.solver.answers import report
from fluxface.solver.case import Case, Convection, Radiation, Surface, Tag
from fluxface.solver.fem.mesh import Mesh
from fluxface.solver.materials import Material
from fluxface.solver.physics import steady
from fluxface.solver.physics.problem import put_together
from shapes import assembly, blocks, box, every, facing, irregular_solid, moved, rotation, tagged

both_orders = pytest.mark.parametrize("order", [1, 2])

EVERYTHING = [
    Tag("warm", heat=3.0, heat_flux=150.0, convection=Convection(300.0, 9.0)),
    Tag("cold", temperature=285.0),
    Tag("breezy", convection=Convection(310.0, 25.0), heat=-0.7),
    Tag("hot", temperature=340.0),
    Tag("glowing", radiation=Radiation(0.9, 290.0), convection=Convection(295.0, 4.0)),
]


def tag_of(summary: dict[str, Any], name: str) -> dict[str, Any]:
    return next(tag for tag in summary["tags"] if tag["name"] == name)


def many_tags(surface: Surface) -> Surface:
    """Five tags and the untagged, one face after the other."""
    tag = (surface.face % 6 - 1).astype(np.int32)
    return replace(surface, tag=tag)


def finned() -> Surface:
    filled = np.ones((5, 1, 2), bool)
    filled[1::2, :, 1] = False
    return blocks(np.linspace(0, 0.05, 6), np.array([0, 0.03]), np.array([0, 0.008, 0.03]), filled)


SHAPES = {"irregular": irregular_solid(), "finned": finned(), "box": box((0.02, 0.05, 0.01), (2, 3, 1))}


@both_orders
@pytest.mark.parametrize("size", [0.02, 0.006], ids=["coarse", "fine"])
@pytest.mark.parametrize("shape", SHAPES)
def test_balance_closes_on_any_mesh(shape: str, size: float, order: int) -> None:
    case = case_of(many_tags(SHAPES[shape]), EVERYTHING, heat=2.0, order=order, size=size)
    summary = pipeline.solve(case).summary
    assert summary["balance"]["relative_gap"] < 1e-9
    # And so does the sum over the rows that a reader would add up.
    rows = [tag["heat"] for tag in summary["tags"]] + [part["heat"] for part in summary["parts"]]
    assert abs(sum(rows)) < 1e-9 * summary["balance"]["in"]
    assert [part["heat"] for part in summary["parts"]] == pytest.approx([2.0])


def test_balance_closes_with_the_iterative_solver() -> None:
    """Large enough for multigrid, which leaves more of a residual than a factorisation."""
    case = case_of(many_tags(finned()), [*EVERYTHING[:4], Tag("last")], heat=2.0, size=0.003)
    summary = pipeline.solve(case).summary
    assert "multigrid" in summary["solver"]["method"]
    assert summary["balance"]["relative_gap"] < 1e-9


def test_terms_of_a_tag_add_up_and_are_told_apart() -> None:
    case = case_of(many_tags(box((0.05, 0.04, 0.03))), EVERYTHING, size=0.01)
    summary = pipeline.solve(case).summary
    warm, glowing = tag_of(summary, "warm"), tag_of(summary, "glowing")
    assert warm["split"]["source"] == pytest.approx(3.0 + 150.0 * warm["area"], rel=1e-12)
    assert warm["split"]["convection"] == pytest.approx(9.0 * (300.0 - warm["mean"]) * warm["area"], rel=1e-9)
    assert warm["film"] == 9.0
    assert warm["split"]["held"] == warm["split"]["radiation"] == 0.0
    assert glowing["split"]["radiation"] < 0 and glowing["split"]["source"] == 0.0
    assert tag_of(summary, "hot")["split"]["held"] == tag_of(summary, "hot")["heat"] > 0
    assert tag_of(summary, "breezy")["split"]["source"] == pytest.approx(-0.7, rel=1e-12)
    for tag in summary["tags"]:
        assert tag["heat"] == pytest.approx(sum(tag["split"].values()), rel=1e-12, abs=1e-15)


# Held temperatures ----------------------------------------------------------------------------------------------------


@both_orders
@pytest.mark.parametrize("size", [0.03, 0.008], ids=["coarse", "fine"])
def test_heat_through_held_ends_is_exact_on_any_mesh(size: float, order: int) -> None:
    """A bar between two held ends carries k A dT / L, and its reactions say so to rounding."""
    length, width, height = 0.06, 0.02, 0.03
    bar = tagged(tagged(box((length, width, height)), 0, facing("-x")), 1, facing("+x"))
    case = case_of(bar, [Tag("hot", temperature=350.0), Tag("cold", temperature=290.0)], order=order, size=size)
    summary = pipeline.solve(case).summary
    carried = 50.0 * width * height * 60.0 / length
    assert tag_of(summary, "hot")["heat"] == pytest.approx(carried, rel=1e-9)
    assert tag_of(summary, "cold")["heat"] == pytest.approx(-carried, rel=1e-9)
    assert summary["warnings"] == []


def meeting(first: float, second: float) -> Case:
    """Two held faces of a box that meet at an edge, the opposite faces in air alike: symmetric about the diagonal."""
    solid = tagged(tagged(box((0.04, 0.04, 0.01)), 0, facing("-x")), 1, facing("-y"))
    for direction in ("+x", "+y"):
        solid = tagged(solid, 2, facing(direction))
    tags = [
        Tag("one", temperature=first),
        Tag("other", temperature=second),
        Tag("air", convection=Convection(300.0, 200.0)),
    ]
    return case_of(solid, tags, size=0.004)


def test_held_tags_that_meet_share_their_edge() -> None:
    """The mean holds on the edge, each tag takes half of its reaction, and a warning names the two."""
    solved = pipeline.solve(meeting(320.0, 280.0))
    edge = (np.abs(solved.field.nodes[:, :2]) < 1e-9).all(axis=1)
    assert edge.any()
    np.testing.assert_array_equal(solved.field.temperature[edge], 300.0)
    (warning,) = [warning for warning in solved.summary["warnings"] if "'one'" in warning]
    assert "'other'" in warning and "mean" in warning
    # Mirrored about the diagonal the problem changes its sign: what the one gives, the other takes, but for the mesh.
    one, other, air = (tag["heat"] for tag in solved.summary["tags"][:3])
    assert one > 0 > other
    assert abs(air) < 0.01 * one
    assert solved.summary["balance"]["relative_gap"] < 1e-9


def test_held_tags_of_one_temperature_share_their_edge_without_a_warning() -> None:
    solved = pipeline.solve(meeting(320.0, 320.0))
    assert solved.summary["warnings"] == []
    one, other, air = (tag["heat"] for tag in solved.summary["tags"][:3])
    assert one == pytest.approx(other, rel=0.01)
    assert one + other == pytest.approx(-air, rel=1e-9)


def test_reactions_of_an_edge_are_halved() -> None:
    """A cube held all round at one temperature and heated inside: by symmetry each face passes a sixth of the heat."""
    cube = box((0.03, 0.03, 0.03))
    for number, direction in enumerate(("-x", "+x", "-y", "+y", "-z", "+z")):
        cube = tagged(cube, number, facing(direction))
    tags = [Tag(f"side {number}", temperature=300.0) for number in range(6)]
    summary = pipeline.solve(case_of(cube, tags, heat=6.0, size=0.003)).summary
    assert [tag["heat"] for tag in summary["tags"]] == pytest.approx([-1.0] * 6, rel=0.02)
    assert summary["balance"]["in"] == pytest.approx(6.0, rel=1e-12)
    assert summary["balance"]["relative_gap"] < 1e-9


# Turned, moved, scaled ------------------------------------------------------------------------------------------------


def heats(summary: dict[str, Any]) -> list[float]:
    return [tag["heat"] for tag in summary["tags"]]


def solved_on(case: Case, mesh: Mesh) -> tuple[dict[str, Any], np.ndarray]:
    problem = put_together(case, mesh)
    solution = steady.solve(problem)
    return report.summary(problem, solution), solution.temperature


@both_orders
def test_turning_and_moving_the_whole_changes_nothing(order: int) -> None:
    """Mesh, gravity and the material's axes turned together; the mesher may choose others, so the mesh is kept."""
    turn, shift = rotation((1.0, 0.3, -2.0), 71.0), (12.0, -7.0, 3.0)
    tags = [*EVERYTHING[:3], Tag("still air", convection=Convection(300.0, correlation="natural")), EVERYTHING[4]]
    laminate = Material("invented laminate", (20.0, 8.0, 1.0))
    turned_laminate = replace(laminate, axes=tuple(map(tuple, turn.T)))
    solid = many_tags(irregular_solid())
    case = case_of(solid, tags, material=laminate, heat=2.0, order=order)
    turned_case = replace(
        case_of(moved(solid, shift, turn), tags, material=turned_laminate, heat=2.0, order=order),
        gravity=tuple(-turn[:, 2]),
    )
    mesh = mesh_of(solid, order, 0.015)
    here, temperature = solved_on(case, mesh)
    there, turned_temperature = solved_on(turned_case, replace(mesh, nodes=mesh.nodes @ turn.T + shift))
    np.testing.assert_allclose(turned_temperature, temperature, rtol=1e-9)
    np.testing.assert_allclose(heats(there), heats(here), rtol=0, atol=1e-9 * here["balance"]["in"])
    films = [[tag["film"] for tag in summary["tags"] if tag["film"]] for summary in (here, there)]
    np.testing.assert_allclose(films[1], films[0], rtol=1e-9)


@pytest.mark.parametrize("factor", [1e-3, 1e3])
def test_scaling_lengths_with_matching_coefficients_changes_no_temperature(factor: float) -> None:
    """T depends on h L / k and q L / k alone: with h and q divided by the factor, heats grow by it."""
    solid = many_tags(box((0.05, 0.04, 0.03)))
    tags = [
        Tag("warm", heat=3.0, convection=Convection(300.0, 9.0)),
        Tag("cold", temperature=285.0),
        Tag("breezy", convection=Convection(310.0, 25.0), heat_flux=-40.0),
    ]
    scaled = [
        Tag("warm", heat=3.0 * factor, convection=Convection(300.0, 9.0 / factor)),
        Tag("cold", temperature=285.0),
        Tag("breezy", convection=Convection(310.0, 25.0 / factor), heat_flux=-40.0 / factor),
    ]
    kept = replace(solid, tag=np.where(solid.tag > 2, -1, solid.tag).astype(np.int32))
    small = pipeline.solve(case_of(kept, tags, size=0.02)).summary
    large = pipeline.solve(case_of(moved(kept, scale=factor), scaled, size=0.02 * factor)).summary
    np.testing.assert_allclose(np.divide(heats(large), factor), heats(small), rtol=1e-9, atol=1e-12)
    for end in ("hottest", "coldest"):
        assert large[end]["temperature"] == pytest.approx(small[end]["temperature"], rel=1e-9)


def test_two_parts_apart_are_solved_each_for_itself() -> None:
    one = tagged(tagged(box((0.02, 0.02, 0.02)), 0, facing("+z")), 1, facing("-z"))
    other = tagged(moved(irregular_solid(), shift=(1.0, 0, 0)), 2, every)
    tags = [
        Tag("pad", heat=1.5),
        Tag("air", convection=Convection(300.0, 50.0)),
        Tag("room", convection=Convection(280.0, 5.0)),
    ]
    case = case_of(assembly(one, other), tags, material=[metal(10.0), metal(200.0)], heat=[0.0, 4.0], size=0.01)
    summary = pipeline.solve(case).summary
    assert tag_of(summary, "air")["heat"] == pytest.approx(-1.5, rel=1e-9)
    assert tag_of(summary, "room")["heat"] == pytest.approx(-4.0, rel=1e-9)
    assert summary["balance"]["relative_gap"] < 1e-9
