"""What differs between versions of the host (4.2 to 5.x) and between ways of installing, alone."""

from __future__ import annotations

from pathlib import Path

import bpy


def user_folder() -> Path:
    """The folder that outlives files and updates of the add-on, for the user's own materials; made if it is not there.

    Raises OSError when it cannot be made.
    """
    package = __package__.rpartition(".")[0]
    if package.startswith("bl_ext."):
        return Path(bpy.utils.extension_path_user(package, create=True))
    # Only an extension has a folder of its own; a checkout or an installed package shares the host's.
    return Path(bpy.utils.user_resource("CONFIG", path="fluxface", create=True))


def push_undo(message: str) -> None:
    """An undo step from outside an operator; without a window there is no undo history to extend."""
    windows = bpy.context.window_manager.windows
    if bpy.app.background or not windows:
        return
    with bpy.context.temp_override(window=windows[0]):
        if bpy.ops.ed.undo_push.poll():
            bpy.ops.ed.undo_push(message=message)


def redraw() -> None:
    """Let every 3D view show what has changed."""
    for window in bpy.context.window_manager.windows:
        for area in window.screen.areas:
            if area.type == "VIEW_3D":
                area.tag_redraw()


def engine(name: str) -> str:
    """What the host calls the renderer ``name``: CYCLES, EEVEE or WORKBENCH."""
    names = {"CYCLES": "CYCLES", "EEVEE": "BLENDER_EEVEE_NEXT", "WORKBENCH": "BLENDER_WORKBENCH"}
    return "BLENDER_EEVEE" if name == "EEVEE" and bpy.app.version >= (5, 0) else names[name]
