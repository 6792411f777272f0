"""What each probe reads, written beside it in the 3D view."""

from __future__ import annotations

import bpy
import numpy as np
from bpy_extras.view3d_utils import location_3d_to_region_2d

from . import probes
from .drawing import Drawings
from .units import temperature_text


def _draw() -> None:
    from .view.drawn_in_view import draw_label
    from .view.legend_in_view import BRIGHT

    context, taken = bpy.context, list[np.ndarray]()
    if not context.space_data.overlay.show_overlays:
        return
    for probe in context.visible_objects:
        kelvin = probes.reading(probe) if probe.get(probes.MARK) else None
        if kelvin is None:
            continue
        pixel = location_3d_to_region_2d(context.region, context.region_data, probe.matrix_world.translation)
        if pixel is not None:
            draw_label(
                context, np.array(pixel), f"{probe.name} {temperature_text(context.scene, kelvin)}", BRIGHT, taken
            )


drawings = Drawings(POST_PIXEL=_draw)


def register() -> None:
    drawings.start()


def unregister() -> None:
    drawings.stop()
    probes.surfaces.forget()
