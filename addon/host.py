"""What differs between versions of the host (4.2 to 5.x) and between ways of installing, alone."""

from __future__ import annotations

from pathlib import Path

import bpy
import numpy as np

# How far a view stands from what it looks at, in radii of it; the host's own lens then shows it whole.
RADII_AWAY = 4.0


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


def tell_status(text: str | None) -> None:
    """Show ``text`` in every status bar; None brings back what the host shows there."""
    for window in bpy.context.window_manager.windows:
        with bpy.context.temp_override(window=window):
            window.workspace.status_text_set(text)


def show_text(text: bpy.types.Text) -> None:
    """Show a text in a window of its own; without windows it stays among the file's texts."""
    if bpy.app.background or not bpy.context.window_manager.windows:
        return
    known = set(bpy.context.window_manager.windows)
    bpy.ops.wm.window_new()
    for window in set(bpy.context.window_manager.windows) - known:
        area = window.screen.areas[0]
        area.type = "TEXT_EDITOR"
        area.spaces.active.text = text


def bring_in_view(places: np.ndarray, around: float) -> None:
    """Let every 3D view look at the middle of world places (P, 3), and at ``around`` of them at least."""
    middle = 0.5 * (places.min(axis=0) + places.max(axis=0))
    radius = max(float(np.linalg.norm(places - middle, axis=1).max()), around, 1e-9)
    for window in bpy.context.window_manager.windows:
        for area in window.screen.areas:
            view = area.spaces.active.region_3d if area.type == "VIEW_3D" else None
            if view is not None:
                if view.view_perspective == "CAMERA":
                    view.view_perspective = "PERSP"
                view.view_location, view.view_distance = middle, RADII_AWAY * radius
                area.tag_redraw()


def engine(name: str) -> str:
    """What the host calls the renderer ``name``: CYCLES, EEVEE or WORKBENCH."""
    names = {"CYCLES": "CYCLES", "EEVEE": "BLENDER_EEVEE_NEXT", "WORKBENCH": "BLENDER_WORKBENCH"}
    return "BLENDER_EEVEE" if name == "EEVEE" and bpy.app.version >= (5, 0) else names[name]
