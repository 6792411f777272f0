"""The material library: complete, sourced, in order; and tables over temperature."""

from __future__ import annotations

import json
from importlib.resources import files

import numpy as np
import pytest
from fluxface.solver.entries import Entry
from fluxface.solver.errors import Trouble
from fluxface.solver.materials import Material, Table, library, material_as_json, read_material

GROUPS = {
    "building materials",
    "carbon",
    "ceramics",
    "circuit boards",
    "foams and insulation",
    "gap fillers",
    "glass",
    "metals",
    "plastics",
    "printed plastics",
    "semiconductors",
    "woods",
}
OVER_TEMPERATURE = ", over temperature"


def at_300(value) -> float:
    return float(value(np.array(300.0))) if isinstance(value, Table) else value


def test_there_are_at_least_sixty_materials_in_every_group_wanted():
    assert len(library()) >= 60
    assert {row.group for row in library().values()} == GROUPS


@pytest.mark.parametrize("name", library())
def test_each_row_is_complete_and_plausible(name):
    row = library()[name]
    material = row.material
    assert row.source.strip() and row.emissivity
    assert len(material.conductivity) in (1, 3)
    # Thermal diffusivity of solids: from foam-like 5e-8 up to layered graphite, 1.3e-3 m2/s along its layers.
    for conductivity in material.conductivity:
        diffusivity = at_300(conductivity) / (material.density * at_300(material.heat_capacity))
        assert 5e-8 < diffusivity < 1.3e-3
    # Heat capacity by volume of dense solids hardly leaves 1 to 4 MJ/(m3 K); foams and woods hold less.
    by_volume = material.density * at_300(material.heat_capacity)
    assert 1.5e4 < by_volume < 4.5e6


def test_rows_stand_one_a_line_by_group_and_name():
    lines = (files("fluxface.solver.materials") / "library.json").read_text("utf-8").splitlines()
    rows = [json.loads(line.strip().rstrip(",")) for line in lines[1:-1]]
    assert [row["name"] for row in rows] == list(library())
    order = [(row["group"], row["name"].casefold()) for row in rows]
    assert order == sorted(order)


def test_the_everyday_alloys_are_constant_and_tables_say_so_in_their_name():
    for name, row in library().items():
        tabulated = any(isinstance(value, Table) for value in row.material.conductivity)
        assert tabulated == name.endswith(OVER_TEMPERATURE)


@pytest.mark.parametrize("name", [name for name in library() if name.endswith(OVER_TEMPERATURE)])
def test_a_table_passes_through_the_constant_row_at_300_k(name):
    table, constant = library()[name].material, library()[name.removesuffix(OVER_TEMPERATURE)].material
    assert at_300(table.conductivity[0]) == at_300(constant.conductivity[0])
    assert at_300(table.heat_capacity) == at_300(constant.heat_capacity)
    assert table.density == constant.density


def test_layered_and_grown_materials_conduct_less_across():
    for name, row in library().items():
        if len(row.material.conductivity) == 3:
            along, middle, across = row.material.conductivity
            if row.group == "woods":
                assert along == pytest.approx(1.8 * across) and middle == across, name
            elif "infill" not in name:
                assert along == middle > across, name


def test_a_board_follows_from_its_layers():
    """Law of mixtures: copper foil (390 W/(m K), 8933 kg/m3) and bare FR4, 1.6 mm, two layers of 35 um half covered."""
    bare = library()["FR4, bare"].material
    board = library()["FR4, 2 layers of 35 µm copper, half covered"].material
    share = 2 * 35e-6 * 0.5 / 1.6e-3
    assert board.conductivity[0] == pytest.approx(share * 390 + (1 - share) * bare.conductivity[0], rel=0.005)
    assert board.density == pytest.approx(share * 8933 + (1 - share) * bare.density, rel=0.005)


def test_a_name_alone_reads_the_library_row():
    material = read_material(Entry({"name": "aluminium 6061-T6"}, "parts[0].material"))
    assert material == Material("aluminium 6061-T6", (167.0,), density=2700.0, heat_capacity=896.0)


@pytest.mark.parametrize("name", library())
def test_every_material_survives_the_case_format(name):
    material = library()[name].material
    assert read_material(Entry(json.loads(json.dumps(material_as_json(material))))) == material


def test_an_unknown_name_is_told_by_its_path():
    with pytest.raises(Trouble, match=r"parts\[0\]\.material\.name is 'cheese'.*not in the material library"):
        read_material(Entry({"name": "cheese"}, "parts[0].material"))


@pytest.mark.parametrize(
    ("conductivity", "complaint"),
    [
        (-1.0, "greater than 0"),
        ([1.0, 2.0], "must have 3"),
        ({"temperature": [300], "value": [1]}, "at least two"),
        ({"temperature": [300, 300], "value": [1, 2]}, "does not increase"),
        ({"temperature": [300, 400], "value": [1, 0]}, "greater than 0"),
        ({"temperature": [300, 400], "value": [1]}, "must have 2"),
        ({"temperature": [-5, 400], "value": [1, 2]}, "at least 0"),
    ],
)
def test_a_conductivity_that_cannot_be_is_refused_by_its_path(conductivity, complaint):
    with pytest.raises(Trouble) as caught:
        read_material(Entry({"name": "x", "conductivity": conductivity}, "m"))
    assert caught.value.kind == "case"
    assert "m.conductivity" in caught.value.message and complaint in caught.value.message


def test_a_table_is_linear_between_its_knots_and_held_beyond():
    table = Table((300.0, 400.0, 500.0), (10.0, 20.0, 10.0))
    temperature = np.array([0.0, 300.0, 330.0, 400.0, 450.0, 500.0, 900.0])
    assert table(temperature).tolist() == [10.0, 10.0, 13.0, 20.0, 15.0, 10.0, 10.0]


def test_a_tables_slope_is_had_by_a_complex_step():
    table = Table((300.0, 400.0, 500.0), (10.0, 20.0, 10.0))
    temperature = np.array([200.0, 350.0, 450.0, 600.0])
    assert (table(temperature + 1e-30j).imag / 1e-30).tolist() == pytest.approx([0.0, 0.1, -0.1, 0.0])
