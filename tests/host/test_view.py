"""The result object: where it lies, what it holds, how it gives way to the part, and what it leaves alone."""

from __future__ import annotations

from pathlib import Path

import bpy
import numpy as np
import pytest
from fluxface.addon import view
from fluxface.addon.view import legend_in_view
from fluxface.addon.view.colours import colour_maps
from fluxface.addon.view.material import SHOWN
from fluxface.addon.view.result_object import COLOUR, MARK, TEMPERATURE, places_and_triangles, temperatures
from fluxface.addon.view.scale import spanning
from fluxface.addon.view.settings import scale_of, settings_of
from fluxface.addon.view.showing import TRUE_SOLID
from fluxface.solver.errors import Trouble
from fluxface.solver.result import FIELD_FILE
from made_results import finned_block, grid_boundary, stand_in, warm_at_one_end, write_made_result

PLACEMENTS = (
    {},
    {"location": (1.0, -2.0, 3.0), "rotation_euler": (0.4, 0.2, -1.0), "scale": (2.0, 0.5, 3.0)},
    {"location": (0.1, 0.2, 0.3), "scale": (-1.0, 1.0, 1.0)},
)


def volume(places: np.ndarray, triangles: np.ndarray) -> float:
    """Enclosed by outward triangles, by the divergence theorem."""
    a, b, c = places[triangles].transpose(1, 0, 2)
    return float((a * np.cross(b, c)).sum() / 6)


def world_places(result: bpy.types.Object) -> np.ndarray:
    bpy.context.view_layer.update()
    return places_and_triangles(result)[0]


@pytest.mark.parametrize("placement", PLACEMENTS)
@pytest.mark.parametrize("metres_per_unit", [1.0, 0.001])
def test_the_result_lies_where_it_was_solved(scene, tmp_path: Path, placement: dict, metres_per_unit: float) -> None:
    scene.unit_settings.scale_length = metres_per_unit
    part = stand_in("body", **placement)
    nodes, boundary = finned_block()
    write_made_result(tmp_path / "result", [(nodes, boundary)], warm_at_one_end)
    (result,) = view.show(scene, [part], tmp_path / "result")
    bpy.context.view_layer.update()
    places, triangles = places_and_triangles(result)
    np.testing.assert_allclose(places * metres_per_unit, nodes, atol=2e-6)
    assert len(triangles) == 4 * len(boundary)
    solid = volume(nodes, boundary[:, :3])
    assert volume(places * metres_per_unit, triangles) == pytest.approx(solid, rel=1e-4)


def test_temperatures_are_kelvin_on_the_vertices(scene, tmp_path: Path) -> None:
    """Every node of the boundary, mid-sides too, under the name the design gives and under the material's own."""
    field = write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    (result,) = view.show(scene, [stand_in("body")], tmp_path / "result")
    np.testing.assert_allclose(temperatures(result), field.temperature, atol=1e-4)
    attribute = result.data.attributes[TEMPERATURE]
    assert (attribute.name, attribute.data_type, attribute.domain) == ("temperature", "FLOAT", "POINT")
    assert result.data.attributes[SHOWN].data[7].value == attribute.data[7].value


def test_the_result_goes_where_the_part_goes(scene, tmp_path: Path) -> None:
    part = stand_in("body", rotation_euler=(0.0, 0.0, 0.3))
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    (result,) = view.show(scene, [part], tmp_path / "result")
    before = world_places(result)
    part.location.x += 0.5
    np.testing.assert_allclose(world_places(result) - before, np.tile((0.5, 0, 0), (len(before), 1)), atol=1e-6)
    assert result.parent == part
    assert view.part_of(result) == part
    assert view.part_of(part) == part


def test_each_part_has_its_own_result_and_one_scale(scene, tmp_path: Path) -> None:
    hot = grid_boundary(np.ones((2, 2, 2), bool), np.full(3, 0.01))
    cold = (hot[0] + (0.1, 0, 0), hot[1])
    write_made_result(tmp_path / "result", [hot, cold], lambda x, _y, _z: np.where(x < 0.05, 350.0, 300.0) + x)
    parts = [stand_in("chip"), stand_in("sink", location=(0.1, 0.0, 0.0))]
    results = view.show(scene, parts, tmp_path / "result")
    assert [result.parent.name for result in results] == ["chip", "sink"]
    assert temperatures(results[0]).min() == pytest.approx(350.0)
    assert temperatures(results[1]).max() == pytest.approx(300.12)
    scale = scale_of(scene)
    assert (scale.low, scale.high) == pytest.approx((300.1, 350.02))
    assert results[0].data.materials[0] == results[1].data.materials[0]


