"""Face tags: giving, taking, surviving the designer's edits, and travelling with the part."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import parts, study, tags, upkeep  # noqa: E402
from fluxface.solver.errors import Trouble  # noqa: E402
from modelled import block, select, side, tag  # noqa: E402


def test_selected_faces_become_a_tag_in_edit_mode(scene):
    part = block()
    select(part, side(part, "+z", "+x"))
    bpy.ops.fluxface.tag_new(name="lid")
    lid = scene.fluxface.tags[0]
    assert lid.name == "lid"
    assert np.array_equal(tags.read(part.data) == lid.uid, side(part, "+z", "+x"))
    bpy.ops.object.mode_set(mode="OBJECT")
    assert np.array_equal(tags.read(part.data) == lid.uid, side(part, "+z", "+x"))


def test_object_mode_takes_the_selection_that_edit_mode_left(scene):
    part = block()
    select(part, side(part, "-x"))
    bpy.ops.object.mode_set(mode="OBJECT")
    bpy.ops.fluxface.tag_new(name="end")
    assert np.array_equal(tags.read(part.data) == scene.fluxface.tags["end"].uid, side(part, "-x"))


def test_several_parts_in_edit_mode_are_tagged_together(scene):
    first, second = block("first"), block("second", at=(0.2, 0, 0))
    for part in (first, second):
        part.select_set(True)
    bpy.ops.object.mode_set(mode="EDIT")
    bpy.ops.mesh.select_all(action="SELECT")
    bpy.ops.fluxface.tag_new(name="all")
    bpy.ops.object.mode_set(mode="OBJECT")
    uid = scene.fluxface.tags["all"].uid
    assert all((tags.read(part.data) == uid).all() for part in (first, second))


@pytest.mark.parametrize("mode", ["OBJECT", "EDIT"])
def test_a_face_moves_to_the_tag_it_is_given_to_and_can_be_taken_out(scene, mode):
    part = block()
    tag(scene, part, "first", side(part, "+z", "-z"))
    second = tag(scene, part, "second", side(part, "+x"))
    scene.fluxface.active_tag = 1
    select(part, side(part, "+z"))
    bpy.ops.object.mode_set(mode=mode)
    bpy.ops.fluxface.tag_give()
    assert np.array_equal(tags.read(part.data) == second.uid, side(part, "+x", "+z"))
    bpy.ops.fluxface.tag_take()
    assert np.array_equal(tags.read(part.data) == 0, side(part, "+z", "-x", "+y", "-y"))


def test_select_enters_edit_mode_with_the_faces_of_the_tag_and_no_others(scene):
    part = block()
    tag(scene, part, "lid", side(part, "+z", "+y"))
    bpy.ops.fluxface.tag_select()
    assert part.mode == "EDIT"
    assert np.array_equal(tags.selected(part.data), side(part, "+z", "+y"))


def test_deleting_a_tag_leaves_its_faces_untagged(scene):
    part = block()
    tag(scene, part, "lid", side(part, "+z"))
    tag(scene, part, "base", side(part, "-z"))
    scene.fluxface.active_tag = 0
    bpy.ops.fluxface.tag_delete()
    assert [each.name for each in scene.fluxface.tags] == ["base"]
    assert np.array_equal(tags.read(part.data) != 0, side(part, "-z"))
    study.restore_tags(scene)
    assert [each.name for each in scene.fluxface.tags] == ["base"]


def test_nothing_selected_is_told_and_changes_nothing(scene):
    part = block()
    select(part, side(part))
    with pytest.raises(RuntimeError, match=r"No faces are selected\. Select faces in edit mode\."):
        bpy.ops.fluxface.tag_new()
    assert not scene.fluxface.tags


def test_names_stay_apart_and_leave_untagged_alone(scene):
    for name in ("fins", "fins", "untagged", " "):
        tags.new(scene, "x").name = name
    assert [each.name for each in scene.fluxface.tags] == ["fins", "fins 2", "untagged 2", "tag"]


def test_colours_differ_while_they_can(scene):
    colours = [tuple(tags.new(scene, "tag").colour) for _ in tags.COLOURS]
    assert len(set(colours)) == len(tags.COLOURS)


def test_a_foreign_attribute_of_that_name_is_told_and_kept(scene):
    part = block()
    part.data.attributes.new(tags.ATTRIBUTE, "FLOAT", "POINT")
    with pytest.raises(Trouble, match="does not hold whole numbers on faces"):
        tags.read(part.data)
    with pytest.raises(RuntimeError, match="does not hold whole numbers on faces"):
        bpy.ops.fluxface.tag_new()
    assert part.data.attributes[tags.ATTRIBUTE].data_type == "FLOAT"


def evaluated_area(part: bpy.types.Object) -> dict[int, float]:
    depsgraph = bpy.context.evaluated_depsgraph_get()
    areas = parts.placed(parts.modelled(part, depsgraph), parts.world_matrix(part), 1.0).area_by_tag()
    return {uid: area for uid, area in areas.items() if uid}


# What each edit makes of the area of the lid, 0.08 by 0.06.
EDITS = {
    "subdivide": (lambda: bpy.ops.mesh.subdivide(number_cuts=2), 0.08 * 0.06),
    "inset": (lambda: bpy.ops.mesh.inset(thickness=0.01), 0.08 * 0.06),
    "triangulate": (lambda: bpy.ops.mesh.quads_convert_to_tris(), 0.08 * 0.06),
    "poke": (lambda: bpy.ops.mesh.poke(), 0.08 * 0.06),
}


@pytest.mark.parametrize("edit", EDITS)
def test_tags_survive_edits_of_the_mesh(scene, edit):
    part = block()
    lid = tag(scene, part, "lid", side(part, "+z"))
    select(part, side(part, "+z"))
    act, area = EDITS[edit]
    act()
    bpy.ops.object.mode_set(mode="OBJECT")
    assert evaluated_area(part)[lid.uid] == pytest.approx(area, rel=1e-5)


def test_a_lengthened_side_keeps_its_tag(scene):
    part = block()
    lid = tag(scene, part, "lid", side(part, "+z"))
    select(part, side(part, "+z"))
    bpy.ops.mesh.extrude_region_move(TRANSFORM_OT_translate={"value": (0, 0, 0.03)})
    bpy.ops.object.mode_set(mode="OBJECT")
    assert evaluated_area(part)[lid.uid] >= 0.08 * 0.06 * (1 - 1e-5)


@pytest.mark.parametrize(
    ("kind", "settings", "times"),
    [
        ("MIRROR", {"use_axis": (True, False, False), "use_bisect_axis": (True, False, False)}, 1.0),
        ("ARRAY", {"count": 3, "relative_offset_displace": (2.0, 0.0, 0.0)}, 3.0),
        ("SUBSURF", {"levels": 2, "subdivision_type": "SIMPLE"}, 1.0),
        ("TRIANGULATE", {}, 1.0),
    ],
)
def test_tags_survive_modifiers(scene, kind, settings, times):
    part = block()
    lid = tag(scene, part, "lid", side(part, "+z"))
    modifier = part.modifiers.new(kind, kind)
    for key, value in settings.items():
        setattr(modifier, key, value)
    assert evaluated_area(part)[lid.uid] == pytest.approx(times * 0.08 * 0.06, rel=1e-5)


def test_a_cut_takes_the_tag_of_the_cutter(scene):
    part, cutter = block(), block("cutter", size=(0.02, 0.02, 0.1))
    wall = tag(scene, cutter, "hole", ~side(cutter, "+z", "-z"))
    modifier = part.modifiers.new("cut", "BOOLEAN")
    modifier.operation, modifier.object = "DIFFERENCE", cutter
    assert evaluated_area(part)[wall.uid] == pytest.approx(4 * 0.02 * 0.02, rel=1e-4)


def test_where_a_modifier_drops_the_tags_the_nearest_face_gives_its_own(scene):
    part = block()
    lid = tag(scene, part, "lid", side(part, "+z"))
    modifier = part.modifiers.new("remesh", "REMESH")
    modifier.mode, modifier.voxel_size = "VOXEL", 0.002
    assert evaluated_area(part)[lid.uid] == pytest.approx(0.08 * 0.06, rel=0.1)


def test_joined_parts_keep_their_tags(scene):
    first, second = block("first"), block("second", at=(0.2, 0, 0))
    one = tag(scene, first, "one", side(first, "+z"))
    two = tag(scene, second, "two", side(second, "+z"))
    uids = {one.uid, two.uid}
    first.select_set(True)
    second.select_set(True)
    bpy.ops.object.join()
    assert set(np.unique(tags.read(second.data)).tolist()) == uids | {0}


def test_an_appended_part_brings_its_tags(scene, tmp_path: Path):
    part = block("lamp")
    lid = tag(scene, part, "lid", side(part, "+z"))
    # Changed after it was given its faces: what is saved is what it is then.
    lid.use_convection, lid.coefficient = True, 12.5
    uid, file = lid.uid, tmp_path / "lamp.blend"
    bpy.ops.wm.save_as_mainfile(filepath=str(file))
    bpy.ops.wm.read_homefile(use_empty=True, use_factory_startup=True)
    with bpy.data.libraries.load(str(file)) as (_, wanted):
        wanted.objects = ["lamp"]
    bpy.context.scene.collection.objects.link(bpy.data.objects["lamp"])
    upkeep.refresh()
    brought = bpy.context.scene.fluxface.tags["lid"]
    assert (brought.uid, brought.use_convection, brought.coefficient) == (uid, True, 12.5)


def test_a_tag_that_the_scene_has_is_not_overwritten_by_a_copy(scene):
    part = block()
    lid = tag(scene, part, "lid", side(part, "+z"))
    lid.name = "cover"
    study.restore_tags(scene)
    assert [each.name for each in scene.fluxface.tags] == ["cover"]
    assert json.loads(part.data[tags.COPY])[0]["name"] == "lid"


def test_a_spoilt_copy_on_a_mesh_is_passed_over(scene, tmp_path):
    part = block()
    for spoilt in ("{", "[1]", '[{"name": "x"}]', "null"):
        part.data[tags.COPY] = spoilt
        study.restore_tags(scene)
    assert not scene.fluxface.tags
    part.data.attributes.new(tags.ATTRIBUTE, "FLOAT", "POINT")
    assert bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "kept.blend")) == {"FINISHED"}


def test_areas_are_kept_with_the_part_in_edit_mode_too(scene):
    part = block()
    part.scale = (2.0, 1.0, 1.0)
    select(part, side(part, "+z"))
    bpy.ops.fluxface.tag_new(name="lid")
    assert json.loads(part.fluxface.areas) == {
        str(scene.fluxface.tags["lid"].uid): pytest.approx(2 * 0.08 * 0.06, rel=1e-6)
    }
