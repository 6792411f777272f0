"""A ceramic LED board on gap filler under a painted aluminium body in still air: two parts and their contact.

The module and its loads are invented. It hangs with its light downwards; air and radiation are worked out from what a
designer knows, the room and the paint.
"""

from __future__ import annotations

import bpy
import numpy as np
from designer import celsius, choose_material, open_empty_file, paint, place_camera, tag_faces
from modelling import (
    ALONG_X,
    Shell,
    combine,
    face_centres,
    face_normals,
    finish,
    loft,
    rounded_rectangle,
    solid,
)

ROOM = celsius(25.0)
LIGHTS = np.stack(np.meshgrid((-15.0, 0.0, 15.0), (-15.0, 0.0, 15.0)), axis=-1).reshape(-1, 2)
FIN_HEIGHT = 26.0
FINS = np.linspace(-36.0, 36.0, 9)
BODY, BOARD = [("white paint", (0.75, 0.75, 0.73), 0.5)], [("white ceramic", (0.8, 0.8, 0.78), 0.4)]


def prepare() -> bpy.types.Object:
    """The module in a new file, its parts in one collection, tagged and ready to run; the body."""
    open_empty_file(metres_per_unit=0.001)
    body, board = build()
    module = bpy.data.collections.new("LED module")
    bpy.context.scene.collection.children.link(module)
    for part, looks in ((body, BODY), (board, BOARD)):
        module.objects.link(part)
        bpy.context.scene.collection.objects.unlink(part)
        paint(part, looks, np.zeros(len(part.data.polygons)))
        finish(part)
    bpy.context.scene.fluxface.collection = module
    choose_material(board, "alumina, 96 % substrate")
    choose_material(body, "aluminium A356-T6, cast (AlSi7Mg)")
    tag_faces(board, "LEDs", lights(board), heat=9.0)
    tag_faces(board, "board front", ~lights(board) & (face_normals(board.data)[:, 2] < 0.5), **_still_air(0.8))
    tag_faces(body, "painted body", np.ones(len(body.data.polygons), bool), **_still_air(0.9))
    bpy.ops.fluxface.contacts_find()
    filler = bpy.context.scene.fluxface.contacts[0]
    filler.crossing, filler.thickness, filler.conductivity = "FILLER", 0.5, 3.0
    bpy.context.view_layer.objects.active = body
    place_camera((0.55, -0.75, -0.62))
    return body


def _still_air(emissivity: float) -> dict[str, float | str]:
    return {"film": "natural", "ambient": ROOM, "emissivity": emissivity, "surroundings": ROOM}


def build() -> tuple[bpy.types.Object, bpy.types.Object]:
    """The body with its fins upwards, and the board against its underside, each one closed mesh."""
    body = solid("LED body", [loft([rounded_rectangle(84.0, 84.0, 10.0, 6)] * 2, [0.0, 5.0])])
    combine(body, "UNION", [_fin(x) for x in FINS])
    board = solid("LED board", [loft([rounded_rectangle(60.0, 60.0, 4.0, 4)] * 2, [-1.0, 0.0])])
    packages = [loft([rounded_rectangle(5.0, 5.0, 0.6, 2)] * 2, [-1.3, -0.9], centre=(*at, 0.0)) for at in LIGHTS]
    combine(board, "UNION", packages)
    return body, board


def _fin(x: float) -> Shell:
    """A plate along Y, 2.4 mm thick, its ends chamfered towards the tip."""
    end = np.array([(36.0, 4.0), (36.0, FIN_HEIGHT - 8.0), (32.0, FIN_HEIGHT - 2.0), (26.0, FIN_HEIGHT)])
    outline = np.vstack([end, end[::-1] * (-1.0, 1.0)])
    return loft([outline, outline], [-1.2, 1.2], ALONG_X, (x, 0.0, 0.0))


def lights(board: bpy.types.Object) -> np.ndarray:
    """(polygons,) whether a face is the front of an LED package."""
    return (face_centres(board.data)[:, 2] < -1.2) & (face_normals(board.data)[:, 2] < -0.99)
