"""The whole path in the host: model, tag, run, read back, change, run again, save and open."""

from __future__ import annotations

import json
import time
from pathlib import Path

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface import addon  # noqa: E402
from fluxface.addon import cases, jobs, parts, running, study, view  # noqa: E402
from fluxface.solver.result import read_field  # noqa: E402
from modelled import block, lamp, select, side, tag  # noqa: E402

AMBIENT, POWER, FILM = 298.15, 12.0, 8.0
SKIN = 0.08 * 0.06 + 2 * 0.02 * (0.08 + 0.06)


def outcome(scene: bpy.types.Scene, part: bpy.types.Object):
    return study.outcome(scene, [part])


def row(scene: bpy.types.Scene, part: bpy.types.Object, name: str) -> dict:
    return next(each for each in study.summary(outcome(scene, part))["tags"] if each["name"] == name)


def test_a_lamp_is_solved_and_shown(scene, tmp_path):
    part = lamp(scene)
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "lamp.blend"))
    assert bpy.ops.fluxface.run() == {"FINISHED"}
    skin = row(scene, part, "skin")
    # Newton's law of cooling: what comes in goes out through the skin, so its mean excess is power / (film x area).
    assert skin["mean"] == pytest.approx(AMBIENT + POWER / (FILM * SKIN), rel=1e-6)
    assert skin["area"] == pytest.approx(SKIN, rel=1e-6)
    assert skin["heat"] == pytest.approx(-POWER, rel=1e-9)
    assert row(scene, part, "pad")["heat"] == pytest.approx(POWER, rel=1e-12)
    assert view.has_result(part)
    folder = Path(outcome(scene, part).folder)
    assert folder == tmp_path / "lamp.fluxface" / "lamp" / "result"
    field = read_field(folder)
    result = next(child for child in part.children)
    shown = np.empty(len(result.data.vertices), np.float32)
    result.data.attributes["temperature"].data.foreach_get("value", shown)
    assert shown.max() == pytest.approx(field.temperature.max(), rel=1e-6)


def test_after_an_edit_run_replaces_the_result_and_the_tags_are_still_there(scene):
    part = lamp(scene)
    bpy.ops.fluxface.run()
    before = row(scene, part, "skin")["mean"]
    view.settings_of(scene).showing = "PART"
    select(part, side(part, "+z"))
    bpy.ops.transform.translate(value=(0, 0, 0.03))
    bpy.ops.object.mode_set(mode="OBJECT")
    bpy.ops.fluxface.run()
    taller = SKIN + 2 * 0.03 * (0.08 + 0.06)
    after = row(scene, part, "skin")
    assert after["area"] == pytest.approx(taller, rel=1e-6)
    assert after["mean"] == pytest.approx(AMBIENT + POWER / (FILM * taller), rel=1e-6)
    assert after["mean"] < before
    assert len([child for child in part.children if child.type == "MESH"]) == 1


def test_tags_settings_and_result_are_there_when_the_file_is_opened_again(scene, tmp_path):
    part = lamp(scene)
    file = str(tmp_path / "lamp.blend")
    bpy.ops.wm.save_as_mainfile(filepath=file)
    bpy.ops.fluxface.run()
    summary = outcome(scene, part).summary
    bpy.ops.wm.save_mainfile()
    bpy.ops.wm.open_mainfile(filepath=file)
    scene, part = bpy.context.scene, bpy.data.objects["lamp"]
    assert [each.name for each in scene.fluxface.tags] == ["pad", "skin"]
    assert scene.fluxface.tags["pad"].heat == POWER
    assert outcome(scene, part).summary == summary
    assert view.has_result(part)
    assert outcome(scene, part).inputs == study.inputs(scene, [part])
    assert bpy.ops.fluxface.run() == {"FINISHED"}


