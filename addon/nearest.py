"""Tags from one surface to another: each face takes that of the nearest face that looks the same way."""

from __future__ import annotations

import bpy
import numpy as np
from mathutils.bvhtree import BVHTree

# Cosine of the widest angle between an axis and the faces that count as looking along it: every face does along one
# axis at least, and a face at 45 degrees along two.
LIKE = 0.5


def nearest_uids(vertices: np.ndarray, triangles: np.ndarray, uid: np.ndarray, mesh: bpy.types.Mesh) -> np.ndarray:
    """(P,) int32 tag ids for the polygons of ``mesh`` from a surface: (V, 3), (F, 3) and its tag ids (F,).

    Across a thin wall the nearest face alone may be that of the wrong side, so faces are sought by where they look.
    """
    count = len(mesh.polygons)
    middle, normal = np.empty((count, 3), np.float32), np.empty((count, 3), np.float32)
    mesh.polygons.foreach_get("center", middle.ravel())
    mesh.polygons.foreach_get("normal", normal.ravel())
    main = np.abs(normal).argmax(axis=1)
    towards = 2 * main + (np.take_along_axis(normal, main[:, None], axis=1)[:, 0] < 0)
    looks = np.repeat(_directions(vertices, triangles), 2, axis=1) * np.tile([1.0, -1.0], 3)
    found = np.zeros(count, np.int32)
    for side in np.unique(towards).tolist():
        alike = np.flatnonzero(looks[:, side] >= LIKE)
        alike = alike if len(alike) else np.arange(len(triangles))
        tree = BVHTree.FromPolygons(vertices.tolist(), triangles[alike].tolist())
        mine = np.flatnonzero(towards == side)
        # The host looks up the nearest face of one point at a time only.
        found[mine] = uid[alike[[tree.find_nearest(point)[2] for point in middle[mine].tolist()]]]
    return found


def _directions(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(F, 3) unit normals; zero where a triangle has no area."""
    a, b, c = (vertices[triangles[:, corner]].astype(float) for corner in range(3))
    normal = np.cross(b - a, c - a)
    return normal / np.maximum(np.linalg.norm(normal, axis=1, keepdims=True), 1e-300)
