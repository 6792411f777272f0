"""What is amiss with a part is found after an edit, shown on it, and mended in one step."""

from __future__ import annotations

import os
import time
from pathlib import Path

import bpy
import numpy as np
import pytest
from fluxface.addon import inspection, jobs, ledger, mending, places, recovery, running, study, tags, upkeep, view
from fluxface.addon.glance import Finding
from fluxface.addon.inspection import inspector
from fluxface.addon.panels import shape as shape_panel
from modelled import block, lamp, select, side, tag


@pytest.fixture(autouse=True)
def no_look_is_left():
    yield
    inspector.stop()
    assert not bpy.app.timers.is_registered(inspector._timer)
    assert not jobs._live


def looked_at(part: bpy.types.Object) -> list[Finding]:
    """The findings once the solver has looked; there is no window here to wait by the clock."""
    upkeep.refresh()
    begun = time.monotonic()
    while inspector._go_on() is not None:
        assert time.monotonic() < begun + 60
        time.sleep(0.05)
    assert inspection.is_current(part)
    return at_a_glance(part)


def at_a_glance(part: bpy.types.Object) -> list[Finding]:
    upkeep.refresh()
    found = inspection.findings(part)
    return [{**finding, "faces": inspection.faces_of(part, number)} for number, finding in enumerate(found)]


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
    part = block()
    assert at_a_glance(part) == []
    assert shape_panel.standing(part)[0] == "Sound at a glance; being looked at"
    assert looked_at(part) == []
    assert shape_panel.standing(part) == ("Sound", "CHECKMARK")


def test_an_open_part_is_told_with_its_faces_and_shown(scene):
    part = block()
    without_lid(part)
    (finding,) = [one for one in looked_at(part) if one["severity"] == "error"]
    assert finding["kind"] == "open edges"
    assert len(finding["points"]) == 4
    assert np.allclose(np.array(finding["points"])[:, 2], 0.01)
    number = [found["kind"] for found in inspection.findings(part)].index("open edges")
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
    scene.fluxface.size = 0.5
    upkeep.refresh()
    assert not inspection.is_current(part)  # walls are thin against the mesh size
    looked_at(part)
    without_lid(part)
    upkeep.refresh()
    assert not inspection.is_current(part)
    assert "open edges" in kinds(part)


def test_a_hole_is_seen_at_once_with_its_faces_and_places(scene):
    part = block(at=(1.0, 0.0, 0.0))
    without_lid(part)
    (hole,) = at_a_glance(part)
    assert hole["message"] == "The surface of 'block' is open: 4 edges without a face on both sides."
    assert len(hole["faces"]) == 4
    expected = [(0.96, 0, 0.01), (1.04, 0, 0.01), (1, 0.03, 0.01), (1, -0.03, 0.01)]
    assert np.array(sorted(hole["points"])) == pytest.approx(np.array(sorted(expected)), abs=1e-6)
    assert shape_panel.standing(part)[0] == "Seen at a glance; being looked at"
    part.data.vertices[0].co.x = -0.05
    part.data.update()
    bpy.context.view_layer.update()
    assert shape_panel.standing(part)[0] == "Changed; being looked at"


def test_flipped_faces_and_a_shape_inside_out_are_told_apart_at_once(scene):
    part = block()
    select(part, side(part, "+z"))
    for expected in ("flipped faces", "inside out", None):
        bpy.ops.mesh.flip_normals()
        assert [finding["kind"] for finding in at_a_glance(part)] == ([expected] if expected else [])
        bpy.ops.mesh.select_all(action="INVERT" if expected == "flipped faces" else "SELECT")


def test_doubled_corners_are_no_holes_and_a_face_without_area_is_told(scene):
    part = block()
    select(part, side(part, "+z"))
    bpy.ops.mesh.split()
    assert at_a_glance(part) == []
    bpy.ops.object.mode_set(mode="OBJECT")
    part = block("other")
    part.data.vertices[0].co = part.data.vertices[1].co
    part.data.vertices[2].co = part.data.vertices[3].co
    part.data.update()
    assert "flat faces" in [finding["kind"] for finding in at_a_glance(part)]


