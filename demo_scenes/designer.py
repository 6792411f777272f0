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


# The switch that a setting of a tag belongs to, where it is not called after it.
SWITCH_OF = {
    "coefficient": "convection",
    "film": "convection",
    "ambient": "convection",
    "emissivity": "radiation",
    "surroundings": "radiation",
}


def tag_faces(part: bpy.types.Object, name: str, faces: np.ndarray, **terms: float | str) -> None:
    """Select ``faces`` (polygons,) bool, press New Tag, and switch on the terms given.

    terms: ``heat`` W, ``heat_flux`` W/m2, ``temperature`` K; ``coefficient`` W/(m2 K) or ``film`` by name, with
    ``ambient`` K; ``emissivity`` with ``surroundings`` K.
    """
    for thing in bpy.context.selected_objects:
        thing.select_set(False)
    bpy.context.view_layer.objects.active = part
    part.select_set(True)
    part.data.polygons.foreach_set("select", faces)
    part.data.update()
    bpy.ops.fluxface.tag_new(name=name)
    tag = bpy.context.scene.fluxface.tags[-1]
    for term, value in terms.items():
        setattr(tag, term, value)
    for switch in {SWITCH_OF.get(term, term) for term in terms}:
        setattr(tag, f"use_{switch}", True)


THREE_QUARTER = Vector((0.62, -0.90, 0.55))  # from the part to the eye


def place_camera(direction: tuple[float, float, float]) -> None:
    """A camera that looks at the parts from ``direction``; pictures take its angle and frame the parts themselves."""
    made = bpy.data.objects.new("Camera", bpy.data.cameras.new("Camera"))
    made.location = 400.0 * Vector(direction)
    made.rotation_euler = Vector(direction).to_track_quat("Z", "Y").to_euler()
    bpy.context.scene.collection.objects.link(made)
    bpy.context.scene.camera = made


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
