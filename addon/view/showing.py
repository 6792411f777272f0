"""What stands in the scene: parts or results, and how Solid shading shows them."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from typing import Any

import bpy

from .result_object import arrows_of, part_of, results_in, settle, shown_of

# Solid shading in the results' own colours: no light on them, and form from the drawn ridges and valleys.
TRUE_SOLID = {"color_type": "VERTEX", "light": "FLAT", "show_cavity": True, "cavity_type": "SCREEN"}


def apply_showing(scene: bpy.types.Scene) -> None:
    """Hide the parts beneath their results or the results over their parts; other objects stay as they are."""
    settle(scene)  # what has just been made is in no view layer yet, and could not be hidden
    settings, results = scene.fluxface_view, results_in(scene)
    shown = settings.showing == "RESULT"
    for result in results:
        part = part_of(result)
        for object_ in {result, shown_of(part)}:
            _hide(scene, object_, not shown or object_ != shown_of(part))
        if arrows_of(part):
            _hide(scene, arrows_of(part), not shown)
        _hide(scene, part, shown)
    if results and shown:
        _colour_solid_views(settings)
    else:
        _restore_solid_views(settings)


def reveal(scene: bpy.types.Scene, part: bpy.types.Object) -> None:
    _hide(scene, part, False)


def _hide(scene: bpy.types.Scene, object_: bpy.types.Object, hidden: bool) -> None:
    object_.hide_render = hidden
    for layer in scene.view_layers:
        if object_.name in layer.objects:
            object_.hide_set(hidden, view_layer=layer)


def _colour_solid_views(settings: bpy.types.PropertyGroup) -> None:
    """Set Solid shading to the true colours, except where it shows colours already in a way the designer chose."""
    before = json.loads(settings.solid_before or "{}")
    for view, shading in _shadings():
        if shading.color_type != TRUE_SOLID["color_type"]:
            before[view] = {name: getattr(shading, name) for name in TRUE_SOLID}
            _set(shading, TRUE_SOLID)
    settings.solid_before = json.dumps(before)


def _restore_solid_views(settings: bpy.types.PropertyGroup) -> None:
    before = json.loads(settings.solid_before or "{}")
    for view, shading in _shadings():
        if view in before and shading.color_type == TRUE_SOLID["color_type"]:
            _set(shading, before[view])
    settings.solid_before = ""


def _set(shading: bpy.types.View3DShading, values: Mapping[str, Any]) -> None:
    for name, value in values.items():
        setattr(shading, name, value)


def _shadings() -> Iterator[tuple[str, bpy.types.View3DShading]]:
    """The shading of every 3D view of the file, with a name for it that lasts as long as the layout of the screen."""
    for screen in bpy.data.screens:
        for place, area in enumerate(screen.areas):
            yield from ((f"{screen.name}/{place}", space.shading) for space in area.spaces if space.type == "VIEW_3D")