def test_a_new_result_takes_the_place_of_the_old(scene, tmp_path: Path) -> None:
    part = stand_in("body")
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    (first,) = view.show(scene, [part], tmp_path / "result")
    counts = len(bpy.data.meshes), len(bpy.data.objects), len(bpy.data.materials)
    cube = grid_boundary(np.ones((1, 1, 1), bool), np.full(3, 0.02))
    write_made_result(tmp_path / "result", [cube], lambda x, _y, _z: 400 + x)
    (second,) = view.show(scene, [part], tmp_path / "result")
    assert first == second
    assert len(second.data.polygons) == 4 * 12
    assert (len(bpy.data.meshes), len(bpy.data.objects), len(bpy.data.materials)) == counts
    assert scale_of(scene).low == pytest.approx(400.0)


def _with_too_few_nodes(arrays: dict) -> None:
    arrays["nodes"] = arrays["nodes"][:10]


def _with_a_gap(arrays: dict) -> None:
    arrays["temperature"][3] = np.nan


def _with_two_parts(arrays: dict) -> None:
    arrays["boundary_part"][0] = 1


def _without_temperatures(arrays: dict) -> None:
    del arrays["temperature"]


@pytest.mark.parametrize("spoil", [_with_too_few_nodes, _with_a_gap, _with_two_parts, _without_temperatures])
def test_a_spoilt_result_is_told_of_and_the_old_one_stays(scene, tmp_path: Path, spoil) -> None:
    part = stand_in("body")
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    (result,) = view.show(scene, [part], tmp_path / "result")
    mesh, count = result.data, len(bpy.data.meshes)
    with np.load(tmp_path / "result" / FIELD_FILE) as archive:
        arrays = dict(archive)
    spoil(arrays)
    np.savez(tmp_path / "result" / FIELD_FILE, **arrays)
    with pytest.raises(Trouble) as told:
        view.show(scene, [part], tmp_path / "result")
    assert told.value.message.endswith(".")
    assert result.data == mesh
    assert len(bpy.data.meshes) == count


def test_no_result_folder_is_told_of(scene, tmp_path: Path) -> None:
    with pytest.raises(Trouble):
        view.show(scene, [stand_in("body")], tmp_path / "nowhere")
    assert not view.has_result(bpy.data.objects["body"])


def test_part_and_result_give_way_to_each_other(scene, tmp_path: Path) -> None:
    part, lamp = stand_in("body"), stand_in("by-stander")
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    (result,) = view.show(scene, [part], tmp_path / "result")
    assert (part.hide_get(), part.hide_render, result.hide_get(), result.hide_render) == (True, True, False, False)
    settings_of(scene).showing = "PART"
    assert (part.hide_get(), part.hide_render, result.hide_get(), result.hide_render) == (False, False, True, True)
    view.show(scene, [part], tmp_path / "result")
    assert part.hide_get()
    view.clear(part)
    assert not view.has_result(part)
    assert not part.hide_get()
    assert not part.hide_render
    assert not any(MARK in object_ for object_ in bpy.data.objects)
    assert not lamp.hide_get()


def test_a_part_being_edited_is_not_taken_from_under_the_hand(scene, tmp_path: Path) -> None:
    part = stand_in("body")
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    bpy.context.view_layer.objects.active = part
    bpy.ops.object.mode_set(mode="EDIT")
    (result,) = view.show(scene, [part], tmp_path / "result")
    assert part.mode == "EDIT"
    assert not part.hide_get()
    assert result.hide_get()
    bpy.ops.object.mode_set(mode="OBJECT")
    settings_of(scene).showing = "RESULT"
    assert part.hide_get()


