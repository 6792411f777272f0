"""The picture can be measured: pixels are read back through the legend that stands in the same picture."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import bpy
import numpy as np
import pytest
from fluxface.addon import view
from fluxface.addon.view import picture
from fluxface.addon.view.colours import fractions_of, srgb_from_linear
from fluxface.addon.view.legend_in_picture import BAR_BOTTOM, BAR_TOP, BAR_WIDTH, COLUMN, MARGIN
from fluxface.addon.view.settings import scale_of, settings_of
from fluxface.addon.view.skin import hottest_in_view, skin_of
from fluxface.solver.errors import Trouble
from made_results import finned_block, grid_boundary, stand_in, warm_at_one_end, write_made_result
from mathutils import Vector
from mathutils.bvhtree import BVHTree
from PIL import Image

SIZE = (480, 300)
STEP = min(SIZE) / 100


def pixels_of(path: Path) -> np.ndarray:
    """(height, width, 3) sRGB 0..1, the first row at the bottom."""
    with Image.open(path) as image:
        return np.asarray(image.convert("RGB"))[::-1] / 255.0


def read_through_legend(shown: np.ndarray, colours: np.ndarray, low: float, high: float) -> np.ndarray:
    """Kelvin of ``colours`` (N, 3), by the nearest colour of the bar that stands in the picture ``shown``."""
    middle = round(SIZE[0] - (MARGIN + COLUMN - BAR_WIDTH / 2) * STEP)
    bottom, top = BAR_BOTTOM * STEP, SIZE[1] - BAR_TOP * STEP
    rows = np.arange(int(np.ceil(bottom)) + 1, int(top) - 1)
    bar = shown[rows, middle]
    fraction = (rows + 0.5 - bottom) / (top - bottom)
    nearest = ((colours[:, None] - bar) ** 2).sum(axis=2).argmin(axis=1)
    return low + fraction[nearest] * (high - low)


def shown_part(folder: Path, temperature: Callable[..., Any], **placement: Any) -> bpy.types.Object:
    part = stand_in("Finned block", **placement)
    write_made_result(folder / "result", [finned_block()], temperature)
    view.show(bpy.context.scene, [part], folder / "result")
    return part


def look_from(towards_eye: tuple[float, float, float]) -> None:
    """A camera in the scene that looks from there."""
    scene = bpy.context.scene
    scene.camera = bpy.data.objects.new("camera", bpy.data.cameras.new("camera"))
    scene.collection.objects.link(scene.camera)
    scene.camera.rotation_euler = Vector(towards_eye).to_track_quat("Z", "Y").to_euler()
    bpy.context.view_layer.update()


def warmest_at(*place: float) -> Callable[..., np.ndarray]:
    """350 K at a place (m), falling off around it."""
    return lambda *at: 300.0 + 50.0 * np.exp(-sum((a - b) ** 2 for a, b in zip(at, place, strict=True)) / 0.05**2)


@pytest.mark.parametrize(
    ("temperature", "towards_eye"),
    [
        # In the middle of a side, in the corner towards the eye, at the foot of a fin, and on the underside.
        (warmest_at(0.12, 0.04, 0.024), None),
        (warmest_at(0.12, 0.0, 0.048), None),
        (warmest_at(0.0646, 0.0, 0.012), (-0.5, -0.8, 0.6)),
        (warm_at_one_end, (0.3, -0.5, -0.9)),
    ],
)
def test_the_hottest_point_in_view_is_read_back(scene, tmp_path: Path, temperature, towards_eye) -> None:
    """Within 2 % of the legend's range, at the very pixel where the hottest point in view is."""
    if towards_eye:
        look_from(towards_eye)
    part = shown_part(tmp_path, temperature)
    shown, scale = pixels_of(view.render_picture(scene, [part], tmp_path / "picture.png", size=SIZE)), scale_of(scene)
    skin, frame = skin_of(list(part.children)), view.picture_frame(scene, [part], SIZE)
    hottest = hottest_in_view(skin, frame)
    x, y = frame.pixels(skin.places[hottest]).astype(int)
    kelvin = read_through_legend(shown, shown[None, y, x], scale.low, scale.high)[0]
    assert abs(kelvin - skin.temperature[hottest]) < 0.02 * (scale.high - scale.low)