def test_the_solver_finds_what_a_glance_does_not(scene):
    part, other = block(), block("other", at=(0.02, 0.01, 0.005))
    part.select_set(True)
    other.select_set(True)
    bpy.context.view_layer.objects.active = part
    bpy.ops.object.join()
    assert at_a_glance(part) == []
    assert "crossing faces" in kinds(part)


def test_walls_are_thin_against_the_size_that_is_chosen(scene):
    part = block(size=(0.08, 0.06, 0.002))
    assert kinds(part) == []
    scene.fluxface.size = 0.01
    part.data.vertices[0].co.x -= 0.001
    part.data.update()
    assert kinds(part) == ["thin walls"]


def alive(process: int) -> bool:
    status = Path(f"/proc/{process}/stat")
    return status.exists() and status.read_text().rpartition(")")[2].split()[0] != "Z"


@pytest.mark.skipif(os.name == "nt", reason="looks for the process in /proc")
@pytest.mark.parametrize("end", ["edit", "run", "stop"])
def test_an_edit_a_run_and_the_end_give_up_a_look_and_leave_no_process(scene, end):
    part = block()
    upkeep.refresh()
    inspector._go_on()
    process, folder = inspector._look.job._process.pid, Path(inspector._look.folder.name)
    assert alive(process)
    if end == "edit":
        without_lid(part)
        upkeep.refresh()
        inspector.follow()
        assert bpy.app.timers.is_registered(inspector._timer)
    elif end == "run":
        bpy.context.window_manager.fluxface.running = True
        assert inspector._go_on() > 0
        bpy.context.window_manager.fluxface.running = False
    else:
        inspector.stop()
    assert not alive(process)
    assert not folder.exists()
    assert not inspection.is_current(part)


def test_a_look_goes_on_when_nothing_but_the_place_changed(scene):
    part = block()
    upkeep.refresh()
    inspector._go_on()
    job = inspector._look.job
    part.location.x = 2.0
    bpy.context.view_layer.update()
    upkeep.refresh()
    inspector.follow()
    assert inspector._look.job is job


def test_what_is_found_of_an_older_shape_is_not_kept(scene):
    part = block()
    upkeep.refresh()
    look = inspection.start(bpy.context, [part])
    ending = running.wait(look.job)
    without_lid(part)
    upkeep.refresh()
    inspection.finish(look, ending)
    assert not inspection.is_current(part)
    assert [finding["kind"] for finding in at_a_glance(part)] == ["open edges"]


def test_a_sheet_is_told_in_one_sentence(scene):
    bpy.ops.mesh.primitive_plane_add()
    part = bpy.context.object
    (finding,) = looked_at(part)
    assert finding["message"] == "The part 'Plane' is flat: it encloses no volume."


def test_faces_that_modifiers_made_are_found_on_the_mesh_where_they_lie_on_it(scene):
    part = block()
    part.modifiers.new("array", "ARRAY").relative_offset_displace = (2.0, 0.0, 0.0)
    assert places.show(bpy.context, part, [7], [(0.0, 0.0, 0.0100001)])
    assert np.flatnonzero(tags.selected(part.data)).tolist() == [5]
    # The copy has no faces in the mesh: its place is shown, and nothing else selected.
    assert not places.show(bpy.context, part, [11], [(0.16, 0.0, 0.01)])
    assert part.mode == "OBJECT"
    assert list(scene.cursor.location) == pytest.approx([0.16, 0.0, 0.01])
    # Face numbers are the mesh's own where a modifier only moves corners.
    part.modifiers.clear()
    part.modifiers.new("push", "DISPLACE").strength = 0.001
    assert places.show(bpy.context, part, [2], [(9.0, 9.0, 9.0)])
    assert np.flatnonzero(tags.selected(part.data)).tolist() == [2]


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
    assert "turned" in part.fluxface.notes
    bpy.ops.fluxface.notes_dismiss()
    assert part.fluxface.notes == ""