def test_a_result_is_out_of_date_when_what_it_depends_on_changes_and_only_then(scene):
    part = lamp(scene)
    bpy.ops.fluxface.run()
    made_from = outcome(scene, part).inputs

    def is_current() -> bool:
        addon.upkeep.refresh()
        bpy.context.view_layer.update()
        return made_from == study.inputs(scene, [part])

    assert is_current()
    part.location.x += 1.0
    assert is_current()
    scene.fluxface.tags["pad"].heat = 13.0
    assert not is_current()
    scene.fluxface.tags["pad"].heat = POWER
    assert is_current()
    part.rotation_euler.x = 0.5
    assert not is_current()
    part.rotation_euler.x = 0.0
    assert is_current()
    view.settings_of(scene).showing = "PART"
    part.data.vertices[0].co.z -= 0.01
    part.data.update()
    assert not is_current()


def test_turning_the_axes_of_a_material_puts_the_result_out_of_date(scene):
    part, guide = lamp(scene), bpy.data.objects.new("guide", None)
    scene.collection.objects.link(guide)
    part.fluxface.material.name = "FR4, bare"
    part.fluxface.material.axes = guide
    made_from = study.inputs(scene, [part])
    guide.location.x = 1.0
    bpy.context.view_layer.update()
    assert study.inputs(scene, [part]) == made_from
    guide.rotation_euler.z = 0.3
    bpy.context.view_layer.update()
    assert study.inputs(scene, [part]) != made_from


def test_what_fails_in_the_solver_is_told_kept_and_leaves_the_older_result(scene):
    part = lamp(scene)
    bpy.ops.fluxface.run()
    summary = outcome(scene, part).summary
    scene.fluxface.tags["skin"].use_convection = False
    with pytest.raises(RuntimeError, match="Nothing carries heat away from 'lamp'"):
        bpy.ops.fluxface.run()
    left = outcome(scene, part)
    assert left.message.startswith("Nothing carries heat away from 'lamp'")
    assert left.summary == summary
    assert view.has_result(part)
    scene.fluxface.tags["skin"].use_convection = True
    bpy.ops.fluxface.run()
    assert outcome(scene, part).message == ""


def test_an_open_surface_is_told_and_its_place_shown(scene):
    part = lamp(scene)
    select(part, side(part, "+z"))
    bpy.ops.mesh.delete(type="ONLY_FACE")
    bpy.ops.object.mode_set(mode="OBJECT")
    with pytest.raises(RuntimeError, match="The surface of 'lamp' is open: 4 edges"):
        bpy.ops.fluxface.run()
    assert not outcome(scene, part).summary
    bpy.ops.fluxface.show_place()
    assert part.mode == "EDIT"
    assert scene.cursor.location.z == pytest.approx(0.01, abs=1e-6)


def test_a_solver_that_is_killed_is_told_and_the_file_still_saves(scene, tmp_path, monkeypatch):
    part = lamp(scene)
    die = "import os, signal; os.kill(os.getpid(), signal.SIGKILL)"
    monkeypatch.setattr(jobs, "solve", lambda *_: jobs.Job([jobs.sys.executable, "-c", die]))
    with pytest.raises(RuntimeError, match=r"The solver was stopped before it was done\."):
        bpy.ops.fluxface.run()
    file = str(tmp_path / "lamp.blend")
    bpy.ops.wm.save_as_mainfile(filepath=file)
    bpy.ops.wm.open_mainfile(filepath=file)
    assert outcome(bpy.context.scene, bpy.data.objects["lamp"]).message.startswith("The solver was stopped")
    assert part is not None


def test_a_place_that_cannot_be_written_is_told(scene, tmp_path):
    lamp(scene)
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "lamp.blend"))
    (tmp_path / "lamp.fluxface").write_text("a file where the folder should be")
    with pytest.raises(RuntimeError, match="The case cannot be written to"):
        bpy.ops.fluxface.run()


def look_to_the_end(look) -> None:
    deadline = time.monotonic() + 60.0
    while (wait := look()) is not None:
        assert time.monotonic() < deadline, "it took too long"
        time.sleep(min(wait, 0.05))