def test_colours_follow_the_settings(scene, tmp_path: Path) -> None:
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    (result,) = view.show(scene, [stand_in("body")], tmp_path / "result")
    settings = settings_of(scene)

    def shown() -> np.ndarray:
        values = np.empty(4 * len(result.data.vertices), dtype=np.float32)
        result.data.color_attributes[COLOUR].data.foreach_get("color", values)
        return values.reshape(-1, 4)[:, :3]

    def node(kind: str) -> bpy.types.Node:
        return next(node for node in settings.material.node_tree.nodes if node.bl_idname == kind)

    field = temperatures(result)
    assert (settings.low, settings.high) == pytest.approx((field.min(), field.max()))
    np.testing.assert_allclose(shown(), scale_of(scene).colours(field), atol=1e-6)

    settings.range = "LOCKED"
    settings.low, settings.high = 310.0, 330.0
    settings.colour_map = "batlow"
    expected = spanning(310.0, 330.0, scale_of(scene).unit, colour_maps()["batlow"])
    np.testing.assert_allclose(shown(), expected.colours(field), atol=1e-6)
    assert node("ShaderNodeMapRange").inputs["From Min"].default_value == 310.0
    assert node("ShaderNodeMapRange").inputs["From Max"].default_value == 330.0
    stops = np.array([element.color[:3] for element in node("ShaderNodeValToRGB").color_ramp.elements])
    np.testing.assert_allclose(stops, colour_maps()["batlow"].stops, atol=1e-6)

    settings.range = "AUTOMATIC"
    assert (settings.low, settings.high) == pytest.approx((field.min(), field.max()))
    settings.range = "LOCKED"
    settings.low, settings.high = 330.0, 310.0
    assert np.isfinite(shown()).all()


def test_the_legend_speaks_the_unit_of_the_scene(scene, tmp_path: Path) -> None:
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    view.show(scene, [stand_in("body")], tmp_path / "result")
    for system, unit, symbol in (
        ("METRIC", "CELSIUS", "°C"), ("METRIC", "KELVIN", "K"), ("IMPERIAL", "FAHRENHEIT", "°F")
    ):  # fmt: skip
        scene.unit_settings.system = system
        scene.unit_settings.temperature_unit = unit
        assert scale_of(scene).unit.symbol == symbol


def test_solid_views_show_true_colours_and_get_their_look_back(scene, tmp_path: Path) -> None:
    bpy.ops.wm.read_factory_settings()
    scene, part = bpy.context.scene, stand_in("body")
    shadings = [
        space.shading for screen in bpy.data.screens for area in screen.areas for space in area.spaces
        if space.type == "VIEW_3D"
    ]  # fmt: skip
    assert shadings
    shadings[0].light = "MATCAP"
    before = [{name: getattr(shading, name) for name in TRUE_SOLID} for shading in shadings]
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    view.show(scene, [part], tmp_path / "result")
    assert all(getattr(shading, name) == value for shading in shadings for name, value in TRUE_SOLID.items())
    # What the designer sets while a result shows is left alone by the next run.
    shadings[0].light = "STUDIO"
    view.show(scene, [part], tmp_path / "result")
    assert shadings[0].light == "STUDIO"
    settings_of(scene).showing = "PART"
    assert [{name: getattr(shading, name) for name in TRUE_SOLID} for shading in shadings] == before


def test_true_colours_at_a_press(scene) -> None:
    scene.view_settings.view_transform = "AgX"
    bpy.ops.fluxface.show_true_colours()
    assert scene.view_settings.view_transform == "Standard"


def test_a_saved_file_opens_with_its_result(scene, tmp_path: Path) -> None:
    write_made_result(tmp_path / "result", [finned_block()], warm_at_one_end)
    view.show(scene, [stand_in("body")], tmp_path / "result")
    low = settings_of(scene).low
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "saved.blend"))
    bpy.ops.wm.open_mainfile(filepath=str(tmp_path / "saved.blend"))
    scene, part = bpy.context.scene, bpy.data.objects["body"]
    assert view.has_result(part)
    assert part.hide_get()
    assert settings_of(scene).low == low
    settings_of(scene).colour_map = "lajolla"
    settings_of(scene).showing = "PART"
    assert not part.hide_get()


def test_nothing_is_drawn_without_a_window() -> None:
    assert bpy.app.background
    assert not legend_in_view.drawings.drawn