def test_what_cannot_be_mended_is_left_as_it_was(scene):
    part = block()
    without_lid(part)
    faces = len(part.data.polygons)
    with pytest.raises(RuntimeError, match="is open"):
        bpy.ops.fluxface.mend()
    assert len(part.data.polygons) == faces


def test_an_edit_made_while_the_mesh_is_mended_is_not_overwritten(scene):
    part = block()
    select(part, side(part, "+x"))
    bpy.ops.mesh.flip_normals()
    bpy.ops.object.mode_set(mode="OBJECT")
    begun = mending.start(bpy.context, part)
    part.data.vertices[0].co.x -= 0.01
    part.data.update()
    trouble = mending.finish(begun, running.wait(begun.job))
    assert trouble.message == "'block' was changed while it was being mended, and was left as it is."
    assert part.data.vertices[0].co.x == pytest.approx(-0.05)
    assert trouble.message in part.fluxface.notes


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
    bpy.ops.fluxface.areas_accept()
    assert ledger.of_present(bpy.context) == []
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
    upkeep.refresh()
    assert (part.fluxface.untagged_faces, part.fluxface.untagged) == (
        5,
        pytest.approx(0.08 * 0.06 + 2 * 0.02 * 0.14, rel=1e-5),
    )
    bpy.ops.fluxface.untagged_select()
    assert (tags.selected(part.data) == ~side(part, "+z")).all()
    bpy.ops.object.mode_set(mode="OBJECT")
    tags.give(part.data, np.ones(6, bool), scene.fluxface.tags["lid"].uid)
    with pytest.raises(RuntimeError, match="Every face of 'block' is in a tag"):
        bpy.ops.fluxface.untagged_select()


# Recovery -------------------------------------------------------------------------------------------------------------


def tagged_plate(scene: bpy.types.Scene) -> bpy.types.Object:
    """Thinner than three voxels: the nearest face alone would often be one of the other side."""
    part = block(size=(0.08, 0.06, 0.004))
    tag(scene, part, "lid", side(part, "+z"))
    tag(scene, part, "floor", side(part, "-z"))
    upkeep.refresh()
    return part


def remesh(part: bpy.types.Object) -> None:
    part.data.remesh_voxel_size = 0.0015
    part.data.use_remesh_preserve_attributes = False
    bpy.ops.object.voxel_remesh()
    assert tags.ATTRIBUTE not in part.data.attributes


def test_tags_come_back_after_a_voxel_remesh_and_it_is_said(scene):
    part = tagged_plate(scene)
    before = areas(part)
    remesh(part)
    assert areas(part) == pytest.approx(before, rel=0.03)
    assert part.fluxface.notes == recovery.CARRIED
    normals = np.array([polygon.normal[:] for polygon in part.data.polygons])
    lid = tags.read(part.data) == scene.fluxface.tags["lid"].uid
    assert (normals[lid, 2] > 0.0).all()


def test_a_deleted_tag_does_not_come_back_with_the_others(scene):
    part = tagged_plate(scene)
    remesh(part)
    scene.fluxface.active_tag = 1
    bpy.ops.fluxface.tag_delete()
    assert list(areas(part)) == ["lid"]


@pytest.mark.parametrize("hand", ["untag", "remove"])
def test_tags_taken_off_by_hand_do_not_come_back_even_after_a_remesh(scene, hand):
    part = tagged_plate(scene)
    if hand == "untag":
        select(part, np.ones(6, bool))
        bpy.ops.fluxface.tag_take()
        bpy.ops.object.mode_set(mode="OBJECT")
    else:
        part.data.attributes.remove(part.data.attributes[tags.ATTRIBUTE])
    assert areas(part) == {}
    remesh(part)
    assert areas(part) == {}
    assert part.fluxface.notes == ""
