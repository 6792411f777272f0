"""Tags that an operation dropped with all face attributes, as voxel remesh does, found again on the new shape."""

from __future__ import annotations

import bpy
import numpy as np
from mathutils import Vector
from mathutils.bvhtree import BVHTree

from . import tags
from .parts import Skin

# A remeshed face lies beside the one it stands for by about its own size.
REACH = 2.0
LIKE = 0.5  # cosine between normals of faces that may stand for each other


class Memory:
    """The tagged skin that each part was last seen with, for the session."""

    def __init__(self) -> None:
        self._skins: dict[int, Skin] = {}

    def keep(self, part: bpy.types.Object, surface: Skin) -> None:
        """``surface``: in the part's own axes."""
        if surface.uid.any():
            self._skins[part.session_uid] = surface

    def forget(self) -> None:
        self._skins.clear()

    def recover(self, part: bpy.types.Object) -> None:
        """Give the part the tags of the skin that it was last seen with, if its mesh has lost them all.

        Faces that the designer untagged keep the attribute, and stay untagged.
        """
        mesh, known = part.data, self._skins.get(part.session_uid)
        if known is None or mesh.is_editmode or tags.ATTRIBUTE in mesh.attributes or not len(mesh.polygons):
            return
        if part.modifiers:  # the skin is of the shape that they make, and not of the mesh
            return
        tags.give(mesh, np.ones(len(mesh.polygons), bool), nearest_tags(known, mesh))
        part.fluxface.recovered = True


# One for the session, which is as long as the shapes that it remembers are of use.
memory = Memory()


def nearest_tags(known: Skin, mesh: bpy.types.Mesh) -> np.ndarray:
    """(F,) the tag of the nearest face of like normal for each face of a mesh, in the same axes."""
    tree = BVHTree.FromPolygons(known.vertices.tolist(), known.triangles.tolist())
    reach = REACH * float(np.sqrt(np.median([polygon.area for polygon in mesh.polygons])))
    # The host looks up the neighbours of one point at a time only.
    return np.array([_nearest(tree, known.uid, polygon, reach) for polygon in mesh.polygons], np.int32)


def _nearest(tree: BVHTree, uid: np.ndarray, polygon: bpy.types.MeshPolygon, reach: float) -> int:
    _, normal, index, _ = tree.find_nearest(polygon.center)
    if normal.dot(polygon.normal) < LIKE:
        near = tree.find_nearest_range(polygon.center, reach)
        alike = [hit for hit in near if Vector(hit[1]).dot(polygon.normal) >= LIKE]
        index = min(alike, key=lambda hit: hit[3])[2] if alike else index
    return int(uid[index])