def test_looking_from_time_to_time_never_waits_and_ends_with_the_result(scene, monkeypatch):
    part, told = lamp(scene), []
    monkeypatch.setattr(running.host, "tell_status", told.append)
    state = bpy.context.window_manager.fluxface
    run = running.start(bpy.context)
    state.running = True
    look = running.look_until_over(run.job, lambda ending: running.finish(run, ending), "Temperatures")
    began = time.monotonic()
    look()
    assert time.monotonic() - began < 0.1
    assert state.running and told[0].startswith("Temperatures: ")
    look_to_the_end(look)
    assert not state.running and told[-1] is None and told.count(None) == 1
    assert view.has_result(part)


def test_cancel_ends_the_run_and_keeps_the_older_result(scene, monkeypatch):
    part = lamp(scene)
    bpy.ops.fluxface.run()
    summary = outcome(scene, part).summary
    state = bpy.context.window_manager.fluxface
    sleep = [jobs.sys.executable, "-c", "import time; time.sleep(60)"]
    monkeypatch.setattr(jobs, "solve", lambda *_: jobs.Job(sleep))
    run = running.start(bpy.context)
    state.running, state.cancelled = True, False
    look = running.look_until_over(run.job, lambda ending: running.finish(run, ending), "Temperatures")
    look()
    assert not bpy.ops.fluxface.run.poll()
    bpy.ops.fluxface.cancel()
    look_to_the_end(look)
    assert not state.running
    assert outcome(scene, part).summary == summary
    assert outcome(scene, part).message == ""


def test_a_part_deleted_while_the_solver_runs_is_no_trouble(scene):
    part = lamp(scene)
    run = running.start(bpy.context)
    bpy.data.objects.remove(part)
    assert running.finish(run, running.wait(run.job)) is None


def test_a_part_renamed_while_the_solver_runs_gets_its_result(scene):
    part = lamp(scene)
    run = running.start(bpy.context)
    part.name = "headlamp"
    running.finish(run, running.wait(run.job))
    assert view.has_result(part)


def test_opening_another_file_ends_the_run(scene, monkeypatch):
    lamp(scene)
    sleep = [jobs.sys.executable, "-c", "import time; time.sleep(60)"]
    monkeypatch.setattr(jobs, "solve", lambda *_: jobs.Job(sleep))
    run = running.start(bpy.context)
    bpy.context.window_manager.fluxface.running = True
    bpy.ops.wm.read_homefile(use_empty=True, use_factory_startup=True)
    assert run.job._process.poll() is not None
    assert not bpy.context.window_manager.fluxface.running


def test_a_scene_in_millimetres_gives_the_same_temperatures(scene):
    part = lamp(scene)
    bpy.ops.fluxface.run()
    hottest = study.summary(outcome(scene, part))["hottest"]["temperature"]
    scene.unit_settings.scale_length = 0.001
    scene.fluxface.size *= 1000.0
    part.scale = (1000.0, 1000.0, 1000.0)
    bpy.ops.fluxface.run()
    # Single-precision coordinates, single-precision results of the mesher's decisions on them.
    assert study.summary(outcome(scene, part))["hottest"]["temperature"] == pytest.approx(hottest, rel=1e-4)


@pytest.fixture
def assembly(scene) -> bpy.types.Collection:
    """A chip of 5 W on a sink in air, and a lid that touches nothing."""
    made = bpy.data.collections.new("assembly")
    scene.collection.children.link(made)
    scene.fluxface.collection = made
    scene.fluxface.order, scene.fluxface.size = "1", 0.02
    for name, size, height in (("chip", (0.02, 0.02, 0.01), 0.015), ("sink", (0.08, 0.06, 0.02), 0.0)):
        part = block(name, size=size, at=(0, 0, height))
        scene.collection.objects.unlink(part)
        made.objects.link(part)
    bpy.data.objects["chip"].fluxface.heat = 5.0
    sink = bpy.data.objects["sink"]
    tag(scene, sink, "air", ~side(sink, "+z")).use_convection = True
    return made


