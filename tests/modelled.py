"""Parts modelled in the host for tests: blocks whose faces are named by where they look. Invented, no product."""

from __future__ import annotations

import time
from collections.abc import Sequence

import bpy
import numpy as np
from fluxface.addon import live, tags
from fluxface.addon.properties import TagDefinition

# Corner numbers of a block's faces, outward, and the direction each looks in.
CORNERS = [(x, y, z) for x in (-0.5, 0.5) for y in (-0.5, 0.5) for z in (-0.5, 0.5)]
SIDES = {
    "-x": (0, 1, 3, 2),
    "+x": (4, 6, 7, 5),
    "-y": (0, 4, 5, 1),
    "+y": (2, 3, 7, 6),
    "-z": (0, 2, 6, 4),
    "+z": (1, 5, 7, 3),
}


def block(
    name: str = "block", size: Sequence[float] = (0.08, 0.06, 0.02), at: Sequence[float] = (0.0, 0.0, 0.0)
) -> bpy.types.Object:
    """A closed block of aluminium, in scene units, and the active object."""
    mesh = bpy.data.meshes.new(name)
    mesh.from_pydata([tuple(np.multiply(corner, size)) for corner in CORNERS], [], list(SIDES.values()))
    part = bpy.data.objects.new(name, mesh)
    part.location = at
    part.fluxface.material.name = "aluminium 6061-T6"
    bpy.context.scene.collection.objects.link(part)
    bpy.context.view_layer.objects.active = part
    bpy.context.view_layer.update()
    return part


def side(part: bpy.types.Object, *directions: str) -> np.ndarray:
    """(F,) bool, the faces of a block that look in the directions."""
    return np.isin(np.arange(len(part.data.polygons)), [list(SIDES).index(direction) for direction in directions])


def tag(scene: bpy.types.Scene, part: bpy.types.Object, name: str, faces: np.ndarray) -> TagDefinition:
    """A new tag with those faces."""
    made = tags.new(scene, name)
    tags.give(part.data, faces, made.uid)
    tags.keep_copies(scene, part.data)
    return scene.fluxface.tags[name]


def lamp(scene: bpy.types.Scene) -> bpy.types.Object:
    """A block with 12 W under it and air at 25 °C on all its other faces."""
    part = block("lamp")
    pad = tag(scene, part, "pad", side(part, "-z"))
    pad.use_heat, pad.heat = True, 12.0
    skin = tag(scene, part, "skin", ~side(part, "-z"))
    skin.use_convection, skin.coefficient, skin.ambient = True, 8.0, 298.15
    # Coarse, so that a run takes little time.
    scene.fluxface.order, scene.fluxface.size = "1", 0.02
    return part


def select(part: bpy.types.Object, faces: np.ndarray) -> None:
    """Enter edit mode with exactly those faces selected."""
    bpy.context.view_layer.objects.active = part
    if part.mode != "EDIT":
        bpy.ops.object.mode_set(mode="EDIT")
    bpy.context.tool_settings.mesh_select_mode = (False, False, True)
    bpy.ops.mesh.select_all(action="DESELECT")
    tags.select(part.data, faces)


HOT, COLD = 350.0, 300.0


def wall(along: str, at: Sequence[float] = (0.0, 0.0, 0.0)) -> bpy.types.Object:
    """A block held at COLD and HOT at its two ends along an axis, between which the temperature runs straight."""
    part = block("wall", at=at)
    for way, kelvin in (("+" + along, HOT), ("-" + along, COLD)):
        end = tag(bpy.context.scene, part, way, side(part, way))
        end.use_temperature, end.temperature = True, kelvin
    return part


def ready() -> None:
    """What the clock of a window would see to."""
    for _ in range(1000):
        if live.live.look() is None:
            return
        time.sleep(0.02)
    raise AssertionError("the responses did not come")
