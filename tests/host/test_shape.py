"""What is amiss with a part is found after an edit, shown on it, and mended in one step."""

from __future__ import annotations

import time

import bpy
import numpy as np
import pytest
from fluxface.addon import inspection, ledger, places, study, tags, upkeep, view
from fluxface.addon.inspection import inspector
from modelled import block, lamp, select, side, tag


@pytest.fixture(autouse=True)
def no_look_is_left():
    yield
    inspector.stop()


def looked_at(part: bpy.types.Object) -> list[inspection.Finding]:
    """The findings once the solver has looked; there is no window here to wait by the clock."""
    upkeep.refresh()
    inspector.look([part])
    for _ in range(600):
        if inspection.is_current(part):
            break
        inspector._wait() if inspector._job else inspector.look([part])
        time.sleep(0.05)
    assert inspection.is_current(part)
    return inspection.findings(part)


def kinds(part: bpy.types.Object) -> list[str]:
    return [finding["kind"] for finding in looked_at(part)]


def without_lid(part: bpy.types.Object) -> None:
    select(part, side(part, "+z"))
    bpy.ops.mesh.delete(type="ONLY_FACE")
    bpy.ops.object.mode_set(mode="OBJECT")


def areas(part: bpy.types.Object) -> dict[str, float]:
    names = {tag.uid: tag.name for tag in bpy.context.scene.fluxface.tags}
    upkeep.refresh()
    return {names[uid]: area for uid, area in study.tag_areas(bpy.context.scene, [part]).items()}


def test_measures_are_those_of_the_part_as_it_stands(scene):
    part = block()
    part.scale = (2.0, -1.0, 1.0)
    part.rotation_euler.z = np.pi / 2
    scene.unit_settings.scale_length = 0.5
    bpy.context.view_layer.update()
    upkeep.refresh()
    settings = part.fluxface
    assert settings.volume == pytest.approx(0.08 * 2 * 0.06 * 0.02 / 8, rel=1e-5)
    assert settings.surface == pytest.approx(2 * (0.16 * 0.06 + 0.16 * 0.02 + 0.06 * 0.02) / 4, rel=1e-5)
    assert list(settings.extent) == pytest.approx([0.03, 0.08, 0.01], rel=1e-5)
    assert settings.untagged == pytest.approx(settings.surface)


def test_a_sound_part_is_told_to_be(scene):
    assert looked_at(block()) == []


def test_an_open_part_is_told_with_its_faces_and_shown(scene):
    part = block()
    without_lid(part)
    (finding,) = [one for one in looked_at(part) if one["severity"] == "error"]
    assert finding["kind"] == "open edges"
    assert len(finding["points"]) == 4
    assert np.allclose(np.array(finding["points"])[:, 2], 0.01)
    number = inspection.findings(part).index(finding)
    bpy.ops.fluxface.finding_show(which=number)
    assert part.mode == "EDIT"
    assert sorted(np.flatnonzero(tags.selected(part.data))) == sorted(finding["faces"])


def test_an_edit_makes_findings_stale_and_a_move_does_not(scene):
    part = block()
    looked_at(part)
    part.location.x += 3.0
    bpy.context.view_layer.update()
    upkeep.refresh()
    assert inspection.is_current(part)
    without_lid(part)
    upkeep.refresh()
    assert not inspection.is_current(part)
    assert "open edges" in kinds(part)


def test_a_newer_shape_ends_the_look_at_an_older_one(scene):
    part = block()
    upkeep.refresh()
    inspector.look([part])
    older = inspector._job
    without_lid(part)
    upkeep.refresh()
    inspector.look([part])
    assert older is not inspector._job
    assert older._process.poll() is not None


def test_a_sheet_is_told_in_one_sentence(scene):
    bpy.ops.mesh.primitive_plane_add()
    part = bpy.context.object
    (finding,) = looked_at(part)
    assert finding["message"] == "The part 'Plane' is flat: it encloses no volume."


def test_faces_that_modifiers_made_are_found_on_the_mesh_by_place(scene):
    part = block()
    part.modifiers.new("array", "ARRAY").relative_offset_displace = (2.0, 0.0, 0.0)
    places.show(bpy.context, part, [7], [(0.0, 0.0, 0.0100001)])
    assert np.flatnonzero(tags.selected(part.data)).tolist() == [5]


# Mending --------------------------------------------------------------------------------------------------------------