def test_contacts_are_found_and_keep_what_they_are_given(scene, assembly):
    bpy.ops.fluxface.contacts_find()
    assert len(scene.fluxface.contacts) == 1
    contact = scene.fluxface.contacts[0]
    assert {contact.first.name, contact.second.name} == {"chip", "sink"}
    assert contact.area == pytest.approx(0.02 * 0.02, rel=1e-5)
    contact.crossing = "BONDED"
    bpy.data.objects["chip"].location.x = 0.035
    bpy.ops.fluxface.contacts_find()
    assert [each.crossing for each in scene.fluxface.contacts] == ["BONDED"]
    assert scene.fluxface.contacts[0].area == pytest.approx(0.02 * 0.015, rel=1e-5)


def test_the_parts_of_a_collection_are_solved_together(scene, assembly):
    bpy.ops.fluxface.contacts_find()
    contact = scene.fluxface.contacts[0]
    contact.crossing, contact.conductance = "CONDUCTANCE", 5000.0
    bpy.ops.fluxface.run()
    summary = json.loads(assembly.fluxface.outcome.summary)
    assert [part["name"] for part in summary["parts"]] == ["chip", "sink"]
    assert summary["contacts"][0]["area"] == pytest.approx(0.02 * 0.02, rel=1e-6)
    assert abs(summary["contacts"][0]["heat"]) == pytest.approx(5.0, rel=1e-6)
    assert abs(summary["contacts"][0]["drop"]) == pytest.approx(5.0 / (5000.0 * 0.02 * 0.02), rel=1e-6)
    assert all(view.has_result(bpy.data.objects[name]) for name in ("chip", "sink"))


@pytest.mark.parametrize(
    ("crossing", "values", "conductance"),
    [
        ("CONDUCTANCE", {"conductance": 4000.0}, 4000.0),
        ("RESISTANCE", {"resistance": 2e-4}, 5000.0),
        ("FILLER", {"thickness": 0.5e-3, "conductivity": 3.0}, 6000.0),
        ("BONDED", {}, None),
    ],
)
def test_a_contact_is_given_in_any_of_four_ways(scene, assembly, crossing, values, conductance):
    bpy.ops.fluxface.contact_add()
    contact = scene.fluxface.contacts[0]
    contact.first, contact.second = (bpy.data.objects[name] for name in ("chip", "sink"))
    contact.crossing = crossing
    for key, value in values.items():
        setattr(contact, key, value)
    members = study.parts(bpy.context)
    with parts.in_sight(bpy.context, members) as depsgraph:
        case = cases.build_case(scene, members, depsgraph)
    assert case.contacts[0].parts == (0, 1)
    assert case.contacts[0].conductance == (None if conductance is None else pytest.approx(conductance, rel=1e-6))


@pytest.mark.parametrize(
    ("fault", "sentence"),
    [
        ({"second": None}, "The contact between 'chip' and no part does not name two different parts."),
        ({"crossing": "RESISTANCE", "resistance": 0.0}, "The contact between 'chip' and 'sink' has a value of zero."),
        ({"crossing": "FILLER", "thickness": 0.0}, "The contact between 'chip' and 'sink' has a value of zero."),
    ],
)
def test_faults_of_contacts_are_told(scene, assembly, fault, sentence):
    bpy.ops.fluxface.contacts_find()
    for key, value in fault.items():
        setattr(scene.fluxface.contacts[0], key, value)
    with pytest.raises(RuntimeError, match=sentence):
        bpy.ops.fluxface.run()
    assert assembly.fluxface.outcome.message == sentence


def test_parts_that_run_through_each_other_are_told_with_the_place(scene, assembly):
    bpy.ops.fluxface.contacts_find()
    bpy.data.objects["chip"].location.z = 0.01
    with pytest.raises(RuntimeError, match="'chip' and 'sink' run through each other"):
        bpy.ops.fluxface.run()
    bpy.ops.fluxface.show_place()
    assert abs(scene.cursor.location.z) <= 0.015


@pytest.mark.slow
def test_the_picture_is_rendered_beside_the_file(scene, tmp_path):
    part = lamp(scene)
    assert not bpy.ops.fluxface.render_picture.poll()
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "lamp.blend"))
    bpy.ops.fluxface.run()
    bpy.ops.fluxface.render_picture()
    assert (Path(part.fluxface.outcome.runs[0].folder) / "picture.png").read_bytes().startswith(b"\x89PNG")
