"""Which tag is under the pointer: a ray against the surfaces that the tags are drawn on."""

from __future__ import annotations

import bpy
import numpy as np
from bpy_extras.view3d_utils import region_2d_to_origin_3d, region_2d_to_vector_3d

from .overlay import tag_colours
from .parts import Skin


def view_at(window: bpy.types.Window, x: int, y: int) -> tuple[bpy.types.SpaceView3D, bpy.types.Region] | None:
    """The 3D view of the window that the pixel lies in, and its region."""
    for area in window.screen.areas:
        if area.type == "VIEW_3D":
            for region in area.regions:
                inside = region.x <= x < region.x + region.width and region.y <= y < region.y + region.height
                if region.type == "WINDOW" and inside:
                    return area.spaces.active, region
    return None


def tag_at(context: bpy.types.Context, x: int, y: int) -> int | None:
    """The tag of the face at a pixel of the window, 0 for one without a tag; None where there is no part."""
    found = view_at(context.window, x, y)
    if found is None:
        return None
    space, region = found
    pixel = (x - region.x, y - region.y)
    origin = region_2d_to_origin_3d(region, space.region_3d, pixel)
    towards = region_2d_to_vector_3d(region, space.region_3d, pixel)
    seen = [part for part in _drawn(context.scene) if part.visible_get(viewport=space)]
    return tag_along(seen, np.array(origin), np.array(towards))


def _drawn(scene: bpy.types.Scene) -> list[bpy.types.Object]:
    parts = (scene.objects.get(name) for name in tag_colours.skins)
    return [part for part in parts if part is not None]


def tag_along(parts: list[bpy.types.Object], origin: np.ndarray, towards: np.ndarray) -> int | None:
    """The tag of the first face of the parts on a ray (3,), (3,) in the world, 0 for one without; None beside all."""
    nearest, uid = np.inf, None
    for part in parts:
        surface = tag_colours.skins[part.name]
        inverse = np.array(part.matrix_world.inverted_safe(), float)
        # Not made a unit vector again: distances along it are then the world's.
        hit = first_hit(surface, inverse[:3, :3] @ origin + inverse[:3, 3], inverse[:3, :3] @ towards)
        if hit is not None and hit[0] < nearest:
            nearest, uid = hit[0], int(surface.uid[hit[1]])
    return uid


def first_hit(surface: Skin, origin: np.ndarray, towards: np.ndarray) -> tuple[float, int] | None:
    """How far along a ray in the surface's axes, in lengths of ``towards``, its first triangle is, and which."""
    square = float(towards @ towards)
    if not len(surface.triangles) or square == 0.0:
        return None
    # Seen along the ray, a triangle is hit when the origin lies inside it.
    across = np.linalg.svd(towards[None, :])[2][1:]
    places = surface.vertices - origin
    x, y = across @ places.T
    a, b, c = surface.triangles.T
    weights = np.stack([x[i] * y[j] - y[i] * x[j] for i, j in ((b, c), (c, a), (a, b))])
    inside = ((weights >= 0).all(axis=0) | (weights <= 0).all(axis=0)) & (weights != 0).any(axis=0)
    hits = np.flatnonzero(inside)
    share = weights[:, hits] / weights[:, hits].sum(axis=0)
    depth = np.einsum("ch,hc->h", share, (places @ towards)[surface.triangles[hits]]) / square
    hits, depth = hits[depth > 0], depth[depth > 0]
    if not len(hits):
        return None
    nearest = int(depth.argmin())
    return float(depth[nearest]), int(hits[nearest])