def test_mending_keeps_tags_materials_and_flat_faces(scene):
    """A block with a flipped side, doubled vertices along an edge and a doubled face."""
    part = block()
    tag(scene, part, "lid", side(part, "+z"))
    tag(scene, part, "walls", side(part, "+x", "-x"))
    part.data.materials.append(bpy.data.materials.new("one"))
    part.data.materials.append(bpy.data.materials.new("other"))
    part.data.polygons[5].material_index = 1
    before = areas(part)
    select(part, side(part, "+x"))
    bpy.ops.mesh.flip_normals()
    bpy.ops.mesh.select_all(action="DESELECT")
    select(part, side(part, "+z"))
    bpy.ops.mesh.duplicate()
    select(part, side(part, "-y"))
    bpy.ops.mesh.split()
    bpy.ops.object.mode_set(mode="OBJECT")
    assert {"open edges", "flipped faces"} & set(kinds(part))
    bpy.ops.fluxface.mend()
    assert kinds(part) == []
    assert len(part.data.polygons) == 6
    assert part.fluxface.volume == pytest.approx(0.08 * 0.06 * 0.02, rel=1e-5)
    assert areas(part) == pytest.approx(before, rel=1e-5)
    lid = [polygon for polygon in part.data.polygons if polygon.material_index == 1]
    assert [tuple(round(x) for x in polygon.normal) for polygon in lid] == [(0, 0, 1)]
    assert "turned" in bpy.context.window_manager.fluxface.mended


def test_what_cannot_be_mended_is_left_as_it_was(scene):
    part = block()
    without_lid(part)
    faces = len(part.data.polygons)
    with pytest.raises(RuntimeError, match="is open"):
        bpy.ops.fluxface.mend()
    assert len(part.data.polygons) == faces


@pytest.mark.parametrize("unfit", ["shared", "modified"])
def test_a_mesh_that_is_not_the_parts_alone_is_not_mended(scene, unfit):
    part = block()
    if unfit == "shared":
        scene.collection.objects.link(bpy.data.objects.new("twin", part.data))
    else:
        part.modifiers.new("bevel", "BEVEL")
    assert not bpy.ops.fluxface.mend.poll()


# The ledger and the untagged ------------------------------------------------------------------------------------------


def test_the_ledger_tells_of_tags_that_vanished_halved_or_doubled(scene):
    part = lamp(scene)
    assert ledger.of_present(bpy.context) == []
    bpy.ops.fluxface.run()
    assert ledger.of_present(bpy.context) == []
    view.settings_of(scene).showing = "PART"
    tags.give(part.data, side(part, "-z"), scene.fluxface.tags["skin"].uid)
    upkeep.refresh()
    (sentence,) = ledger.of_present(bpy.context)
    assert sentence == "'pad' has no faces any more; in the last run it had 48 cm²."
    uids = {tag.name: tag.uid for tag in scene.fluxface.tags}
    before = {uids["pad"]: 48e-4, uids["skin"]: 104e-4}
    told = {
        share: ledger.changes(scene, before, {**before, uids["pad"]: 48e-4 * share}) for share in (0.5, 0.6, 1.9, 2)
    }
    assert [len(sentences) for sentences in told.values()] == [1, 0, 0, 1]
    assert ledger.changes(scene, before, {uid: 9 * area for uid, area in before.items()}) == []


def test_untagged_faces_are_selected(scene):
    part = block()
    tag(scene, part, "lid", side(part, "+z"))
    bpy.ops.fluxface.untagged_select()
    assert (tags.selected(part.data) == ~side(part, "+z")).all()
    bpy.ops.object.mode_set(mode="OBJECT")
    tags.give(part.data, np.ones(6, bool), scene.fluxface.tags["lid"].uid)
    with pytest.raises(RuntimeError, match="Every face of 'block' is in a tag"):
        bpy.ops.fluxface.untagged_select()


# Recovery -------------------------------------------------------------------------------------------------------------


def test_tags_come_back_after_a_voxel_remesh(scene):
    part = block()
    tag(scene, part, "lid", side(part, "+z"))
    tag(scene, part, "floor", side(part, "-z"))
    before = areas(part)
    part.data.remesh_voxel_size = 0.002
    part.data.use_remesh_preserve_attributes = False
    bpy.ops.object.voxel_remesh()
    assert tags.ATTRIBUTE not in part.data.attributes
    after = areas(part)
    assert after == pytest.approx(before, rel=0.1)
    assert part.fluxface.recovered
    normals = np.array([polygon.normal[:] for polygon in part.data.polygons])
    lid = tags.read(part.data) == scene.fluxface.tags["lid"].uid
    assert (normals[lid, 2] > 0.5).all()


def test_tags_taken_off_by_hand_do_not_come_back(scene):
    part = block()
    tag(scene, part, "lid", side(part, "+z"))
    areas(part)
    select(part, np.ones(6, bool))
    bpy.ops.fluxface.tag_take()
    bpy.ops.object.mode_set(mode="OBJECT")
    assert areas(part) == {}
    assert not part.fluxface.recovered
