"""Places on a part that something is said about: their faces selected and brought into view."""

from __future__ import annotations

from collections.abc import Sequence

import bpy
import numpy as np
from mathutils import Vector
from mathutils.bvhtree import BVHTree

from . import tags, view
from .units import metres_per_unit


def enter_edit_mode(context: bpy.types.Context, part: bpy.types.Object) -> None:
    """With the part in sight and active, and no face selected."""
    view.settings_of(context.scene).showing = "PART"
    if part.mode != "EDIT":
        if context.mode != "OBJECT":
            bpy.ops.object.mode_set(mode="OBJECT")
        context.view_layer.objects.active = part
        bpy.ops.object.mode_set(mode="EDIT")
    context.tool_settings.mesh_select_mode = (False, False, True)
    bpy.ops.mesh.select_all(action="DESELECT")


def show(
    context: bpy.types.Context, part: bpy.types.Object, faces: Sequence[int], points: Sequence[Sequence[float]]
) -> None:
    """Select the faces, numbered as modifiers left them, and bring them into view; points: m, in the world."""
    metres = metres_per_unit(context.scene)
    if len(points):
        context.scene.cursor.location = Vector(points[0]) / metres
    chosen = modelled_faces(context, part, np.asarray(faces, int), np.asarray(points, float).reshape(-1, 3) / metres)
    if not len(chosen):
        return
    enter_edit_mode(context, part)
    tags.select(part.data, np.isin(np.arange(len(tags.read(part.data))), chosen))
    for area in context.screen.areas if context.screen and not bpy.app.background else ():
        if area.type == "VIEW_3D":
            region = next(region for region in area.regions if region.type == "WINDOW")
            with context.temp_override(area=area, region=region):
                bpy.ops.view3d.view_selected()


def modelled_faces(
    context: bpy.types.Context, part: bpy.types.Object, faces: np.ndarray, points: np.ndarray
) -> np.ndarray:
    """The faces of the part's own mesh that ``faces`` of its evaluated one are, or else those nearest to ``points``.

    Where modifiers make faces, numbers do not tell which face they were made of. points: (P, 3) world, scene units.
    """
    count = len(tags.read(part.data))
    evaluated = part.evaluated_get(context.evaluated_depsgraph_get()).data
    if not part.modifiers or len(evaluated.polygons) == count:
        return faces[faces < count]
    if part.data.is_editmode:
        part.update_from_editmode()
    mesh = part.data
    tree = BVHTree.FromPolygons(
        [vertex.co for vertex in mesh.vertices], [tuple(polygon.vertices) for polygon in mesh.polygons]
    )
    inverse = part.matrix_world.inverted_safe()
    return np.unique([tree.find_nearest(inverse @ Vector(point))[2] for point in points])
