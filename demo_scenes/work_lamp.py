"""An LED work lamp: a die-cast body with fins, 12 W under the cover, standing in still air.

The lamp and its loads are invented. Modelled in millimetres; the light leaves towards -Y, up is +Z.
"""

from __future__ import annotations

import bpy
import numpy as np
from designer import celsius, choose_material, open_empty_file, paint, tag_faces
from modelling import (
    ALONG_X,
    ALONG_Y,
    Shell,
    circle,
    combine,
    face_normals,
    finish,
    loft,
    region_of_faces,
    rounded_rectangle,
    solid,
    stadium,
)

WIDTH, HEIGHT, DEPTH = 90.0, 68.0, 24.0  # the shell, without fins and eye
CORNER, BACK_ROUND = 17.0, 6.0
FLOOR = 4.0  # what is left between the well and the fins
WELL = DEPTH - FLOOR
FIN_HEIGHT = 30.0  # the middle one; the others stand lower, on an arch
FIN_PITCH, FIN_ROOT, FIN_TIP, FIN_ROUND = 8.6, 3.4, 2.2, 9.0
ARC = 6  # pieces in the quarter of a large corner

INSIDE, PAD, OUTSIDE = 0, 1, 2


LOOKS = [
    ("machined", (0.62, 0.63, 0.65), 0.35),
    ("LED board", (0.86, 0.72, 0.35), 0.5),
    ("cast and coated", (0.10, 0.11, 0.13), 0.55),
]


def prepare(fin_height: float = FIN_HEIGHT) -> bpy.types.Object:
    """The lamp in a new file, tagged and ready to run."""
    open_empty_file(metres_per_unit=0.001)
    lamp = build(fin_height)
    region, normals = region_of_faces(lamp.data), face_normals(lamp.data)
    paint(lamp, LOOKS, region)
    choose_material(lamp, "aluminium A380, die-cast (AlSi9Cu3)")
    tag_faces(lamp, "LED pad", (region == PAD) & (normals[:, 1] < -0.99), heat=12.0)
    # Still air and radiation lumped in one film coefficient: common practice, no source.
    tag_faces(lamp, "fins", region == OUTSIDE, coefficient=8.0, ambient=celsius(25.0))
    finish(lamp)
    return lamp


def build(fin_height: float = FIN_HEIGHT) -> bpy.types.Object:
    """The lamp's body as one closed mesh."""
    lamp = solid("Work lamp", [_shell()])
    combine(lamp, "DIFFERENCE", [_well()])
    combine(lamp, "UNION", [_pad(), _eye(), *_posts(), *_fins(fin_height)])
    combine(lamp, "DIFFERENCE", [_eye_hole(), *_screw_holes()])
    return lamp


def _outline(inset: float) -> np.ndarray:
    return rounded_rectangle(HEIGHT - 2 * inset, WIDTH - 2 * inset, CORNER - inset, ARC)


def _shell() -> Shell:
    """A rounded box: the front edge broken, the back edge well rounded."""
    turn = np.linspace(0.0, np.pi / 2, 5)
    inset = [1.0, 0.0, *(BACK_ROUND * (1 - np.cos(turn)))]
    depth = [0.0, 1.0, *(DEPTH - BACK_ROUND * (1 - np.sin(turn)))]
    return loft([_outline(i) for i in inset], depth, ALONG_Y, region=OUTSIDE)


def _well() -> Shell:
    """The room under the cover: a seat for the glass, then drafted walls down to a bevelled foot."""
    inset = [2.4, 2.4, 4.6, 5.6, 7.0]
    depth = [-1.0, 2.4, 2.4, WELL - 1.4, WELL]
    return loft([_outline(i) for i in inset], depth, ALONG_Y, region=INSIDE)


def _pad() -> Shell:
    """The plinth the LED board is screwed to; it stands 1.5 mm proud of the floor."""
    outlines = [rounded_rectangle(26.0 - 2 * inset, 38.0 - 2 * inset, 3.0 - inset, 2) for inset in (0.8, 0.0, 0.0)]
    return loft(outlines, [WELL - 1.5, WELL - 0.7, WELL + 1.0], ALONG_Y, region=PAD)


SCREWS = [(x, z) for x in (-31.5, 31.5) for z in (-20.5, 20.5)]


def _posts() -> list[Shell]:
    """Four posts in the corners, for the cover's screws."""
    outlines = [circle(3.6, 10), circle(4.0, 10)]
    return [loft(outlines, [4.5, WELL + 1.0], ALONG_Y, (x, 0.0, z), INSIDE) for x, z in SCREWS]


def _screw_holes() -> list[Shell]:
    return [loft([circle(1.25, 6)] * 2, [3.0, 14.0], ALONG_Y, (x, 0.0, z), INSIDE) for x, z in SCREWS]


EYE_DEPTH, EYE_DROP, EYE_RADIUS = 9.5, HEIGHT / 2 + 9.0, 7.5


def _eye() -> Shell:
    """The eye below, by which a bracket holds the lamp."""
    half_turn = np.linspace(-np.pi, 0.0, 10)

    def outline(inset: float) -> np.ndarray:
        arc = (EYE_RADIUS - inset) * np.stack([np.cos(half_turn), np.sin(half_turn)], axis=-1)
        root = np.array([[EYE_RADIUS - inset, 10.5], [inset - EYE_RADIUS, 10.5]])
        return np.vstack([arc, root]) + np.array([EYE_DEPTH, -EYE_DROP])

    return loft([outline(i) for i in (0.8, 0.0, 0.0, 0.8)], [-6.0, -5.2, 5.2, 6.0], ALONG_X, region=OUTSIDE)


def _eye_hole() -> Shell:
    return loft([circle(4.0, 14)] * 2, [-7.0, 7.0], ALONG_X, (0.0, EYE_DEPTH, -EYE_DROP), OUTSIDE)


def _fins(height: float) -> list[Shell]:
    """Nine upright fins under an arch."""
    return [_fin(FIN_PITCH * step, height * (1 - 0.025 * step**2), 52.0 - 0.5 * step**2) for step in range(-4, 5)]


def _fin(x: float, height: float, length: float) -> Shell:
    """Drafted as a casting is, flared at the root, its ends half-round and its upper corners well rounded."""
    draft = (FIN_ROOT - FIN_TIP) / height
    turn = np.linspace(0.0, np.pi / 2, 5)
    above = np.array([-1.5, 1.2, *(height - 0.5 - FIN_ROUND * (1 - np.sin(turn[:-1]))), height])
    flare = np.array([2.4, 0.0, *(0.0 * turn)])
    rounding = FIN_ROUND * np.array([0.0, 0.0, *(1 - np.cos(turn))])
    narrower = draft * above - 2 * flare
    outlines = [
        stadium(length - narrow - 2 * round, FIN_ROOT - narrow, 2)
        for narrow, round in zip(narrower, rounding, strict=True)
    ]
    return loft(outlines, DEPTH + above, ALONG_Y, (x, 0.0, 0.0), OUTSIDE)
