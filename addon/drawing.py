"""What all that is drawn over the 3D view shares."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import bpy
import gpu
from mathutils import Matrix

# Towards the eye, enough to win over the face itself and too little to show through a thin wall: as a share of the
# distance in perspective, and of the whole depth without it.
LIFT = 1e-3
FLAT_LIFT = 5e-7


def lifted(projection: Matrix) -> Matrix:
    """The projection with everything a little nearer to the eye in depth, and nowhere else."""
    nearer = projection.copy()
    if projection[3][3]:
        nearer[2][3] -= FLAT_LIFT
    else:
        nearer[2][3] *= 1.0 + LIFT
    return nearer


def hatching() -> gpu.types.GPUShader:
    """Fills with stripes across the screen. Needs a window.

    place: from the part's axes to the screen. stripes, between: their colours, in linear light. period: pixels.
    """
    told = gpu.types.GPUShaderCreateInfo()
    told.push_constant("MAT4", "place")
    told.push_constant("VEC4", "stripes")
    told.push_constant("VEC4", "between")
    told.push_constant("FLOAT", "period")
    told.vertex_in(0, "VEC3", "pos")
    told.fragment_out(0, "VEC4", "colour")
    told.vertex_source("void main() { gl_Position = place * vec4(pos, 1.0); }")
    told.fragment_source(
        "void main() {"
        " float along = fract((gl_FragCoord.x + gl_FragCoord.y) / period);"
        " colour = mix(between, stripes, step(along, 0.35));"
        " }"
    )
    return gpu.shader.create_from_info(told)


class Drawings:
    """What a room draws over every 3D view, by the moment at which it does; nothing where there is no window."""

    def __init__(self, **draws: Callable[[], None]) -> None:
        self._draws = draws
        # What the host gives for each drawing that is added, to take it off again.
        self._handles: list[Any] = []

    @property
    def drawn(self) -> int:
        """How many of them the host has."""
        return len(self._handles)

    def start(self) -> None:
        if not bpy.app.background:
            for moment, draw in self._draws.items():
                self._handles.append(bpy.types.SpaceView3D.draw_handler_add(draw, (), "WINDOW", moment))

    def stop(self) -> None:
        while self._handles:
            bpy.types.SpaceView3D.draw_handler_remove(self._handles.pop(), "WINDOW")
