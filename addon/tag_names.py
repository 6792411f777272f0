"""The name of each tag, written on its faces in the 3D view."""

from __future__ import annotations

import bpy
import numpy as np
from bpy_extras.view3d_utils import location_3d_to_region_2d, region_2d_to_origin_3d
from mathutils import Vector

from .drawing import Drawings
from .overlay import tag_colours
from .parts import Skin

# In the host's interface pixels, before its resolution scale.
SIZE, INSET, CHIP, GAP = 11, 6, 8, 5
GROUND, BRIGHT = (0.10, 0.105, 0.115, 0.82), (0.94, 0.94, 0.93, 1.0)

# A place and the normal there, in the part's own axes.
Place = tuple[Vector, Vector]


class Places:
    """Where each tag's name stands: looked up anew when the skin is another."""

    def __init__(self) -> None:
        self._found: dict[str, tuple[Skin, dict[int, list[Place]]]] = {}

    def of(self, name: str, surface: Skin) -> dict[int, list[Place]]:
        """By tag, as :func:`middles` finds them."""
        known = self._found.get(name)
        if known is None or known[0] is not surface:
            known = self._found[name] = (surface, middles(surface))
        return known[1]

    def forget(self) -> None:
        self._found.clear()


places = Places()


def middles(surface: Skin) -> dict[int, list[Place]]:
    """For each tag and each of the six ways that its faces look: their middle, moved onto the nearest of them."""
    vectors = surface.area_vectors
    area = np.linalg.norm(vectors, axis=1)
    centres = surface.vertices[surface.triangles].mean(axis=1)
    axis = np.abs(vectors).argmax(axis=1)
    way = 2 * axis + (np.take_along_axis(vectors, axis[:, None], axis=1)[:, 0] > 0)
    found: dict[int, list[Place]] = {}
    tagged = (surface.uid != 0) & (area > 0)
    for uid, look in np.unique(np.stack([surface.uid, way], axis=1)[tagged], axis=0).tolist():
        mine = np.flatnonzero(tagged & (surface.uid == uid) & (way == look))
        middle = np.average(centres[mine], axis=0, weights=area[mine])
        nearest = mine[np.linalg.norm(centres[mine] - middle, axis=1).argmin()]
        found.setdefault(uid, []).append((Vector(centres[nearest]), Vector(vectors[nearest] / area[nearest])))
    return found


def _draw() -> None:
    context = bpy.context
    settings = context.scene.fluxface
    if not (settings.show_tags and context.space_data.overlay.show_overlays):
        return
    tags = {tag.uid: tag for tag in settings.tags}
    for name, surface in tag_colours.skins.items():
        part = context.scene.objects.get(name)
        if part is None or not part.visible_get(viewport=context.space_data):
            continue
        for uid, found in places.of(name, surface).items():
            if uid in tags:
                _draw_name(context, part, found, tags[uid])


def _draw_name(
    context: bpy.types.Context, part: bpy.types.Object, found: list[Place], tag: bpy.types.PropertyGroup
) -> None:
    """On those of its faces that look at the eye the most; nothing where none does."""
    from .view.legend_in_view import fill_box, text_width, write

    turned = part.matrix_world.to_3x3().inverted_safe().transposed()
    facing, pixel = 0.0, None
    for place, normal in found:
        world = part.matrix_world @ place
        seen = location_3d_to_region_2d(context.region, context.region_data, world)
        if seen is not None:
            eye = region_2d_to_origin_3d(context.region, context.region_data, seen)
            cosine = (turned @ normal).normalized().dot((eye - world).normalized())
            if cosine > facing:
                facing, pixel = cosine, seen
    if pixel is None:
        return
    scale = context.preferences.system.ui_scale
    width = text_width(tag.name, SIZE * scale) / scale
    left = np.array(pixel) - np.array(((2 * INSET + CHIP + GAP + width) / 2, SIZE)) * scale
    size = np.array((2 * INSET + CHIP + GAP + width, 2 * SIZE)) * scale
    fill_box(left, size, GROUND)
    fill_box(left + np.array((INSET, SIZE - CHIP / 2)) * scale, np.array((CHIP, CHIP)) * scale, (*tag.colour, 1.0))
    write(tag.name, left + np.array((INSET + CHIP + GAP, SIZE - 0.36 * SIZE)) * scale, SIZE * scale, BRIGHT)


drawings = Drawings(POST_PIXEL=_draw)


def register() -> None:
    drawings.start()


def unregister() -> None:
    drawings.stop()
    places.forget()
