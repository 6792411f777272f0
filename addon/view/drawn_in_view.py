"""Draws isotherms, and marks at the hottest and coldest place, over the results in the 3D view."""

from __future__ import annotations

from collections.abc import Sequence

import bpy
import numpy as np
from bpy_extras.view3d_utils import location_3d_to_region_2d, region_2d_to_origin_3d
from mathutils import Vector

from ..drawing import Drawings, lifted
from .colours import srgb_from_linear
from .legend_in_view import BRIGHT, FAINT, GROUND, fill_box, fill_ring, text_width, write
from .over_result import Mark, over_results
from .result_object import shown_in
from .scale import inked
from .settings import levels_of, scale_of, settings_of, words_of

# In the host's interface pixels, before its resolution scale.
LINE, RADIUS, RING, INSET, GAP = 1.2, 6, 2, 6, 7
TEXT = 11


def _seen(context: bpy.types.Context) -> list[bpy.types.Object]:
    """The results that are drawn over in this view."""
    if settings_of(context.scene).showing != "RESULT" or not context.space_data.overlay.show_overlays:
        return []
    return [result for result in shown_in(context.scene) if result.visible_get(viewport=context.space_data)]


def _draw_isotherms() -> None:
    import gpu
    from gpu_extras.batch import batch_for_shader

    context = bpy.context
    levels = levels_of(context.scene)
    results = _seen(context) if levels else []
    if not results:
        return
    ink = inked(scale_of(context.scene))
    shader = gpu.shader.from_builtin("POLYLINE_SMOOTH_COLOR")
    gpu.state.blend_set("ALPHA")
    gpu.state.depth_test_set("LESS_EQUAL")
    with gpu.matrix.push_pop_projection():
        gpu.matrix.load_projection_matrix(lifted(gpu.matrix.get_projection_matrix()))
        for result in results:
            drawn = over_results.of(result, levels)
            if not len(drawn.segments):
                continue
            shades = np.column_stack([srgb_from_linear(ink.colours(drawn.level)), np.ones(len(drawn.level))])
            batch = batch_for_shader(
                shader,
                "LINES",
                {"pos": drawn.segments.reshape(-1, 3).astype("f4"), "color": np.repeat(shades, 2, axis=0).astype("f4")},
            )
            with gpu.matrix.push_pop():
                gpu.matrix.multiply_matrix(result.matrix_world)
                shader.uniform_float("viewportSize", gpu.state.viewport_get()[2:])
                shader.uniform_float("lineWidth", LINE * context.preferences.system.ui_scale)
                batch.draw(shader)
    gpu.state.depth_test_set("NONE")
    gpu.state.blend_set("NONE")


def _draw_marks() -> None:
    context = bpy.context
    if not settings_of(context.scene).marks:
        return
    found = [(result, over_results.of(result, levels_of(context.scene))) for result in _seen(context)]
    if not found:
        return
    words = words_of(context.scene)
    ends = (
        (words.highest, *max(((result, over.hottest) for result, over in found), key=lambda one: one[1].temperature)),
        (words.lowest, *min(((result, over.coldest) for result, over in found), key=lambda one: one[1].temperature)),
    )
    unit, taken = scale_of(context.scene).unit, list[np.ndarray]()
    for name, result, mark in ends:
        pixel, faces_eye = _place_in_view(context, result, mark)
        if pixel is not None:
            _draw_mark(context, pixel, f"{name} {unit.text(mark.temperature)}", BRIGHT if faces_eye else FAINT, taken)


def _place_in_view(context: bpy.types.Context, result: bpy.types.Object, mark: Mark) -> tuple[np.ndarray | None, bool]:
    """The pixel (2,) of a mark, None beyond the view, and whether its surface looks at the eye."""
    world = result.matrix_world @ Vector(mark.place)
    seen = location_3d_to_region_2d(context.region, context.region_data, world)
    if seen is None or not (0 <= seen.x < context.region.width and 0 <= seen.y < context.region.height):
        return None, False
    eye = region_2d_to_origin_3d(context.region, context.region_data, seen)
    turned = result.matrix_world.to_3x3().inverted_safe().transposed()
    return np.array(seen), (turned @ Vector(mark.normal)).dot(eye - world) > 0


def _draw_mark(
    context: bpy.types.Context, pixel: np.ndarray, text: str, colour: Sequence[float], taken: list[np.ndarray]
) -> None:
    """A ring and a label beside it."""
    scale = context.preferences.system.ui_scale
    fill_ring(pixel, RADIUS * scale, (RADIUS + RING + 1) * scale, GROUND)
    fill_ring(pixel, RADIUS * scale, (RADIUS + RING) * scale, colour)
    draw_label(context, pixel, text, colour, taken)


def draw_label(
    context: bpy.types.Context, pixel: np.ndarray, text: str, colour: Sequence[float], taken: list[np.ndarray]
) -> None:
    """A label beside a pixel (2,), below whatever of ``taken`` (each left, bottom, right, top) is in its way."""
    scale = context.preferences.system.ui_scale
    size = np.array((text_width(text, TEXT * scale) + 2 * INSET * scale, 2 * TEXT * scale))
    corner = pixel + np.array((RADIUS + GAP, -TEXT)) * scale
    if corner[0] + size[0] > context.region.width:
        corner[0] = pixel[0] - (RADIUS + GAP) * scale - size[0]
    for box in taken:
        if (corner < box[2:]).all() and (corner + size > box[:2]).all():
            corner[1] = box[1] - size[1] - scale
    taken.append(np.concatenate([corner, corner + size]))
    fill_box(corner, size, GROUND)
    write(text, corner + np.array((INSET, TEXT * 0.64)) * scale, TEXT * scale, colour)


drawings = Drawings(POST_VIEW=_draw_isotherms, POST_PIXEL=_draw_marks)


def register() -> None:
    drawings.start()


def unregister() -> None:
    drawings.stop()
    over_results.forget()
