"""Contacts between parts whose triangulations do not match: exact for linear fields, nothing created or lost.

Patch tests: Irons & Razzaque (1972), applied across a joint as in Ern, Stephansen & Zunino, IMA J. Numer. Anal. 29
(2009) 235. The expected values are those of conduction through a wall, in closed form.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from cases import case_of, metal, run
from fluxface.solver import pipeline
from fluxface.solver.case import Case, Contact, Convection, Tag, write_case
from fluxface.solver.errors import Trouble
from fluxface.solver.fem.mesh import Mesh
from fluxface.solver.materials import Material, Table
from fluxface.solver.physics import steady
from fluxface.solver.physics.contact import Bond
from fluxface.solver.physics.problem import put_together
from shapes import assembly, box, every, facing, moved, rotation, tagged, within

both_orders = pytest.mark.parametrize("order", [1, 2])
SIDE = 0.03
THICK = (0.01, 0.02)
HOT, COLD = 400.0, 300.0
HOT_SIDE, COLD_SIDE = 0, 1


def two_blocks(
    contact: Contact | None, materials: tuple[Material, Material] = (metal(50.0), metal(0.8)), order: int = 2
) -> Case:
    """Two blocks of one section, one above the other, of unlike meshes; held at the far ends."""
    lower = tagged(box((SIDE, SIDE, THICK[0]), (5, 4, 1)), HOT_SIDE, facing("-z"))
    upper = tagged(box((SIDE, SIDE, THICK[1]), (3, 7, 2), at=(0, 0, THICK[0])), COLD_SIDE, facing("+z"))
    return case_of(
        assembly(lower, upper),
        [Tag("hot", temperature=HOT), Tag("cold", temperature=COLD)],
        material=materials,
        order=order,
        size=0.006,
        contacts=() if contact is None else (contact,),
    )


def wall_flux(conductance: float, conductivity: tuple[float, float] = (50.0, 0.8)) -> float:
    """W/m2 through the two blocks in series, Incropera & DeWitt section 3.1."""
    resistance = THICK[0] / conductivity[0] + THICK[1] / conductivity[1] + 1.0 / conductance
    return (HOT - COLD) / resistance


@both_orders
def test_conductance_passes_a_linear_field_exactly(order: int) -> None:
    case = two_blocks(Contact((0, 1), 2000.0), order=order)
    solved = pipeline.solve(case)
    flux = wall_flux(2000.0)
    told = solved.summary["contacts"][0]
    assert told["parts"] == ["part 0", "part 1"]
    assert told["area"] == pytest.approx(SIDE**2, rel=1e-12)
    assert told["heat"] == pytest.approx(flux * SIDE**2, rel=1e-9)
    assert told["drop"] == pytest.approx(flux / 2000.0, rel=1e-9)
    z, field = solved.field.nodes[:, 2], solved.field
    upper = np.isin(np.arange(len(z)), field.cells[field.cell_part == 1])
    expected = np.where(upper, COLD + flux / 0.8 * (sum(THICK) - z), HOT - flux / 50.0 * z)
    assert np.abs(field.temperature - expected).max() < 1e-9 * HOT
    assert solved.summary["balance"]["relative_gap"] < 1e-9


@both_orders
def test_bond_passes_a_linear_field_exactly(order: int) -> None:
    solved = pipeline.solve(two_blocks(Contact((0, 1), None), order=order))
    told = solved.summary["contacts"][0]
    flux = wall_flux(np.inf)
    assert told["heat"] == pytest.approx(flux * SIDE**2, rel=1e-9)
    assert abs(told["drop"]) < 1e-9
    assert solved.summary["balance"]["relative_gap"] < 1e-9
    assert not np.any(np.isclose(solved.field.nodes[solved.field.boundary].mean(axis=1)[:, 2], THICK[0]))


def test_bond_of_very_unlike_conductivities_is_sound() -> None:
    solved = pipeline.solve(two_blocks(Contact((0, 1), None), (metal(400.0), metal(0.04))))
    flux = wall_flux(np.inf, (400.0, 0.04))
    assert solved.summary["contacts"][0]["heat"] == pytest.approx(flux * SIDE**2, rel=1e-8)
    assert solved.field.temperature.max() <= HOT + 1e-6
    assert solved.field.temperature.min() >= COLD - 1e-6


def test_bond_with_a_conductivity_table_settles_and_joins() -> None:
    table = metal(Table((250.0, 450.0), (0.4, 1.2)))
    solved = pipeline.solve(two_blocks(Contact((0, 1), None), (metal(50.0), table)))
    # Kirchhoff's transform: the flux through the upper block is the mean conductivity times the mean slope.
    meeting = HOT - solved.summary["contacts"][0]["heat"] / SIDE**2 * THICK[0] / 50.0
    mean = float(np.mean(Table((250.0, 450.0), (0.4, 1.2))(np.array([meeting, COLD]))))
    assert solved.summary["contacts"][0]["heat"] / SIDE**2 == pytest.approx(
        mean * (meeting - COLD) / THICK[1], rel=1e-5
    )
    # The field in the upper block is no polynomial, so a jump of the size of the mesh error stays.
    assert abs(solved.summary["contacts"][0]["drop"]) < 1e-4 * (HOT - COLD)
    assert solved.summary["balance"]["relative_gap"] < 1e-9


def bonded_pair(materials: tuple[Material, Material]) -> tuple[Mesh, Bond]:
    case = two_blocks(Contact((0, 1), None), materials)
    _, mesh = pipeline.meshed(case, lambda *_: None)
    bond = put_together(case, mesh).contacts[0]
    assert isinstance(bond, Bond)
    return mesh, bond


def test_tangent_of_a_bond_is_the_derivative_of_its_residual() -> None:
    """Central differences in a random direction."""
    mesh, bond = bonded_pair((metal(Table((250.0, 450.0), (30.0, 60.0))), metal(Table((250.0, 450.0), (0.4, 1.2)))))
    generator = np.random.default_rng(5)
    temperature = 350.0 + 20.0 * generator.standard_normal(len(mesh.nodes))
    direction = generator.standard_normal(len(mesh.nodes))
    _, tangent = bond.residual_and_tangent(temperature)
    step = 1e-4
    ahead, behind = (bond.residual_and_tangent(temperature + s * direction)[0] for s in (step, -step))
    difference = (ahead - behind) / (2 * step)
    assert np.linalg.norm(tangent @ direction - difference) < 1e-6 * np.linalg.norm(difference)


def test_a_face_partly_in_contact_keeps_its_terms_on_the_rest() -> None:
    """A small block on a large plate whose top is in air: the air reaches just what the block leaves free."""
    plate = tagged(box((0.06, 0.05, 0.004), (4, 3, 1)), 0, facing("+z"))
    block = tagged(box((0.02, 0.015, 0.01), at=(0.017, 0.013, 0.004)), 1, facing("+z"))
    free = 0.06 * 0.05 - 0.02 * 0.015
    tags = [Tag("top", heat=5.0, convection=Convection(295.0, 12.0)), Tag("lid", convection=Convection(295.0, 40.0))]
    solved = pipeline.solve(case_of(assembly(plate, block), tags, contacts=(Contact((0, 1), 5e3),), size=0.006))
    top = solved.summary["tags"][0]
    assert top["area"] == pytest.approx(free, rel=1e-11)
    assert top["split"]["source"] == pytest.approx(5.0, rel=1e-11)
    assert top["split"]["convection"] == pytest.approx(12.0 * free * (295.0 - top["mean"]), rel=1e-9)
    assert solved.summary["contacts"][0]["area"] == pytest.approx(0.02 * 0.015, rel=1e-11)
    assert solved.summary["balance"]["relative_gap"] < 1e-9


def assembled(scale: float) -> Case:
    """A heated block on a cooled plate with a contact between; lengths times ``scale``, coefficients to match."""
    plate = tagged(box((0.06, 0.05, 0.004), (2, 2, 1)), 0, every)
    block = tagged(box((0.02, 0.015, 0.01), at=(0.017, 0.013, 0.004)), 1, facing("+z"))
    tags = [Tag("plate", convection=Convection(295.0, 12.0 / scale)), Tag("lid", heat=4.0 * scale)]
    surface = moved(assembly(plate, block), scale=scale)
    return case_of(surface, tags, contacts=(Contact((0, 1), 5e3 / scale),), size=0.006 * scale)


@pytest.mark.parametrize(("turn", "scale"), [(37.0, 1.0), (0.0, 10.0), (111.0, 1e-3)])
def test_turning_and_scaling_an_assembly_changes_nothing(turn: float, scale: float) -> None:
    """On one mesh, as TetGen's own choices hang on rounding."""
    plain, other = assembled(1.0), assembled(scale)
    _, mesh = pipeline.meshed(plain, lambda *_: None)
    turned = replace(mesh, nodes=scale * mesh.nodes @ rotation((1, 2, 3), turn).T)
    one, two = (steady.solve(put_together(case, on)) for case, on in ((plain, mesh), (other, turned)))
    assert np.abs(two.temperature - one.temperature).max() < 1e-9 * 295.0


