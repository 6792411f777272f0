"""The faces of each tag in its colour, drawn over the parts in the 3D view.

Plain where the tag carries something, pale where it is meant to be insulated, hatched where nothing is set for it yet.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import bpy
import gpu
import numpy as np

from .drawing import Drawings, hatching, lifted
from .parts import Skin
from .properties import StudySettings, Terms, carries_heat
from .view.colours import linear_from_srgb

# Pixels from stripe to stripe, before the interface's scale.
PERIOD = 9.0
# Of what is drawn for the rest: it must not be taken for a tag.
GREY = (0.22, 0.22, 0.24)


@dataclass(frozen=True)
class Manner:
    """How faces are filled. opacity: of the stripes, and between them."""

    stripes: float
    between: float


SET, INSULATED, UNSET = Manner(0.5, 0.5), Manner(0.2, 0.2), Manner(0.85, 0.1)


def manner_of(terms: Terms) -> Manner:
    return SET if carries_heat(terms) else INSULATED if terms.insulated else UNSET


# Colours of the stripes and between them, linear light and opacity.
Fill = tuple[tuple[float, ...], tuple[float, ...]]


def fills_of(settings: StudySettings) -> dict[int, Fill]:
    """By tag; under 0 that of the rest, if it is drawn."""
    drawn = {tag.uid: (tag.colour, manner_of(tag)) for tag in settings.tags}
    if settings.show_untagged:
        drawn[0] = (GREY, manner_of(settings.untagged))
    fills = {}
    for uid, (colour, manner) in drawn.items():
        light = tuple(linear_from_srgb(np.array(colour)).tolist())
        fills[uid] = ((*light, manner.stripes), (*light, manner.between))
    return fills


class TagColours:
    """Draws the skins it was last given; a skin becomes what the graphics card draws when it is first drawn."""

    def __init__(self) -> None:
        self._skins: dict[str, Skin] = {}
        self._batches: dict[str, dict[int, Any]] = {}
        self._drawings = Drawings(POST_VIEW=self._draw)
        self._shader: Any = None

    def knows(self, part: bpy.types.Object) -> bool:
        return part.name in self._skins

    def take(self, part: bpy.types.Object, surface: Skin) -> None:
        """``surface``: in the part's own axes."""
        self._skins[part.name] = surface
        self._batches.pop(part.name, None)

    @property
    def skins(self) -> Mapping[str, Skin]:
        """What is drawn, by the name of the part; each in the part's own axes."""
        return self._skins

    def drop(self, part: bpy.types.Object) -> None:
        """Draw nothing on a part whose shape is changing, until it is taken anew."""
        self._skins.pop(part.name, None)

    def start(self) -> None:
        self._drawings.start()

    def stop(self) -> None:
        self._drawings.stop()
        self.forget()

    def forget(self) -> None:
        self._skins.clear()
        self._batches.clear()

    def _draw(self) -> None:
        context = bpy.context
        settings = context.scene.fluxface
        if not (settings.show_tags and context.space_data.overlay.show_overlays):
            return
        fills = fills_of(settings)
        shader = self._shader = self._shader or hatching()
        gpu.state.blend_set("ALPHA")
        gpu.state.depth_test_set("LESS_EQUAL")
        shader.bind()
        shader.uniform_float("period", PERIOD * context.preferences.system.ui_scale)
        with gpu.matrix.push_pop_projection():
            gpu.matrix.load_projection_matrix(lifted(gpu.matrix.get_projection_matrix()))
            for name in self._skins:
                part = context.scene.objects.get(name)
                if part is not None and part.visible_get(viewport=context.space_data):
                    with gpu.matrix.push_pop():
                        gpu.matrix.multiply_matrix(part.matrix_world)
                        self._draw_part(shader, name, fills)
        gpu.state.depth_test_set("NONE")
        gpu.state.blend_set("NONE")

    def _draw_part(self, shader: gpu.types.GPUShader, name: str, fills: Mapping[int, Fill]) -> None:
        shader.uniform_float("place", gpu.matrix.get_projection_matrix() @ gpu.matrix.get_model_view_matrix())
        for uid, batch in self._batches_of(name).items():
            if uid in fills:
                stripes, between = fills[uid]
                shader.uniform_float("stripes", stripes)
                shader.uniform_float("between", between)
                batch.draw(shader)

    def _batches_of(self, name: str) -> dict[int, gpu.types.GPUBatch]:
        if name not in self._batches:
            self._batches[name] = batches(self._skins[name])
        return self._batches[name]


def batches(surface: Skin) -> dict[int, gpu.types.GPUBatch]:
    """What the graphics card draws of each tag and, under 0, of the rest; the corners are shared by all."""
    layout = gpu.types.GPUVertFormat()
    layout.attr_add(id="pos", comp_type="F32", len=3, fetch_mode="FLOAT")
    corners = gpu.types.GPUVertBuf(layout, len(surface.vertices))
    corners.attr_fill("pos", surface.vertices.astype(np.float32))
    made = {}
    for uid in np.unique(surface.uid).tolist():
        triangles = np.ascontiguousarray(surface.triangles[surface.uid == uid], np.int32)
        made[uid] = gpu.types.GPUBatch(type="TRIS", buf=corners, elem=gpu.types.GPUIndexBuf(type="TRIS", seq=triangles))
    return made


# One for all views, as are the host's drawing handlers that it is among.
tag_colours = TagColours()


def register() -> None:
    tag_colours.start()


def unregister() -> None:
    tag_colours.stop()
