"""The legend in the picture: set in the same render and the same material, so that its colours are the parts' own."""

from __future__ import annotations

import bpy
import numpy as np

from .legend import Legend
from .material import SHOWN, Colour
from .result_object import write_kelvin
from .studio import Studio

# All measures are hundredths of the picture's shorter side.
MARGIN, COLUMN = 5.0, 16.0
BAR_WIDTH, BAR_BOTTOM, BAR_TOP = 2.6, 24.0, 24.0
TITLE, VALUE, LABEL, SMALL = 4.0, 3.4, 2.0, 1.6
TICK, LINE = 0.9, 0.16
# Where vertices alone are coloured, what lies between two is a blend: of so many it cannot be told from the map.
BAR_ROWS = 128

# About the hottest place in view; nothing else is drawn inside it.
RING, RING_LINE = 1.3, 0.28

GREY: Colour = (0.14, 0.15, 0.16)

# How high figures stand, as a share of the size of the letters.
FIGURE = 0.72


def window_for_parts(size: tuple[int, int]) -> tuple[float, float, float, float]:
    """Left, bottom, right and top of where the parts are shown, in pixels; the legend keeps out of it."""
    step = min(size) / 100.0
    width, height = size
    return MARGIN * step, (MARGIN + 5.0) * step, width - (MARGIN + COLUMN + 2.0) * step, height - (MARGIN + 9.0) * step


def write_legend(
    studio: Studio, title: str, legend: Legend, coloured: bpy.types.Material, ink: Colour, caution: str
) -> None:
    """Title and heading, the bar with its ticks, the hottest and coldest surface, and the caution if there is one.

    coloured: the material of the parts.
    """
    step = min(studio.frame.size) / 100.0
    width, height = (pixels / step for pixels in studio.frame.size)
    left = width - MARGIN - COLUMN
    bottom, top = BAR_BOTTOM, height - BAR_TOP
    dark, grey = studio.ink(ink), studio.ink(GREY)

    def write(text: str, x: float, y: float, size: float, material: bpy.types.Material, widest: float = COLUMN) -> None:
        studio.write(text, (x * step, y * step), size * step, material, widest * step)

    across = left - 2 * MARGIN
    write(title, MARGIN, height - MARGIN - TITLE * FIGURE, TITLE, dark, across)
    write(legend.heading, MARGIN, height - MARGIN - TITLE * FIGURE - 3.6, LABEL, grey, across)
    if caution:
        write(caution, MARGIN, MARGIN, SMALL, grey, width - 2 * MARGIN)

    text = legend.scale.unit.text
    write(f"{legend.words.highest} {legend.words.of}", left, top + 7.6, LABEL, grey)
    write(text(legend.hottest), left, top + 3.6, VALUE, dark)
    write(f"{legend.words.lowest} {legend.words.of}", left, bottom - 5.0, LABEL, grey)
    write(text(legend.coldest), left, bottom - 9.0, VALUE, dark)

    if legend.in_view is not None:
        draw_ring(studio, np.array((left + RING + RING_LINE, bottom - 12.6)) * step, ink)
        same = text(legend.in_view) == text(legend.hottest)
        label = f"{legend.words.highest.lower()} in view" if same else f"{text(legend.in_view)} in view"
        write(label, left + 2 * RING + 1.6, bottom - 13.3, LABEL, grey, COLUMN - 2 * RING - 1.6)

    write(legend.arrows, left, bottom - 16.4, LABEL, grey)
    _draw_bar(studio, legend, np.array((left, left + BAR_WIDTH)) * step, np.array((bottom, top)) * step, coloured)
    beside = left + BAR_WIDTH
    heights = [bottom + tick.fraction * (top - bottom) for tick in legend.ticks]
    marks = [rectangle(beside + 0.4, y - LINE / 2, beside + 0.4 + TICK, y + LINE / 2) for y in heights]
    for tick, y in zip(legend.ticks, heights, strict=True):
        write(tick.label, beside + 2.0, y - 0.5 * FIGURE * LABEL, LABEL, dark)
    places, triangles = joined(marks)
    studio.draw(places * step, triangles, studio.pane, dark)


def _draw_bar(
    studio: Studio, legend: Legend, across: np.ndarray, along: np.ndarray, coloured: bpy.types.Material
) -> None:
    """The bar between pixels ``across`` (2,) and ``along`` (2,), pointed at an end beyond which surfaces lie."""
    (left, right), (bottom, top) = across, along
    middle, point = (left + right) / 2, 0.7 * (right - left)
    below, above = (point * is_open for is_open in legend.ends_open)
    low, high = legend.scale.low, legend.scale.high
    share = np.linspace(0.0, 1.0, BAR_ROWS)
    rows = np.stack([np.tile((left, right), BAR_ROWS), np.repeat(bottom + share * (top - bottom), 2)], axis=1)
    places = np.pad(np.concatenate([[(middle, bottom - below)], rows, [(middle, top + above)]]), ((0, 0), (0, 1)))
    starts = 1 + 2 * np.arange(BAR_ROWS - 1)[:, None, None]
    quads = (starts + np.array([[0, 1, 3], [0, 3, 2]])).reshape(-1, 3)
    last = len(places) - 1
    mesh = studio.draw(places, np.concatenate([quads, [[0, 2, 1], [last - 2, last - 1, last]]]), studio.pane, coloured)
    write_kelvin(mesh, SHOWN, np.concatenate([[low], np.repeat(low + share * (high - low), 2), [high]]))


def draw_ring(studio: Studio, pixel: np.ndarray, ink: Colour) -> None:
    """The mark of the hottest surface in view, about a pixel (2,)."""
    step = min(studio.frame.size) / 100.0
    places, triangles = ring(RING * step, (RING + RING_LINE) * step)
    studio.draw(places + np.append(pixel, 0.0), triangles, studio.pane, studio.ink(ink))


def rectangle(left: float, bottom: float, right: float, top: float) -> tuple[np.ndarray, np.ndarray]:
    places = np.array([(left, bottom, 0), (right, bottom, 0), (right, top, 0), (left, top, 0)])
    return places, np.array([[0, 1, 2], [0, 2, 3]])


def ring(inner: float, outer: float, count: int = 64) -> tuple[np.ndarray, np.ndarray]:
    """A ring about the origin: places (2 count, 3), triangles (2 count, 3)."""
    angle = 2 * np.pi * np.arange(count) / count
    circle = np.stack([np.cos(angle), np.sin(angle), np.zeros(count)], axis=1)
    here, there = np.arange(count), np.roll(np.arange(count), -1)
    quads = np.stack([here, here + count, there + count, here, there + count, there], axis=1)
    return np.concatenate([inner * circle, outer * circle]), quads.reshape(-1, 3)


def joined(shapes: list[tuple[np.ndarray, np.ndarray]]) -> tuple[np.ndarray, np.ndarray]:
    """Several shapes of places and triangles as one."""
    starts = np.cumsum([0] + [len(places) for places, _ in shapes])
    places = np.concatenate([np.zeros((0, 3)), *(places for places, _ in shapes)])
    triangles = [triangles + start for (_, triangles), start in zip(shapes, starts, strict=False)]
    return places, np.concatenate([np.zeros((0, 3), dtype=int), *triangles])