def test_parts_that_touch_unnamed_are_told_of() -> None:
    case = two_blocks(None)
    solved = pipeline.solve(case)
    assert any("'part 0' and 'part 1' touch over 9 cm2" in warning for warning in solved.summary["warnings"])
    surfaces = [body.surface for body in pipeline.check(case)]
    assert pipeline.touching(case, surfaces) == [{"parts": ["part 0", "part 1"], "area": pytest.approx(9e-4)}]


def test_a_part_that_hangs_on_a_contact_alone_is_not_adrift() -> None:
    case = two_blocks(Contact((0, 1), 2000.0))
    alone = replace(case, tags=(Tag("hot", heat=2.0), case.tags[1]))
    assert pipeline.solve(alone).summary["contacts"][0]["heat"] == pytest.approx(2.0, rel=1e-9)
    with pytest.raises(Trouble) as caught:
        pipeline.solve(replace(alone, contacts=()))
    assert caught.value.kind == "adrift" and "'part 0'" in caught.value.message


def test_contact_between_parts_that_do_not_touch_is_said() -> None:
    case = two_blocks(Contact((0, 1), 2000.0))
    apart = replace(case.surface, vertices=case.surface.vertices.copy())
    apart.vertices[np.unique(apart.triangles[apart.part == 1]), 2] += 0.005
    with pytest.raises(Trouble) as caught:
        pipeline.solve(replace(case, surface=apart))
    assert caught.value.kind == "geometry" and "'part 0' and 'part 1'" in caught.value.message


