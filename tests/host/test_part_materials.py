"""Materials of parts: chosen by name, changed by hand, over temperature, by direction, and the user's own."""

from __future__ import annotations

import math

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import host, materials  # noqa: E402
from fluxface.solver.errors import Trouble  # noqa: E402
from fluxface.solver.materials import Table, library  # noqa: E402
from modelled import block  # noqa: E402


@pytest.fixture
def own_folder(tmp_path, monkeypatch):
    monkeypatch.setattr(host, "user_folder", lambda: tmp_path)
    return tmp_path


def test_every_library_material_comes_through_unchanged(scene):
    part = block()
    for name, row in library().items():
        part.fluxface.material.name = name
        chosen = materials.material_of(part)
        assert chosen.conductivity == row.material.conductivity
        assert (chosen.density, chosen.heat_capacity) == (row.material.density, row.material.heat_capacity)
        assert materials.source_of(part.fluxface.material) == row.source


def test_a_material_is_chosen_by_name(scene):
    part = block()
    bpy.ops.fluxface.material_choose(name="copper, pure")
    assert materials.material_of(part) == library()["copper, pure"].material
    with pytest.raises(RuntimeError, match="There is no material 'unobtainable'"):
        bpy.ops.fluxface.material_choose(name="unobtainable")
    assert materials.material_of(part).name == "copper, pure"


def test_a_changed_value_no_longer_names_the_source(scene):
    part = block()
    part.fluxface.material.conductivity.value = 150.0
    assert materials.material_of(part).conductivity == (150.0,)
    assert materials.source_of(part.fluxface.material) == ""


def test_a_name_of_ones_own_keeps_the_values(scene):
    part = block()
    part.fluxface.material.conductivity.value = 151.0
    part.fluxface.material.name = "our alloy"
    assert materials.material_of(part).conductivity == (151.0,)


def test_another_part_can_take_a_material_of_this_file(scene):
    first, second = block("first"), block("second")
    first.fluxface.material.conductivity.value = 151.0
    first.fluxface.material.name = "our alloy"
    second.fluxface.material.name = "our alloy"
    assert materials.material_of(second) == materials.material_of(first)


def test_own_materials_are_kept_for_every_file(scene, own_folder):
    part = block()
    part.fluxface.material.conductivity.value = 151.0
    part.fluxface.material.name = "our alloy"
    bpy.ops.fluxface.material_keep()
    part.fluxface.material.conductivity.value = 152.0
    bpy.ops.fluxface.material_keep()
    bpy.data.objects.remove(part)
    other = block("other")
    other.fluxface.material.name = "our alloy"
    assert materials.material_of(other).conductivity == (152.0,)
    assert [path.name for path in own_folder.iterdir()] == [materials.OWN_FILE]


def test_own_materials_do_not_take_a_name_of_the_library(scene, own_folder):
    block().fluxface.material.conductivity.value = 1.0
    with pytest.raises(RuntimeError, match="is a name of the built-in library"):
        bpy.ops.fluxface.material_keep()
    assert not list(own_folder.iterdir())


def test_a_spoilt_own_library_is_told_and_does_not_hide_the_rest(scene, own_folder):
    (own_folder / materials.OWN_FILE).write_text("{")
    with pytest.raises(Trouble, match="Your own materials in"):
        materials.own_materials()
    assert "aluminium 6061-T6" in materials.at_hand()


def test_a_table_is_made_row_by_row(scene):
    part = block()
    values = part.fluxface.material
    values.conductivity.tabulated = True
    for _ in range(2):
        bpy.ops.fluxface.table_row_add(which="conductivity")
    values.conductivity.points[1].value = 180.0
    assert materials.material_of(part).conductivity == (Table((293.15, 393.15), (167.0, 180.0)),)
    bpy.ops.fluxface.table_row_remove(which="conductivity")
    with pytest.raises(Trouble, match="is a table of fewer than two rows"):
        materials.material_of(part)


@pytest.mark.parametrize(
    ("rows", "sentence"),
    [
        ([(300, 1), (300, 2)], "The conductivity of 'block' has temperatures that do not increase from row to row."),
        ([(300, 1), (400, -2)], "The conductivity of 'block' has a value in its table that is not greater than zero."),
    ],
)
def test_faults_of_tables_are_told(scene, rows, sentence):
    part = block()
    item = part.fluxface.material.conductivity
    item.tabulated = True
    for temperature, value in rows:
        point = item.points.add()
        point.temperature, point.value = temperature, value
    with pytest.raises(Trouble) as caught:
        materials.material_of(part)
    assert caught.value.message == sentence


def test_the_axes_turn_with_the_part_or_with_a_chosen_object(scene):
    part = block()
    part.fluxface.material.name = "FR4, bare"
    part.rotation_euler, part.scale = (0, 0, math.pi / 2), (2, 1, 3)
    bpy.context.view_layer.update()
    axes = np.array(materials.material_of(part).axes)
    assert axes == pytest.approx(np.array([[0, 1, 0], [-1, 0, 0], [0, 0, 1]]), abs=1e-6)
    assert axes @ axes.T == pytest.approx(np.eye(3), abs=1e-12)
    guide = bpy.data.objects.new("guide", None)
    scene.collection.objects.link(guide)
    part.fluxface.material.axes = guide
    assert np.array(materials.material_of(part).axes) == pytest.approx(np.eye(3), abs=1e-12)


def test_the_emissivity_of_a_finish_goes_to_the_active_tag(scene):
    from fluxface.addon import tags

    tags.new(scene, "outside")
    bpy.ops.fluxface.emissivity_use(emissivity=0.35)
    assert scene.fluxface.tags["outside"].emissivity == pytest.approx(0.35)