@pytest.mark.slow
def test_surfaces_everywhere_are_read_back(scene, tmp_path: Path) -> None:
    """Not at the hottest point alone: of the places in view, those that no line crosses are within 2 % of the range."""
    part = shown_part(tmp_path, warm_at_one_end, location=(0.2, 0.1, 0.0), rotation_euler=(0.0, 0.0, 0.5))
    size = (960, 600)
    shown, scale = pixels_of(view.render_picture(scene, [part], tmp_path / "picture.png", size=size)), scale_of(scene)
    skin, frame = skin_of(list(part.children)), view.picture_frame(scene, [part], size)
    tree = BVHTree.FromPolygons(skin.places.tolist(), skin.triangles.tolist())
    centres = skin.places[skin.triangles].mean(axis=1)
    kelvin = skin.temperature[skin.triangles].mean(axis=1)
    chosen = np.random.default_rng(3).choice(len(centres), 3000, replace=False)
    eye = Vector(frame.eye)
    hits = [tree.ray_cast(eye, (Vector(centres[index]) - eye).normalized())[2] for index in chosen]
    seen = chosen[np.array([-1 if hit is None else hit for hit in hits]) == chosen]
    assert len(seen) > 500
    x, y = frame.pixels(centres[seen]).astype(int).T
    fraction, off = fractions_of(scale.colour_map, shown[y, x])
    plain = off < 0.02
    wrong = np.abs(scale.low + fraction * (scale.high - scale.low) - kelvin[seen]) / (scale.high - scale.low)
    assert plain.mean() > 0.9
    assert np.quantile(wrong[plain], 0.99) < 0.01


@pytest.mark.slow
@pytest.mark.parametrize("engine", ["WORKBENCH", "EEVEE"])
def test_other_engines_show_the_same_colours(scene, tmp_path: Path, engine: str) -> None:
    """The hottest point is read back, and pixel by pixel the parts and the bar are as with Cycles."""
    part = shown_part(tmp_path, warmest_at(0.12, 0.04, 0.024))
    shown = pixels_of(view.render_picture(scene, [part], tmp_path / "picture.png", engine=engine, size=SIZE))
    usual = pixels_of(view.render_picture(scene, [part], tmp_path / "usual.png", size=SIZE))
    scale = scale_of(scene)
    x, y = view.picture_frame(scene, [part], SIZE).pixels(np.array((0.12, 0.04, 0.024))).astype(int)
    assert read_through_legend(shown, shown[None, y, x], scale.low, scale.high)[0] == pytest.approx(350.0, abs=1.0)
    coloured = fractions_of(scale.colour_map, usual.reshape(-1, 3))[1].reshape(SIZE[::-1]) < 0.02
    assert np.quantile(np.abs(shown - usual)[coloured].max(axis=1), 0.9) < 0.03


def test_a_locked_range_is_read_back_too(scene, tmp_path: Path) -> None:
    part = shown_part(tmp_path, warmest_at(0.12, 0.04, 0.024))
    settings = settings_of(scene)
    settings.range, settings.colour_map = "LOCKED", "batlow"
    settings.low, settings.high = 280.0, 400.0
    shown = pixels_of(view.render_picture(scene, [part], tmp_path / "picture.png", size=SIZE))
    x, y = view.picture_frame(scene, [part], SIZE).pixels(np.array((0.12, 0.04, 0.024))).astype(int)
    assert read_through_legend(shown, shown[None, y, x], 280.0, 400.0)[0] == pytest.approx(350.0, abs=0.02 * 120)


def test_the_parts_keep_clear_of_the_legend_and_the_rim(scene, tmp_path: Path) -> None:
    for size in ((480, 300), (300, 480), (300, 300)):
        for towards_eye in ((0.6, -0.9, 0.5), (0.0, -1.0, 0.0), (0.1, 0.1, 1.0), (1.0, 1.0, -0.5)):
            look_from(towards_eye)
            part = shown_part(tmp_path, warm_at_one_end, location=(5.0, 0.0, 0.0), scale=(3.0, 1.0, 1.0))
            frame = view.picture_frame(scene, [part], size)
            pixels = frame.pixels(skin_of(list(part.children)).places)
            assert (pixels > 0).all()
            assert pixels[:, 0].max() < size[0] - (MARGIN + COLUMN) * min(size) / 100
            assert pixels[:, 1].max() < size[1]
            view.clear(part)


def state_of_host() -> dict[str, Any]:
    scene = bpy.context.scene
    kinds = ("scenes", "objects", "meshes", "materials", "curves", "cameras", "worlds", "fonts", "node_groups")
    return {
        **{kind: sorted(thing.name for thing in getattr(bpy.data, kind)) for kind in kinds},
        "camera": scene.camera,
        "engine": scene.render.engine,
        "size": (scene.render.resolution_x, scene.render.resolution_y),
        "filepath": scene.render.filepath,
        "transform": scene.view_settings.view_transform,
        "hidden": [(thing.name, thing.hide_get(), thing.hide_render) for thing in scene.objects],
    }


def test_nothing_of_the_designers_is_touched(scene, tmp_path: Path) -> None:
    part = shown_part(tmp_path, warm_at_one_end)
    look_from((1.0, -1.0, 1.0))
    settings_of(scene).showing = "PART"
    before = state_of_host()
    made = view.render_picture(scene, [part], tmp_path / "new folder" / "picture.png", size=SIZE)
    assert made.is_file()
    assert state_of_host() == before
    assert pixels_of(made).shape == (300, 480, 3)


def test_a_failed_picture_leaves_nothing_behind(scene, tmp_path: Path, monkeypatch) -> None:
    part = shown_part(tmp_path, warm_at_one_end)
    before = state_of_host()

    def breaks(*_: Any) -> None:
        raise RuntimeError("in the middle")

    monkeypatch.setattr(picture, "write_legend", breaks)
    with pytest.raises(RuntimeError):
        view.render_picture(scene, [part], tmp_path / "picture.png", size=SIZE)
    assert state_of_host() == before
    assert not (tmp_path / "picture.png").exists()


