"""The cut object: what a cut leaves of a result, shown in its place; child of the part."""

from __future__ import annotations

import bpy
import numpy as np

from .lines import CREASE
from .material import SHOWN
from .result_object import (
    CUT,
    FLUX,
    TEMPERATURE,
    add_geometry,
    cut_of,
    mesh_of,
    new_child,
    remove_result,
    write_kelvin,
    write_vectors,
)  # fmt: skip


def show(
    scene: bpy.types.Scene,
    part: bpy.types.Object,
    places: np.ndarray,
    triangles: np.ndarray,
    temperature: np.ndarray,
    flux: np.ndarray,
) -> bpy.types.Object:
    """Give the part's cut object ``places`` (P, 3) in the part's axes, ``triangles`` (T, 3), temperature (P,) K,
    heat flux (P, 3) as results hold it.

    The mesh stays the same one, so that the host need not sort out anew what depends on what while a plane is moved.
    """
    cut = cut_of(part)
    if cut is None:
        cut = new_child(part, mesh_of(f"{part.name} cut", np.zeros((0, 3)), np.zeros((0, 3), int)), CUT)
        cut.data.materials.append(scene.fluxface_view.material)
    mesh = cut.data
    mesh.clear_geometry()
    add_geometry(mesh, places, triangles)
    for name in (TEMPERATURE, SHOWN):
        write_kelvin(mesh, name, temperature)
    write_vectors(mesh, FLUX, flux)
    mesh.set_sharp_from_angle(angle=CREASE)
    return cut


def remove_all(scene: bpy.types.Scene) -> int:
    """How many were removed."""
    cuts = [thing for thing in scene.objects if thing.get(CUT)]
    for cut in cuts:
        remove_result(cut)
    return len(cuts)
