"""What is seen of a result besides its colours: marks, isotherms, and the inside, on fields that are known."""

from __future__ import annotations

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import cutting, view  # noqa: E402
from fluxface.addon.view.arrows import spread  # noqa: E402
from fluxface.addon.view.over_result import over_result  # noqa: E402
from fluxface.addon.view.result_object import local_surface, places_and_triangles, temperatures  # noqa: E402
from fluxface.addon.view.settings import levels_of  # noqa: E402
from mathutils import Vector  # noqa: E402
from modelled import COLD, HOT, ready, wall  # noqa: E402


@pytest.fixture(name="turned")
def turned_wall(scene) -> bpy.types.Object:
    """Turned, moved and scaled; solved."""
    part = wall("z", at=(2.0, -1.0, 0.5))
    part.rotation_euler, part.scale = (0.3, 0.2, 0.5), (1.0, 2.0, 0.5)
    bpy.context.view_layer.update()
    assert bpy.ops.fluxface.run() == {"FINISHED"}
    return part


def share_of_height(part: bpy.types.Object, places: np.ndarray) -> np.ndarray:
    low, high = part.bound_box[0][2], part.bound_box[1][2]
    return (places[:, 2] - low) / (high - low)


def area(places: np.ndarray, triangles: np.ndarray) -> float:
    corners = places[triangles]
    return 0.5 * np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1).sum()


def test_isotherms_are_straight_and_the_ends_are_marked(scene, turned):
    view.settings_of(scene).isotherm_step = 10.0
    levels = levels_of(scene)
    assert levels == pytest.approx([303.15, 313.15, 323.15, 333.15, 343.15])  # round in °C
    drawn = over_result(view.result_of(turned), levels)
    height = share_of_height(turned, drawn.segments.reshape(-1, 3)).reshape(-1, 2)
    np.testing.assert_allclose(height, np.repeat((drawn.level - COLD)[:, None] / (HOT - COLD), 2, axis=1), atol=1e-5)
    assert set(drawn.level) == set(levels)
    assert (drawn.hottest.temperature, drawn.coldest.temperature) == pytest.approx((HOT, COLD), abs=1e-4)
    assert share_of_height(turned, drawn.hottest.place[None]) == pytest.approx(1.0, abs=1e-5)
    view.settings_of(scene).isotherms = False
    assert levels_of(scene) == ()


def test_a_cut_shows_the_inside_and_follows_its_plane(scene, turned):
    assert bpy.ops.fluxface.cut_open() == {"FINISHED"}
    plane, result = cutting.plane_of(scene), view.result_of(turned)
    shown = view.shown_of(turned)
    assert bpy.context.view_layer.objects.active == plane and shown != result
    assert result.hide_get() and not shown.hide_get()
    for place, way in (((0.0, 0.0, 0.0), (0.0, -1.0, 0.0)), ((0.01, 0.02, 0.001), (1.0, 0.7, -0.3))):
        plane.rotation_euler = Vector(way).to_track_quat("Z", "Y").to_euler()
        plane.location = np.array((2.0, -1.0, 0.5)) + place
        bpy.context.view_layer.update()
        at = np.array(plane.matrix_world)
        places, triangles = places_and_triangles(view.shown_of(turned))
        height = (places - at[:3, 3]) @ at[:3, 2]
        assert height.max() < 1e-5  # nothing is left beyond the plane
        cap = (np.abs(height[triangles]) < 1e-5).all(axis=1)
        corners = places[triangles[cap]]
        normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        assert (normals @ at[:3, 2] > 0).all() and cap.any()
        local, _ = local_surface(view.shown_of(turned).data)
        expected = COLD + (HOT - COLD) * share_of_height(turned, local)
        np.testing.assert_allclose(temperatures(view.shown_of(turned)), expected, atol=1e-3)


def test_the_section_of_a_block_has_the_blocks_own_area(scene):
    part = wall("z")
    bpy.ops.fluxface.run()
    bpy.ops.fluxface.cut_open()
    bpy.ops.fluxface.turn_cut(axis="X")
    places, triangles = places_and_triangles(view.shown_of(part))
    cap = np.isclose(places[triangles][:, :, 0], cutting.plane_of(scene).matrix_world.translation.x, atol=1e-6).all(1)
    size = part.dimensions
    assert area(places, triangles[cap]) == pytest.approx(size.y * size.z, rel=1e-5)
    bpy.ops.fluxface.turn_cut(axis="X")  # again: the other half
    other, _ = places_and_triangles(view.shown_of(part))
    assert places[:, 0].max() == pytest.approx(other[:, 0].min(), abs=1e-6)


