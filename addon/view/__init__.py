"""How a result is seen: the result object in its colours, the legend, and the picture."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import bpy

from . import drawn_in_view, legend_in_view, settings, showing
from .framing import VIEWS
from .picture import picture_frame, render_picture, render_turntable, render_views
from .result_object import (
    PLANE,
    arrows_of,
    build_results,
    part_of,
    placing,
    remove_result,
    result_of,
    settle,
    shown_of,
    world_box,
)
from .settings import (
    TRUE_TRANSFORM,
    end_difference,
    material_of,
    recolour,
    refresh,
    refresh_cut,
    scale_of,
    settings_of,
    share_range,
    show_difference,
)
from .showing import apply_showing

__all__ = [
    "PLANE",
    "TRUE_TRANSFORM",
    "VIEWS",
    "apply_showing",
    "arrows_of",
    "clear",
    "end_difference",
    "has_result",
    "part_of",
    "picture_frame",
    "placing",
    "recolour",
    "refresh_cut",
    "register",
    "render_picture",
    "render_turntable",
    "render_views",
    "result_of",
    "scale_of",
    "settings_of",
    "settle",
    "share_range",
    "show",
    "show_difference",
    "shown_of",
    "unregister",
    "world_box",
]


def show(scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], result_folder: Path) -> list[bpy.types.Object]:
    """Show the result on its parts (in the order of the case): one result object each, replacing an older one.

    A part that is being edited stays in sight, and its result waits behind the switch between the two.
    Raises Trouble when the result cannot be read or does not fit the parts; what was shown is still shown then.
    """
    results = build_results(scene, parts, result_folder, material_of(scene))
    settings_of(scene).compared, settings_of(scene).live = "", False
    refresh(scene)
    settings_of(scene).showing = "RESULT" if all(part.mode == "OBJECT" for part in parts) else "PART"
    return results


def has_result(part: bpy.types.Object) -> bool:
    return result_of(part) is not None


def clear(part: bpy.types.Object) -> None:
    """Remove the part's result object, if there is one, and bring the part back in sight."""
    result = result_of(part)
    if result is None:
        return
    scenes = part.users_scene
    for shown in {result, shown_of(part), arrows_of(part)} - {None}:
        remove_result(shown)
    for scene in scenes:
        showing.reveal(scene, part)
        apply_showing(scene)
        refresh(scene)


def register() -> None:
    settings.register()
    legend_in_view.register()
    drawn_in_view.register()


def unregister() -> None:
    drawn_in_view.unregister()
    legend_in_view.unregister()
    settings.unregister()
