"""What a designer does by hand, done from a script: the same settings, and the same buttons pressed."""

from __future__ import annotations

import bpy
import numpy as np
from mathutils import Vector


def celsius(degrees: float) -> float:
    """Kelvin, as the add-on's settings hold temperatures."""
    return degrees + 273.15


def open_empty_file(metres_per_unit: float) -> None:
    """An empty file in millimetres and degrees Celsius."""
    bpy.ops.wm.read_factory_settings(use_empty=True)
    units = bpy.context.scene.unit_settings
    units.system, units.scale_length = "METRIC", metres_per_unit
    units.length_unit, units.temperature_unit = "MILLIMETERS", "CELSIUS"


def choose_material(part: bpy.types.Object, name: str) -> None:
    """Pick a material of the library by its name."""
    part.fluxface.material.name = name


def tag_faces(part: bpy.types.Object, name: str, faces: np.ndarray, **terms: float) -> None:
    """Select ``faces`` (polygons,) bool, press New Tag, and switch on the terms given.

    terms: ``heat`` W, ``heat_flux`` W/m2, ``temperature`` K, or ``coefficient`` W/(m2 K) with ``ambient`` K.
    """
    bpy.context.view_layer.objects.active = part
    part.select_set(True)
    part.data.polygons.foreach_set("select", faces)
    part.data.update()
    bpy.ops.fluxface.tag_new(name=name)
    tag = bpy.context.scene.fluxface.tags[-1]
    for term, value in terms.items():
        setattr(tag, term, value)
    for switch in {"convection" if term in ("coefficient", "ambient") else term for term in terms}:
        setattr(tag, f"use_{switch}", True)


THREE_QUARTER = Vector((0.62, -0.90, 0.55))  # from the part to the eye

Look = tuple[str, tuple[float, float, float], float]  # name, linear colour, roughness


def paint(part: bpy.types.Object, looks: list[Look], slot: np.ndarray) -> None:
    """Give the part surface materials and each face the one numbered in ``slot`` (polygons,)."""
    for name, colour, roughness in looks:
        look = bpy.data.materials.new(name)
        look.diffuse_color, look.roughness, look.metallic = (*colour, 1.0), roughness, 0.6
        part.data.materials.append(look)
    part.data.polygons.foreach_set("material_index", slot.astype(np.int32))


def look_at(part: bpy.types.Object) -> None:
    """Turn the file's 3D views to the part, so that it is in sight when the file is opened."""
    corners = np.array([part.matrix_world @ Vector(corner) for corner in part.bound_box])
    size = float(np.linalg.norm(np.ptp(corners, axis=0)))
    for space in (space for screen in bpy.data.screens for area in screen.areas for space in area.spaces):
        if space.type == "VIEW_3D":
            space.region_3d.view_location, space.region_3d.view_distance = corners.mean(axis=0), 1.6 * size
            space.region_3d.view_rotation = THREE_QUARTER.to_track_quat("Z", "Y")
            space.clip_start, space.clip_end = 1e-3 * size, 1e3 * size
