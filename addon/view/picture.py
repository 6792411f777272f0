"""The picture: parts in their temperatures, whose every coloured pixel can be read back through the legend.

Surfaces show the plain colours of the legend. Form is given by what reads as something else: edges and outlines in ink,
isotherms at the legend's ticks, and the soft shadow that the parts cast on the ground.
"""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Iterator, Sequence
from pathlib import Path

import bpy
import numpy as np

from ...solver.errors import Trouble
from .arrows import COLOUR, legend_line
from .colours import linear_from_srgb
from .framing import THREE_QUARTER, VIEWS, Frame, framed, looking
from .legend import CAUTION, Legend
from .legend_in_picture import RING, draw_ring, window_for_parts, write_legend
from .lines import drawn_edges, isotherms, outside, ribbons
from .material import SHOWN, Colour, paint
from .result_object import arrows_of, places_and_triangles, read_kelvin, result_of, settle, shown_of, write_kelvin
from .scale import Scale, inked
from .settings import levels_of, material_of, refresh, scale_of, settings_of, words_of
from .skin import Skin, hottest_in_view, skin_of
from .studio import Studio, opened

# Copies of the parts about the vertical that a turntable's frame holds, so that its pictures are of one size.
COPIES = 36

# Seen from lower than this (the sine of the angle) there is no ground to see.
LOWEST = 0.1

# Line widths in hundredths of the picture's shorter side.
OUTLINE, EDGE, ISOTHERM = 0.2, 0.15, 0.1


def _linear(hexadecimal: str) -> Colour:
    return tuple(linear_from_srgb(np.frombuffer(bytes.fromhex(hexadecimal), np.uint8) / 255.0).tolist())


BACKDROP = _linear("efede9")
INK = _linear("1e2228")


def render_picture(
    scene: bpy.types.Scene,
    parts: Sequence[bpy.types.Object],
    path: Path,
    *,
    engine: str | None = None,
    size: tuple[int, int] = (1600, 1000),
    frame: Frame | None = None,
) -> Path:
    """Render the results of ``parts`` with their legend as a PNG of ``size`` pixels at ``path``, and return the path.

    engine: CYCLES, EEVEE or WORKBENCH; None = as the scene's settings have it.
    The view is ``frame``, or else that of the scene's camera, or three-quarter where there is none, moved so that the
    parts fill it. The picture is taken in a scene of its own, and nothing of the designer's is touched. Every engine of
    the host gives the same colours. Cycles needs no window and no graphics library; Workbench is the quickest, and
    leaves out the shadow.
    Raises Trouble when there is no result to show or the picture cannot be rendered or written.
    """
    frame = frame or picture_frame(scene, parts, size)
    refresh(scene)
    results, coloured, scale = _results(parts), material_of(scene), scale_of(scene)
    skin = skin_of(results)
    marked = hottest_in_view(skin, frame)
    in_view, ringed = (None, None) if marked is None else (skin.temperature[marked], frame.pixels(skin.places[marked]))
    ends = (np.nanmin(skin.temperature), np.nanmax(skin.temperature))
    legend = Legend(scale, scale.ticks(), *ends, in_view, words_of(scene), legend_line(scene))
    with (
        tempfile.TemporaryDirectory() as folder,
        opened(frame, engine or settings_of(scene).engine, BACKDROP) as studio,
    ):
        studio.colours[coloured.name] = lambda mesh: scale.colours(read_kelvin(mesh, SHOWN))
        for result in results:
            studio.place(result.data, studio.scaled @ result.matrix_world, coloured)
        if frame.axes[2, 2] > LOWEST and not studio.sees_vertices_alone:
            studio.cast_shadow(skin.places[:, 2].min(), BACKDROP, Path(folder))
        _draw_lines(studio, skin, scale, levels_of(scene), ringed)
        for flow in filter(None, map(arrows_of, parts)):
            studio.draw(*places_and_triangles(flow), studio.scaled, studio.ink(COLOUR))
        title = ", ".join(part.name for part in parts)
        write_legend(studio, title, legend, coloured, INK, CAUTION if settings_of(scene).caution else "")
        if ringed is not None:
            draw_ring(studio, ringed, INK)
        made = Path(folder) / "picture.png"
        studio.render(made)
        return _moved(made, Path(path))


def picture_frame(
    scene: bpy.types.Scene,
    parts: Sequence[bpy.types.Object],
    size: tuple[int, int],
    towards_eye: Sequence[float] | None = None,
) -> Frame:
    """The frame that :func:`render_picture` takes: which pixel shows which place of the world.

    towards_eye: (3,) from the parts; None = as the scene's camera looks, or three-quarter.
    """
    settle(scene)
    if towards_eye is None:
        towards_eye = scene.camera.matrix_world.col[2][:3] if scene.camera else THREE_QUARTER
    return framed(_places(parts), looking(np.array(towards_eye)), size, window_for_parts(size))


