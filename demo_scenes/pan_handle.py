"""A pan's steel handle: one end welded to the hot pan, the underside over the burner, the rest in still air.

The handle and its loads are invented. Modelled in millimetres and scaled as imports often are; the pan is at -X.
"""

from __future__ import annotations

import bpy
import numpy as np
from designer import celsius, choose_material, open_empty_file, paint, tag_faces
from modelling import (
    ALONG_X,
    ALONG_Z,
    Shell,
    combine,
    face_centres,
    face_normals,
    finish,
    loft,
    rounded_rectangle,
    solid,
    stadium,
)

# Along the handle: distance from the pan, width, thickness, and how far the middle rises; mm.
SECTIONS = np.array(
    [
        (0, 40, 24, 0.0),
        (3, 37, 18, 0.2),
        (8, 33, 12, 0.8),
        (15, 30, 9.0, 2.0),
        (30, 28, 7.5, 5.6),
        (46, 26, 7.2, 10.2),
        (62, 23, 7.5, 15.0),
        (76, 19, 8.6, 18.8),
        (90, 18, 10.4, 21.8),
        (106, 19.5, 12.4, 24.4),
        (124, 22, 13.6, 26.6),
        (142, 23.5, 13.8, 28.0),
        (158, 23.5, 13.0, 28.6),
        (170, 22, 11.4, 28.6),
        (178, 19, 9.4, 28.3),
        (183, 14.5, 7.2, 28.0),
        (186, 9, 4.6, 27.8),
    ]
)
STEEL = [("brushed steel", (0.55, 0.55, 0.56), 0.3)]


def prepare() -> bpy.types.Object:
    """The handle in a new file, tagged and ready to run."""
    open_empty_file(metres_per_unit=1.0)
    handle = build()
    handle.scale = (0.001, 0.001, 0.001)
    centres, normals = face_centres(handle.data), face_normals(handle.data)
    root = (centres[:, 0] < 1.0) & (normals[:, 0] < -0.99)
    underside = (centres[:, 0] > 1.0) & (centres[:, 0] < 62.0) & (normals[:, 2] < -0.7)
    paint(handle, STEEL, np.zeros(len(root)))
    choose_material(handle, "stainless steel AISI 304")
    tag_faces(handle, "weld", root, temperature=celsius(180.0))
    tag_faces(handle, "underside", underside, heat_flux=2500.0)
    # Still air and the little that steel radiates, in one film coefficient: common practice, no source.
    tag_faces(handle, "bare steel", ~root & ~underside, coefficient=7.0, ambient=celsius(25.0))
    finish(handle)
    return handle


def build() -> bpy.types.Object:
    """The handle as one closed mesh."""
    handle = solid("Pan handle", [_grip()])
    combine(handle, "DIFFERENCE", [_slot(44.0, 11.0, (42.0, 0.0)), _slot(15.0, 8.0, (169.0, 0.0))])
    return handle


def _grip() -> Shell:
    distance, width, thickness, rise = _refined(SECTIONS).T
    outlines = [
        rounded_rectangle(w, t, 0.42 * t, 3) + np.array([0.0, z])
        for w, t, z in zip(width, thickness, rise, strict=True)
    ]
    return loft(outlines, distance, ALONG_X)


def _refined(rows: np.ndarray) -> np.ndarray:
    """(n, k) rows with a row put between every two, on a smooth curve through all.

    Dyn, Levin & Gregory, Computer Aided Geometric Design 4 (1987) 257: the four-point scheme.
    """
    beyond = np.vstack([2 * rows[0] - rows[1], rows, 2 * rows[-1] - rows[-2]])
    between = (9 * (rows[:-1] + rows[1:]) - beyond[:-3] - beyond[3:]) / 16
    return np.vstack([np.stack([rows[:-1], between], axis=1).reshape(-1, rows.shape[1]), rows[-1:]])


def _slot(length: float, width: float, middle: tuple[float, float]) -> Shell:
    """Cut upright through the handle: one splits the neck so that less heat comes through, one is to hang it by."""
    return loft([stadium(length, width, 5)] * 2, [-30.0, 60.0], ALONG_Z, (*middle, 0.0))
