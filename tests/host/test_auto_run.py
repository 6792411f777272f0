"""A study is run by itself once things are quiet, once for each change; and what changed is told."""

from __future__ import annotations

import bpy
import numpy as np
import pytest
from fluxface.addon import auto_run, presets, study, tag_names, tags, upkeep, view
from fluxface.addon.parts import modelled
from modelled import block, lamp, side, tag


@pytest.fixture
def runs(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """What auto run would have started, in place of starting it."""
    started: list[str] = []
    monkeypatch.setattr(auto_run, "_run", lambda context: started.append("run"))
    return started


def quiet(clock: auto_run.AutoRun, seconds: float) -> None:
    for _ in range(round(seconds / auto_run.SECONDS_BETWEEN_LOOKS) + 1):
        clock.look()


def test_a_change_is_run_once_after_a_pause(scene, runs):
    lamp(scene)
    upkeep.refresh()
    clock = auto_run.AutoRun()
    quiet(clock, 3.0)
    assert runs == []
    scene.fluxface.auto_run = True
    quiet(clock, 0.5)
    assert runs == []
    quiet(clock, 3.0)
    assert runs == ["run"]
    scene.fluxface.tags["pad"].heat = 13.0
    quiet(clock, 0.5)
    scene.fluxface.tags["pad"].heat = 14.0
    quiet(clock, 0.5)
    assert runs == ["run"]
    quiet(clock, 3.0)
    assert runs == ["run", "run"]


def test_nothing_is_run_while_a_run_is_on_or_when_the_result_is_current(scene, runs):
    lamp(scene)
    scene.fluxface.auto_run = True
    bpy.ops.fluxface.run()
    clock = auto_run.AutoRun()
    quiet(clock, 3.0)
    assert runs == []
    scene.fluxface.tags["pad"].heat = 13.0
    bpy.context.window_manager.fluxface.running = True
    quiet(clock, 3.0)
    assert runs == []
    bpy.context.window_manager.fluxface.running = False
    quiet(clock, 3.0)
    assert runs == ["run"]


def test_nothing_is_run_without_tags(scene, runs):
    block()
    scene.fluxface.auto_run = True
    quiet(auto_run.AutoRun(), 3.0)
    assert runs == []


def test_what_changed_since_the_run_is_told(scene):
    part = lamp(scene)
    assert study.changes(scene, [part]) == []
    bpy.ops.fluxface.run()
    assert study.changes(scene, [part]) == []
    scene.fluxface.tags["pad"].heat = 13.0
    assert study.changes(scene, [part]) == ["tags"]
    part.fluxface.material.name = "copper, pure"
    scene.fluxface.size = 0.03
    part.fluxface.heat = 2.0
    view.settings_of(scene).showing = "PART"
    part.scale.x = 2.0
    bpy.context.view_layer.update()
    upkeep.refresh()
    assert study.changes(scene, [part]) == ["shape", "tags", "materials", "heat in the volume", "mesh and units"]


def test_every_preset_fills_a_tag_and_leaves_its_heat(scene):
    lamp(scene)
    scene.fluxface.active_tag = scene.fluxface.tags.find("pad")
    pad = scene.fluxface.tags["pad"]
    for number, preset in enumerate(presets.PRESETS):
        bpy.ops.fluxface.preset_use(which=number)
        assert (pad.use_heat, pad.heat, pad.use_convection, pad.use_temperature) == (True, 12.0, True, False)
        assert pad.coefficient == pytest.approx(preset.coefficient)
        assert pad.use_radiation == (preset.emissivity is not None)


def test_a_name_stands_on_a_face_of_its_tag(scene):
    """On both ends of a block the middle of the two faces lies within the block, and no name does."""
    part = block()
    made = tag(scene, part, "ends", side(part, "+x", "-x"))
    (found,) = tag_names.middles(modelled(part, bpy.context.evaluated_depsgraph_get())).values()
    assert sorted(place.x for place, _ in found) == pytest.approx([-0.04, 0.04])
    assert all(np.sign(place.x) * normal.x == pytest.approx(1.0) for place, normal in found)
    tags.delete(scene, made.uid)
    assert tag_names.middles(modelled(part, bpy.context.evaluated_depsgraph_get())) == {}