def test_a_place_that_cannot_be_written_is_told_of(scene, tmp_path: Path) -> None:
    part = shown_part(tmp_path, warm_at_one_end)
    (tmp_path / "file").write_text("in the way")
    with pytest.raises(Trouble, match="cannot be written"):
        view.render_picture(scene, [part], tmp_path / "file" / "picture.png", size=(120, 80))


def test_without_a_result_there_is_no_picture(scene, tmp_path: Path) -> None:
    with pytest.raises(Trouble, match="body"):
        view.render_picture(scene, [stand_in("body")], tmp_path / "picture.png")
    with pytest.raises(Trouble):
        view.render_picture(scene, [], tmp_path / "picture.png")


@pytest.mark.slow
@pytest.mark.parametrize("metres_per_unit", [1e-3, 1.0, 1e3])
def test_parts_of_every_size_are_pictured_alike(scene, tmp_path: Path, metres_per_unit: float) -> None:
    """The studio is to the parts' measure: a picture does not depend on the scene's unit, nor on where the part is."""
    scene.unit_settings.scale_length = metres_per_unit
    part = shown_part(tmp_path, warm_at_one_end)
    shown = pixels_of(view.render_picture(scene, [part], tmp_path / "picture.png", size=SIZE))
    scene.unit_settings.scale_length = 1.0
    usual = shown_part(tmp_path, warm_at_one_end)
    expected = pixels_of(view.render_picture(scene, [usual], tmp_path / "usual.png", size=SIZE))
    # The two parts have different names in the title.
    below_title = slice(0, SIZE[1] - 40)
    assert (np.abs(shown - expected)[below_title].max(axis=2) > 0.05).mean() < 0.01


def test_a_single_temperature_and_two_parts(scene, tmp_path: Path) -> None:
    cube = grid_boundary(np.ones((2, 2, 2), bool), np.full(3, 0.01))
    write_made_result(tmp_path / "result", [cube, (cube[0] + (0.03, 0, 0), cube[1])], lambda x, _y, _z: 0 * x + 300.0)
    parts = [stand_in("one"), stand_in("other", location=(0.03, 0.0, 0.0))]
    view.show(scene, parts, tmp_path / "result")
    shown = pixels_of(view.render_picture(scene, parts, tmp_path / "picture.png", size=SIZE))
    middle = srgb_from_linear(scale_of(scene).colours(np.array([300.0])))
    assert (np.linalg.norm(shown - middle, axis=2) < 0.02).mean() > 0.1


def test_a_turntable_shows_the_part_in_one_size_from_all_around(scene, tmp_path: Path, monkeypatch) -> None:
    part, frames = shown_part(tmp_path, warm_at_one_end), []

    def taken(_scene, _parts, path, *, engine, size, frame):
        frames.append(frame)
        return path

    monkeypatch.setattr(picture, "render_picture", taken)
    made = list(view.render_turntable(scene, [part], tmp_path, 8, size=(400, 300)))
    assert [path.name for path in made] == [f"turn {number:03}.png" for number in range(1, 9)]
    places = skin_of([view.result_of(part)]).places
    middle = 0.5 * (places.min(axis=0) + places.max(axis=0))[None]
    around = [frame.axes[2] for frame in frames]
    assert np.ptp([axis[2] for axis in around]) < 1e-12
    turns = np.unwrap([np.arctan2(axis[1], axis[0]) for axis in around])
    np.testing.assert_allclose(np.diff(turns), 2 * np.pi / 8)
    # The eye keeps its distance and the part its place: the vertical through its middle does not move in the picture.
    sizes = [frame.pixel_size(middle)[0] for frame in frames]
    assert np.ptp(sizes) < 0.01 * np.mean(sizes)
    assert np.ptp([frame.pixels(middle)[0] for frame in frames], axis=0).max() < 2.0
    low, right, bottom, top = 0.0, 400.0, 0.0, 300.0
    for frame in frames:
        pixels = frame.pixels(places)
        assert (pixels > (low, bottom)).all() and (pixels < (right, top)).all()


def test_views_are_named_by_their_sides_and_the_caution_can_be_left_out(scene, tmp_path: Path) -> None:
    part = shown_part(tmp_path, warm_at_one_end)
    made = list(view.render_views(scene, [part], tmp_path, ["front", "top"], engine="WORKBENCH", size=(400, 300)))
    assert [path.name for path in made] == ["view front.png", "view top.png"]
    with_caution = pixels_of(made[0])
    view.settings_of(scene).caution = False
    (bare,) = view.render_views(scene, [part], tmp_path, ["front"], engine="WORKBENCH", size=(400, 300))
    different = (np.abs(with_caution - pixels_of(bare)) > 0.02).any(axis=2)
    assert different[:40].any() and not different[40:].any()  # at the foot of the picture, and nowhere else
