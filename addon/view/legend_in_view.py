"""The legend in the 3D view: a card drawn over it while results show."""

from __future__ import annotations

from collections.abc import Sequence

import bpy
import numpy as np

from ..drawing import Drawings
from .arrows import legend_line
from .colours import colours_at, srgb_from_linear
from .legend import Legend
from .result_object import shown_in
from .settings import TRUE_TRANSFORM, scale_of, settings_of, words_of
from .showing import TRUE_SOLID

# Measures in the host's interface pixels, before its resolution scale.
CARD = (172, 316)
INSET, FROM_EDGE = 16, 24
BAR_WIDTH, BAR_BOTTOM, BAR_HEIGHT, TICK = 16, 74, 152, 5
VALUE, LABEL, SMALL = 17, 11, 10
# Where figures begin, beside their label.
FIGURES = 54
STEPS = 128

GROUND = (0.10, 0.105, 0.115, 0.88)
BRIGHT = (0.94, 0.94, 0.93, 1.0)
FAINT = (0.66, 0.67, 0.68, 1.0)


def _draw() -> None:
    context = bpy.context
    scene, settings = context.scene, settings_of(context.scene)
    if not (settings.legend and settings.showing == "RESULT" and context.space_data.overlay.show_overlays):
        return
    if not any(result.visible_get() for result in shown_in(scene)):
        return
    scale = scale_of(scene)
    legend = Legend(scale, scale.ticks(), settings.coldest, settings.hottest, words=words_of(scene))
    pixel = context.preferences.system.ui_scale
    sidebar = next(region for region in context.area.regions if region.type == "UI")
    right = context.region.width - (sidebar.width if context.preferences.system.use_region_overlap else 0)
    if right < CARD[0] * pixel or context.region.height < (CARD[1] + 2 * FROM_EDGE) * pixel:
        return
    corner = np.array((right - (CARD[0] + FROM_EDGE) * pixel, FROM_EDGE * pixel))
    draw_card(legend, corner, pixel, _remark(context) or legend_line(scene))


def _remark(context: bpy.types.Context) -> str:
    """What keeps the colours in view from being those of the legend, if anything does."""
    shading = context.space_data.shading
    if shading.type == "SOLID" and shading.color_type != TRUE_SOLID["color_type"]:
        return "Solid is set to other colours"
    if shading.type == "SOLID":
        return "" if shading.light == TRUE_SOLID["light"] else "Light and shade are added"
    transform = context.scene.view_settings.view_transform
    return "" if transform == TRUE_TRANSFORM else f"{transform} shifts the colours"


def draw_card(legend: Legend, corner: np.ndarray, pixel: float, remark: str) -> None:
    """Draw the legend with its lower left ``corner`` (2,) there; ``pixel`` is the size of an interface pixel."""
    text = legend.scale.unit.text
    spare = 0 if remark else INSET + 4
    corner = corner - (0, spare * pixel)
    bar_top = BAR_BOTTOM + BAR_HEIGHT

    def say(words: str, x: float, y: float, size: float, colour: Sequence[float] = BRIGHT) -> None:
        write(words, corner + np.array((x, y)) * pixel, size * pixel, colour)

    def fill(places: Sequence[Sequence[float]], colours: Sequence[Sequence[float]]) -> None:
        _fill(corner + np.array(places, dtype=float) * pixel, colours)

    fill(_box(0, spare, CARD[0], CARD[1] - spare), [GROUND] * 4)
    fits = min(1.0, (CARD[0] - 2 * INSET) * pixel / max(text_width(legend.heading, LABEL * pixel), 1.0))
    say(legend.heading, INSET, CARD[1] - INSET - LABEL, LABEL * fits, FAINT)
    words = legend.words
    for label, kelvin, height in ((words.highest, legend.hottest, bar_top + 24), (words.lowest, legend.coldest, 42)):
        say(label, INSET, height, LABEL, FAINT)
        say(text(kelvin), INSET + FIGURES, height, VALUE)
    say(remark, INSET, INSET, SMALL, FAINT)

    heights = np.linspace(BAR_BOTTOM, bar_top, STEPS)
    shades = srgb_from_linear(colours_at(legend.scale.colour_map, np.linspace(0.0, 1.0, STEPS)))
    shades = np.column_stack([shades, np.ones(STEPS)])
    strip = np.stack([np.stack([np.full(STEPS, x), heights], axis=1) for x in (INSET, INSET + BAR_WIDTH)], axis=1)
    fill(strip.reshape(-1, 2), np.repeat(shades, 2, axis=0))
    below, above = legend.ends_open
    for is_open, end, way, shade in ((below, BAR_BOTTOM, -1, shades[0]), (above, bar_top, 1, shades[-1])):
        if is_open:
            tip = (INSET + BAR_WIDTH / 2, end + way * 0.6 * BAR_WIDTH)
            fill([(INSET, end), (INSET + BAR_WIDTH, end), tip], [shade] * 3)
    beside = INSET + BAR_WIDTH + 4
    for tick in legend.ticks:
        height = BAR_BOTTOM + tick.fraction * BAR_HEIGHT
        fill(_box(beside, height - 0.5, TICK, 1), [FAINT] * 4)
        say(tick.label, beside + TICK + 5, height - 0.36 * LABEL, LABEL)


def _box(left: float, bottom: float, width: float, height: float) -> list[tuple[float, float]]:
    right, top = left + width, bottom + height
    return [(left, bottom), (right, bottom), (left, top), (right, top)]


def fill_box(corner: np.ndarray, size: np.ndarray, colour: Sequence[float]) -> None:
    """A rectangle of one colour from its lower left ``corner`` (2,) on, both in pixels."""
    _fill(corner + np.array(_box(0, 0, *size)), [colour] * 4)


def fill_ring(middle: np.ndarray, inner: float, outer: float, colour: Sequence[float], steps: int = 32) -> None:
    """A ring of one colour about ``middle`` (2,), all in pixels."""
    angle = np.linspace(0.0, 2 * np.pi, steps + 1)
    circle = np.stack([np.cos(angle), np.sin(angle)], axis=1)
    strip = np.stack([inner * circle, outer * circle], axis=1).reshape(-1, 2)
    _fill(middle + strip, [colour] * len(strip))


def text_width(words: str, size: float) -> float:
    import blf

    blf.size(0, size)
    return blf.dimensions(0, words)[0]


def _fill(places: np.ndarray, colours: Sequence[Sequence[float]]) -> None:
    """A strip of triangles through ``places`` (P, 2) with sRGB colours (P, 4)."""
    import gpu  # not before there is a window to draw in
    from gpu_extras.batch import batch_for_shader

    shader = gpu.shader.from_builtin("SMOOTH_COLOR")
    batch = batch_for_shader(shader, "TRI_STRIP", {"pos": np.float32(places), "color": np.float32(colours)})
    gpu.state.blend_set("ALPHA")
    batch.draw(shader)
    gpu.state.blend_set("NONE")


def write(words: str, pixel: np.ndarray, size: float, colour: Sequence[float]) -> None:
    import blf

    blf.size(0, size)
    blf.color(0, *colour)
    blf.position(0, *pixel, 0)
    blf.draw(0, words)


drawings = Drawings(POST_PIXEL=_draw)


def register() -> None:
    drawings.start()


def unregister() -> None:
    drawings.stop()
