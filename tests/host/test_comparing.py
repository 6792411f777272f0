"""Two runs compared: place by place on the part, and tag by tag."""

from __future__ import annotations

import json

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import study, view  # noqa: E402
from fluxface.addon.nearest import nearest_values  # noqa: E402
from fluxface.addon.view.colours import NO_VALUE  # noqa: E402
from fluxface.addon.view.result_object import COLOUR, local_surface, shown_values, temperatures  # noqa: E402
from fluxface.addon.view.settings import scale_of, words_of  # noqa: E402
from modelled import COLD, HOT, ready, wall  # noqa: E402


def solved_wall() -> bpy.types.Object:
    part = wall("x")
    assert bpy.ops.fluxface.run() == {"FINISHED"}
    return part


def compared(part: bpy.types.Object, run: int) -> dict:
    left = study.outcome(bpy.context.scene, [part])
    left.active_run = run
    assert bpy.ops.fluxface.run_compare() == {"FINISHED"}
    return json.loads(left.comparison)


def things() -> set[tuple[str, str]]:
    kinds = ("objects", "meshes", "scenes", "node_groups")
    return {(kind, thing.name) for kind in kinds for thing in getattr(bpy.data, kind)}


def test_values_are_those_of_the_nearest_place():
    corners = np.array([(0.0, 0.0, 5.0), (2.0, 0.0, 5.0), (2.0, 2.0, 5.0), (0.0, 2.0, 5.0)]) * 1e-3
    values = 300.0 + 1e4 * corners[:, 0]
    places = np.array([(0.5, 0.5, 5.0), (1.5, 0.25, 5.001), (1.0, 3.0, 5.0)]) * 1e-3
    value, apart = nearest_values(corners, np.array([(0, 1, 2), (0, 2, 3)]), values, places)
    np.testing.assert_allclose(value, (305.0, 315.0, 310.0), atol=1e-3)
    np.testing.assert_allclose(apart, (0.0, 1e-6, 1e-3), atol=1e-9)
    assert not [thing for thing in bpy.data.objects if thing.name.startswith("nearest")]


def test_a_hotter_run_is_shown_as_its_change_and_left_without_a_trace(scene):
    part = solved_wall()
    scene.fluxface.tags[0].temperature = HOT + 20.0
    bpy.ops.fluxface.run()
    before = things()
    told = compared(part, 1)
    result = view.result_of(part)
    places, _ = local_surface(result.data)
    share = places[:, 0] / part.dimensions.x + 0.5
    np.testing.assert_allclose(shown_values(result), 20.0 * share, atol=2e-2)
    scale = scale_of(scene)
    assert scale.low == -scale.high == pytest.approx(-20.0, abs=1e-2) and scale.colour_map.name == "vik"
    assert words_of(scene).title == f"Change since {told['since']}"
    assert [tick.label for tick in scale.ticks()][-1] == "+20" and scale.unit.text(-1.25) == "−1.2 °C"
    assert told["known"] == 1.0
    rows = {row["name"]: row["now"] - row["then"] for row in told["rows"]}
    assert rows == pytest.approx({"Hottest": 20.0, "+x": 20.0, "-x": 0.0, "untagged": 10.0}, abs=0.05)
    assert bpy.ops.fluxface.end_comparison() == {"FINISHED"}
    np.testing.assert_array_equal(shown_values(result), temperatures(result))
    assert words_of(scene).title == "Surface temperature" and scale_of(scene).high == pytest.approx(HOT + 20.0)
    assert things() == before


def test_what_was_not_there_is_grey_and_its_share_is_told(scene):
    part = solved_wall()
    far = np.array([vertex.co.y > 0 for vertex in part.data.vertices])
    for vertex in np.flatnonzero(far).tolist():
        part.data.vertices[vertex].co.y += 0.06
    bpy.ops.fluxface.run()
    told = compared(part, 1)
    result = view.result_of(part)
    places, _ = local_surface(result.data)
    beyond = places[:, 1] > 0.03 + 0.02 * 0.12 + 1e-6
    np.testing.assert_array_equal(np.isnan(shown_values(result)), beyond)
    assert told["known"] == pytest.approx(1 - beyond.mean())
    colours = np.empty(4 * len(places), np.float32)
    result.data.color_attributes[COLOUR].data.foreach_get("color", colours)
    assert beyond.any() and np.abs(colours.reshape(-1, 4)[beyond, :3] - NO_VALUE).max() < 1e-6
    bpy.ops.fluxface.run()
    assert not study.outcome(scene, [part]).comparison and not np.isnan(shown_values(view.result_of(part))).any()


def test_any_two_runs_are_compared_on_what_is_shown(scene):
    part = solved_wall()
    for kelvin in (HOT + 10.0, HOT + 40.0):
        scene.fluxface.tags[0].temperature = kelvin
        bpy.ops.fluxface.run()
    left = study.outcome(scene, [part])
    left.active_run = 2
    assert bpy.ops.fluxface.run_compare(later=left.runs[1].name) == {"FINISHED"}
    assert np.nanmax(shown_values(view.result_of(part))) == pytest.approx(10.0, abs=2e-2)
    told = json.loads(left.comparison)
    assert told["until"] and told["rows"][0]["now"] == pytest.approx(HOT + 10.0, abs=1e-2)


def test_a_dragged_load_ends_the_comparison(scene):
    part = solved_wall()
    bpy.ops.fluxface.run()
    ready()
    compared(part, 1)
    scene.fluxface.tags[0].temperature = HOT + 5.0
    assert not study.outcome(scene, [part]).comparison
    assert shown_values(view.result_of(part)).max() == pytest.approx(HOT + 5.0, abs=1e-2)


def test_one_range_for_all_runs(scene):
    part = solved_wall()
    scene.fluxface.tags[0].temperature = HOT - 20.0
    bpy.ops.fluxface.run()
    settings = view.settings_of(scene)
    settings.range = "SHARED"
    assert (settings.low, settings.high) == pytest.approx((COLD, HOT), abs=1e-3)
    study.outcome(scene, [part]).active_run = 1
    bpy.ops.fluxface.run_forget("EXEC_DEFAULT")
    assert settings.high == pytest.approx(HOT - 20.0, abs=1e-3)
