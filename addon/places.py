"""Places on a part that something is said about: their faces selected and brought into view."""

from __future__ import annotations

from collections.abc import Sequence

import bpy
import numpy as np
from mathutils import Vector
from mathutils.bvhtree import BVHTree

from . import host, tags, view
from .units import metres_per_unit

# Of the part's diagonal: what is looked at around a place, and how far a place may be from the face it lies on.
AROUND, UPON = 0.1, 1e-4
ELSEWHERE = "Modifiers make these faces: the view and the 3D cursor are at their place"


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
) -> bool:
    """Bring the view and the 3D cursor to the points and select the faces; False where the mesh has no such faces.

    faces: numbered as modifiers left them. points: m, in the world.
    """
    there = np.asarray(points, float).reshape(-1, 3) / metres_per_unit(context.scene)
    if len(there):
        context.scene.cursor.location = there[0]
        host.bring_in_view(there, AROUND * part.dimensions.length)
    if context.mode != "OBJECT":
        bpy.ops.object.mode_set(mode="OBJECT")
    if not len(faces):
        return True
    chosen = _modelled_faces(part, context.evaluated_depsgraph_get(), np.asarray(faces, int), there)
    if not len(chosen):
        return False
    enter_edit_mode(context, part)
    tags.select(part.data, np.isin(np.arange(len(part.data.polygons)), chosen))
    return True


def _modelled_faces(
    part: bpy.types.Object, depsgraph: bpy.types.Depsgraph, faces: np.ndarray, places: np.ndarray
) -> np.ndarray:
    """The faces of the part's own mesh that ``faces`` of its evaluated one are, or else those that ``places`` lie on.

    Where modifiers make faces, numbers do not tell which face they were made of. places: (P, 3) world, scene units.
    """
    evaluated = part.evaluated_get(depsgraph)
    mesh = evaluated.to_mesh()
    try:
        if np.array_equal(_corners(mesh), _corners(part.data)):
            return faces
    finally:
        evaluated.to_mesh_clear()
    own, inverse = part.data, part.matrix_world.inverted_safe()
    tree = BVHTree.FromPolygons(
        [vertex.co for vertex in own.vertices], [tuple(polygon.vertices) for polygon in own.polygons]
    )
    reach = UPON * max(part.dimensions.length, 1e-30)
    near = [tree.find_nearest(inverse @ Vector(place), reach)[2] for place in places]
    return np.unique([face for face in near if face is not None]).astype(int)


def _corners(mesh: bpy.types.Mesh) -> np.ndarray:
    """The corners of all polygons in a row, and where each polygon begins among them."""
    corners, starts = np.empty(len(mesh.loops), np.int32), np.empty(len(mesh.polygons), np.int32)
    mesh.loops.foreach_get("vertex_index", corners)
    mesh.polygons.foreach_get("loop_start", starts)
    return np.concatenate([corners, starts])
