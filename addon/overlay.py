"""The faces of each tag in its colour, drawn over the parts in the 3D view."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import bpy
import gpu
import numpy as np
from gpu_extras.batch import batch_for_shader

from .drawing import lifted
from .parts import Skin

OPACITY = 0.45


class TagColours:
    """Draws the skins it was last given; a skin becomes what the graphics card draws when it is first drawn."""

    def __init__(self) -> None:
        self._skins: dict[str, Skin] = {}
        self._batches: dict[str, dict[int, Any]] = {}
        self._handle: Any = None

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
        if not bpy.app.background:
            self._handle = bpy.types.SpaceView3D.draw_handler_add(self._draw, (), "WINDOW", "POST_VIEW")

    def stop(self) -> None:
        if self._handle is not None:
            bpy.types.SpaceView3D.draw_handler_remove(self._handle, "WINDOW")
        self._handle = None
        self.forget()

    def forget(self) -> None:
        self._skins.clear()
        self._batches.clear()

    def _draw(self) -> None:
        context = bpy.context
        settings = context.scene.fluxface
        if not (settings.show_tags and context.space_data.overlay.show_overlays):
            return
        colours = {tag.uid: (*tag.colour, OPACITY) for tag in settings.tags}
        shader = gpu.shader.from_builtin("UNIFORM_COLOR")
        gpu.state.blend_set("ALPHA")
        gpu.state.depth_test_set("LESS_EQUAL")
        with gpu.matrix.push_pop_projection():
            gpu.matrix.load_projection_matrix(lifted(gpu.matrix.get_projection_matrix()))
            for name in self._skins:
                part = context.scene.objects.get(name)
                if part is None or not part.visible_get(viewport=context.space_data):
                    continue
                with gpu.matrix.push_pop():
                    gpu.matrix.multiply_matrix(part.matrix_world)
                    for uid, batch in self._batches_of(name, shader).items():
                        if uid in colours:
                            shader.uniform_float("color", colours[uid])
                            batch.draw(shader)
        gpu.state.depth_test_set("NONE")
        gpu.state.blend_set("NONE")

    def _batches_of(self, name: str, shader: gpu.types.GPUShader) -> dict[int, Any]:
        if name not in self._batches:
            surface = self._skins[name]
            self._batches[name] = {
                uid: batch_for_shader(
                    shader,
                    "TRIS",
                    {"pos": surface.vertices.astype("f4")},
                    indices=np.ascontiguousarray(surface.triangles[surface.uid == uid], np.int32),
                )
                for uid in np.unique(surface.uid).tolist()
                if uid
            }
        return self._batches[name]


# One for all views, as are the host's drawing handlers that it is among.
tag_colours = TagColours()


def register() -> None:
    tag_colours.start()


def unregister() -> None:
    tag_colours.stop()