def test_a_cut_outlives_a_run_and_goes_without_a_trace(scene, turned):
    before = set(bpy.data.objects)
    bpy.ops.fluxface.cut_open()
    turned.data.vertices[0].co.x -= 0.01
    bpy.context.view_layer.objects.active = cutting.plane_of(scene)  # the part is still the one that is worked on
    assert bpy.ops.fluxface.run() == {"FINISHED"}
    assert view.shown_of(turned) != view.result_of(turned) and view.result_of(turned).hide_get()
    bpy.ops.fluxface.close_cut()
    assert set(bpy.data.objects) == before and not view.result_of(turned).hide_get()
    assert view.settings_of(scene).cut is None
    bpy.ops.fluxface.cut_open()
    bpy.data.objects.remove(cutting.plane_of(scene))
    cutting.follow(scene, [turned])
    assert set(bpy.data.objects) == before and view.shown_of(turned) == view.result_of(turned)


def test_live_loads_show_on_the_cut(scene):
    part = wall("z")
    bpy.ops.fluxface.run()
    bpy.ops.fluxface.cut_open()
    ready()
    view.settings_of(scene).arrows = True
    assert view.arrows_of(part)
    scene.fluxface.tags[0].temperature = HOT + 50
    assert temperatures(view.shown_of(part)).max() == pytest.approx(HOT + 50, abs=1e-2)
    assert view.arrows_of(part) is None  # what the flux is now is known after a run
    scene.fluxface.tags[0].temperature = HOT
    assert view.arrows_of(part)


def test_arrows_of_an_even_flux_are_equal_and_parallel_and_go_without_a_trace(scene, turned):
    before = set(bpy.data.objects)
    settings = view.settings_of(scene)
    settings.arrows = True
    rings = local_arrows(scene, turned)
    along = rings[:, -1, 0] - rings[:, 0, 0]
    assert 100 < len(along) < 300
    down = -np.array(turned.matrix_world)[:3, 2] / turned.scale.z  # heat goes from +z to -z
    length = np.linalg.norm(along, axis=1)
    np.testing.assert_allclose(along / length[:, None], np.tile(down, (len(along), 1)), atol=1e-3)
    np.testing.assert_allclose(length, length.max(), rtol=1e-3)
    conductivity = 167.0
    assert settings.arrow_longest == pytest.approx(conductivity * (HOT - COLD) / turned.dimensions.z, rel=1e-3)
    bpy.ops.fluxface.cut_open()  # also on the section
    at = np.array(cutting.plane_of(scene).matrix_world)
    assert ((local_arrows(scene, turned)[:, 0, 0] - at[:3, 3]) @ at[:3, 2]).max() > -1e-3
    bpy.ops.fluxface.close_cut()
    settings.arrows = False
    assert set(bpy.data.objects) == before and settings.arrow_longest == 0.0


def local_arrows(scene, part: bpy.types.Object) -> np.ndarray:
    """(A, 5, 8, 3) the rings of each arrow, in the world."""
    places, _ = places_and_triangles(view.arrows_of(part))
    return places.reshape(-1, 5, 8, 3)


def test_arrows_stand_on_both_sides_of_a_thin_wall() -> None:
    across = np.stack(np.meshgrid(*[np.linspace(0.0, 1.0, 40)] * 2), axis=-1).reshape(-1, 2)
    middles = np.concatenate([np.column_stack([across, np.full(len(across), z)]) for z in (0.02, 0.03)])
    normals = np.repeat([(0.0, 0.0, -1.0), (0.0, 0.0, 1.0)], len(across), axis=0)
    chosen, apart = spread(middles, np.full(len(middles), 1.0 / len(across)), normals, 50)
    below = int((chosen < len(across)).sum())
    assert below == len(chosen) - below and 40 <= len(chosen) <= 60
    assert 0.1 < apart < 0.3