def render_views(
    scene: bpy.types.Scene,
    parts: Sequence[bpy.types.Object],
    folder: Path,
    names: Sequence[str],
    *,
    engine: str | None = None,
    size: tuple[int, int] = (1600, 1000),
) -> Iterator[Path]:
    """Render the parts from each of the sides ``names`` of VIEWS, one picture a step, as ``view front.png`` and so on.

    Raises Trouble as :func:`render_picture` does.
    """
    for name in names:
        frame = picture_frame(scene, parts, size, VIEWS[name])
        yield render_picture(scene, parts, folder / f"view {name}.png", engine=engine, size=size, frame=frame)


def render_turntable(
    scene: bpy.types.Scene,
    parts: Sequence[bpy.types.Object],
    folder: Path,
    count: int,
    *,
    engine: str | None = None,
    size: tuple[int, int] = (1600, 1000),
) -> Iterator[Path]:
    """Render the parts from ``count`` places around the vertical, one picture a step, as ``turn 001.png`` and so on.

    Raises Trouble as :func:`render_picture` does.
    """
    settle(scene)
    places = _places(parts)
    low, high = places.min(axis=0), places.max(axis=0)
    middle = 0.5 * (low + high)
    reach = np.linalg.norm(places[:, :2] - middle[:2], axis=1).max()
    angles = 2 * np.pi * np.arange(COPIES) / COPIES
    rim = middle[:2] + reach * np.stack([np.cos(angles), np.sin(angles)], axis=1)
    held = np.concatenate([np.column_stack([rim, np.full(COPIES, height)]) for height in (low[2], high[2])])
    for number in range(count):
        turn = 2 * np.pi * number / count
        across = np.hypot(*THREE_QUARTER[:2])
        start = np.arctan2(THREE_QUARTER[1], THREE_QUARTER[0])
        eye = (across * np.cos(start + turn), across * np.sin(start + turn), THREE_QUARTER[2])
        frame = framed(held, looking(np.array(eye)), size, window_for_parts(size))
        path = folder / f"turn {number + 1:03}.png"
        yield render_picture(scene, parts, path, engine=engine, size=size, frame=frame)


def _places(parts: Sequence[bpy.types.Object]) -> np.ndarray:
    """(P, 3) in the world, of all that has to be in the picture."""
    flows = [places_and_triangles(flow)[0] for flow in filter(None, map(arrows_of, parts))]
    return np.concatenate([skin_of(_results(parts)).places, *flows])


def _results(parts: Sequence[bpy.types.Object]) -> list[bpy.types.Object]:
    lacking = [part.name for part in parts if result_of(part) is None]
    if lacking or not parts:
        raise Trouble("case", f"There is no result to picture of {', '.join(lacking) or 'no part'}.", "Run first.")
    return [shown_of(part) for part in parts]


def _draw_lines(studio: Studio, skin: Skin, scale: Scale, levels: Sequence[float], ringed: np.ndarray | None) -> None:
    """Outlines, edges and isotherms; none of them in the ring about the pixel ``ringed`` (2,)."""
    creases, outlines = drawn_edges(skin.places, skin.triangles, studio.frame.eye)
    curves, at = isotherms(skin.places, skin.triangles, skin.temperature, levels)
    # Inked over the colours in a darker or lighter shade of them, so that lines are seen on all of them.
    shades, inked_scale = studio.new_material(), inked(scale)
    paint(shades, inked_scale)
    studio.colours[shades.name] = lambda mesh: inked_scale.colours(read_kelvin(mesh, SHOWN))
    step = min(studio.frame.size) / 100.0
    for segments, temperature, width, material in (
        (skin.places[outlines], skin.temperature[outlines], OUTLINE, studio.ink(INK)),
        (skin.places[creases], skin.temperature[creases], EDGE, shades),
        (curves, np.stack([at, at], axis=1), ISOTHERM, shades),
    ):
        if ringed is not None:
            segments, which = outside(segments, studio.frame, ringed, RING * step)
            temperature = temperature[which]
        places, triangles = ribbons(segments, studio.frame, width * step)
        mesh = studio.draw(places, triangles, studio.scaled, material)
        write_kelvin(mesh, SHOWN, np.repeat(temperature.mean(axis=1), 4))


def _moved(made: Path, path: Path) -> Path:
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        shutil.move(made, path)
    except OSError as error:
        raise Trouble(
            "case", f"The picture cannot be written to {path}: {error.strerror}.", "Choose another place for it."
        ) from error
    return path
