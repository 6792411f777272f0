"""Runs inside the window: installs the extension, tags in edit mode, runs, cancels, edits, runs again.

Called by test_window.py as ``blender --python in_window.py -- ARCHIVE FOLDER``; leaves pictures of the screen and
``seen.json`` in FOLDER. The steps are taken from a timer, so that the window lives and draws between them.
"""

import json
import os
import subprocess
import sys
import time
import traceback
from pathlib import Path

import bpy

ARCHIVE, FOLDER = sys.argv[sys.argv.index("--") + 1 :]
MODULE = "bl_ext.user_default.fluxface"
PATIENCE = 90.0
seen = {}


def look(name):
    subprocess.run(["import", "-window", "root", str(Path(FOLDER, f"{name}.png"))], check=False)


def view():
    window = bpy.context.window_manager.windows[0]
    area = next(area for area in window.screen.areas if area.type == "VIEW_3D")
    return window, area, next(region for region in area.regions if region.type == "WINDOW")


def press(operator, **settings):
    window, area, region = view()
    with bpy.context.temp_override(window=window, area=area, region=region):
        return operator("INVOKE_DEFAULT", **settings)


def run_ends():
    """Wait, without freezing the window, until the run in the background has ended."""
    begun, draws = time.time(), 0
    while bpy.context.window_manager.fluxface.running and time.time() < begun + PATIENCE:
        draws += 1
        yield 0.1
    seen["looks while running"] = max(draws, seen.get("looks while running", 0))


def select(part, facing_up):
    bpy.context.tool_settings.mesh_select_mode = (False, False, True)
    for polygon in part.data.polygons:
        polygon.select = (polygon.normal.z > 0.9) == facing_up


def story():
    bpy.ops.extensions.package_install_files(
        filepath=ARCHIVE, repo="user_default", enable_on_install=True, overwrite=True
    )
    seen["enabled"] = MODULE in bpy.context.preferences.addons
    part = bpy.data.objects["Cube"]
    part.scale = (0.03, 0.03, 0.01)
    _, area, _ = view()
    area.spaces[0].show_region_ui = True
    yield 1.0
    next(region for region in area.regions if region.type == "UI").active_panel_category = "Fluxface"
    press(bpy.ops.view3d.view_selected)
    settings = bpy.context.scene.fluxface
    for name, up in (("pad", True), ("skin", False)):
        select(part, up)
        press(bpy.ops.object.mode_set, mode="EDIT")
        press(bpy.ops.fluxface.tag_new, name=name)
        yield 0.5
        look(f"tagged {name}")
        press(bpy.ops.object.mode_set, mode="OBJECT")
    settings.tags[0].use_heat, settings.tags[0].heat = True, 5.0
    settings.tags[1].use_convection, settings.tags[1].coefficient = True, 12.0
    part.fluxface.material.name = "aluminium 6061-T6"
    press(bpy.ops.fluxface.run)
    yield from run_ends()
    yield 1.0
    look("result")
    seen["first"] = told(part)
    bpy.context.scene.fluxface_view.showing = "PART"
    settings.size = 0.0011
    press(bpy.ops.fluxface.run)
    yield 1.5
    press(bpy.ops.fluxface.cancel)
    yield from run_ends()
    seen["after cancel"] = told(part)
    settings.size = 0.0
    part.scale.z = 0.03
    press(bpy.ops.fluxface.run)
    yield from run_ends()
    yield 1.0
    look("after an edit")
    seen["after edit"] = told(part)
    bpy.ops.preferences.addon_disable(module=MODULE)
    seen["left behind"] = [name for name in dir(bpy.types) if name.lower().startswith("fluxface")]
    bpy.ops.preferences.addon_enable(module=MODULE)
    seen["enabled again"] = hasattr(bpy.context.scene, "fluxface")


def told(part):
    """The hottest temperature of the kept result, K, and the objects that show one."""
    summary = json.loads(part.fluxface.outcome.summary or "{}")
    return {"hottest": summary.get("hottest", {}).get("temperature"), "children": len(part.children)}


def steps(going):
    def step():
        try:
            return next(going)
        except StopIteration:
            seen["told to the end"] = True
        except Exception:
            seen["error"] = traceback.format_exc()
        Path(FOLDER, "seen.json").write_text(json.dumps(seen), "utf-8")
        os._exit(0)

    return step


bpy.context.preferences.view.show_splash = False
bpy.app.timers.register(steps(story()), first_interval=2.0, persistent=True)