def test_solids_that_run_through_each_other_are_found(tmp_path: Path) -> None:
    plate, bolt = box((0.05, 0.05, 0.004)), box((0.01, 0.01, 0.03), at=(0.02, 0.02, -0.01))
    case = case_of(assembly(tagged(plate, 0, every), tagged(bolt, 0, within((-1, -1, -1), (1, 1, 1)))),
                   [Tag("air", convection=Convection(295.0, 10.0))])  # fmt: skip
    write_case(case, tmp_path)
    ran = run("solve", tmp_path)
    assert ran.code == 3
    assert "run through each other" in ran.trouble["message"]
    points = np.array(ran.trouble["where"]["points"])
    assert len(points) and (points > [0.019, 0.019, -0.001]).all() and (points < [0.031, 0.031, 0.005]).all()


def test_parts_that_overlap_within_the_gap_of_their_contact_are_in_contact() -> None:
    """As modelled with an interference fit: 0.1 mm into each other, a contact with a gap of 0.3 mm."""
    case = two_blocks(Contact((0, 1), 2000.0, gap=3e-4))
    sunk = replace(case.surface, vertices=case.surface.vertices.copy())
    sunk.vertices[np.unique(sunk.triangles[sunk.part == 1]), 2] -= 1e-4
    assert pipeline.solve(replace(case, surface=sunk)).summary["contacts"][0]["area"] == pytest.approx(SIDE**2)
    with pytest.raises(Trouble, match="run through each other"):
        pipeline.solve(replace(case, surface=sunk, contacts=(Contact((0, 1), 2000.0),)))
