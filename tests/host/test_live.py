"""Other loads are shown without solving for them, and the next run confirms what was shown."""

from __future__ import annotations

import bpy
import numpy as np
import pytest
from fluxface.addon import live, study, view
from fluxface.addon.panels.run import standing
from fluxface.addon.view.result_object import TEMPERATURE, read_kelvin, result_of
from modelled import lamp, ready


@pytest.fixture
def part(scene) -> bpy.types.Object:
    """A lamp that was run, and whose responses are there."""
    made = lamp(scene)
    bpy.ops.fluxface.run()
    ready()
    return made


def shown(part: bpy.types.Object) -> np.ndarray:
    return read_kelvin(result_of(part).data, TEMPERATURE)


def outcome(part: bpy.types.Object):
    return part.fluxface.outcome


def test_a_load_is_followed_at_once_and_the_run_confirms_it(scene, part):
    before = shown(part)
    scene.fluxface.tags["pad"].heat = 20.0
    scene.fluxface.tags["skin"].ambient = 290.0
    followed, told = shown(part), study.summary(outcome(part))
    assert outcome(part).live
    assert followed.max() > before.max() + 20
    assert standing(bpy.context, outcome(part))[1].startswith("Live")
    bpy.ops.fluxface.run()
    assert not outcome(part).live
    confirmed = study.summary(outcome(part))
    assert followed == pytest.approx(shown(part), rel=2e-7)  # the host's attributes are in single precision
    assert told["hottest"]["temperature"] == pytest.approx(confirmed["hottest"]["temperature"], rel=1e-8)
    assert told["balance"]["in"] == pytest.approx(confirmed["balance"]["in"], rel=1e-8)
    for one, other in zip(told["tags"] + told["parts"], confirmed["tags"] + confirmed["parts"], strict=True):
        for key in ("mean", "min", "max", "heat"):
            assert one[key] == pytest.approx(other[key], rel=1e-8)


def test_the_legend_follows_too(scene, part):
    settings = view.settings_of(scene)
    hottest = settings.hottest
    scene.fluxface.tags["pad"].heat = 24.0
    assert settings.hottest > hottest + 50
    assert settings.high == pytest.approx(float(shown(part).max()))


def test_going_back_shows_the_run_again(scene, part):
    before, summary = shown(part), study.summary(outcome(part))
    scene.fluxface.tags["pad"].heat = 20.0
    scene.fluxface.tags["pad"].heat = 12.0
    assert not outcome(part).live
    assert shown(part) == pytest.approx(before, rel=1e-7)
    assert study.summary(outcome(part)) == summary


def test_what_is_no_load_ends_it(scene, part):
    before = shown(part)
    scene.fluxface.tags["pad"].heat = 20.0
    scene.fluxface.tags["skin"].coefficient = 16.0
    scene.fluxface.tags["pad"].heat = 21.0
    assert not outcome(part).live
    assert shown(part) == pytest.approx(before, rel=1e-7)
    assert standing(bpy.context, outcome(part))[1] == "Changed since the last run: tags"


def test_a_nonlinear_study_says_why_its_loads_are_not_live(scene):
    part = lamp(scene)
    scene.fluxface.tags["skin"].use_radiation = True
    bpy.ops.fluxface.run()
    assert live.live.ask() is None
    before = shown(part)
    scene.fluxface.tags["pad"].heat = 20.0
    assert (shown(part) == before).all()
    assert live.why_not(scene, [part]) == "'skin' radiates"


def test_responses_of_another_result_are_not_taken(scene, part):
    folder = study.folder(scene, [part]) / "result"
    responses = live.live.held(str(folder)).responses
    np.savez(folder / "responses.npz", **{**vars(responses), "temperature": responses.temperature[:, :-1]})
    live.live.forget()
    before = shown(part)
    scene.fluxface.tags["pad"].heat = 20.0
    assert (shown(part) == before).all()
    assert not outcome(part).live
