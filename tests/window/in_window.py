"""Runs inside the window: installs the extension, tags in edit mode, runs, cancels, edits, runs again.

What a designer presses is pressed: keys and the mouse, as events of the window, commands by way of the host's search.

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


def over_part():
    """A pixel of the window over the part, clear of the sidebar and the toolbar."""
    _, _, region = view()
    return {"x": region.x + region.width // 3, "y": region.y + region.height // 2}


def hit(kind, unicode=""):
    """A key or a button of the mouse, pressed and let go with the pointer over the part."""
    window = bpy.context.window_manager.windows[0]
    window.event_simulate(type="MOUSEMOVE", value="NOTHING", **over_part())
    window.event_simulate(type=kind, value="PRESS", unicode=unicode, **over_part())
    window.event_simulate(type=kind, value="RELEASE", **over_part())


def command(words):
    """Look a command up with the host's search, and take the first that it offers."""
    hit("F3")
    yield 0.6
    for letter in words:
        hit("SPACE" if letter == " " else letter.upper(), unicode=letter)
        yield 0.05
    yield 0.4
    look(f"search for {words}")
    hit("RET")
    yield 0.4


def run_ends():
    """Wait, without freezing the window, until the run in the background has ended."""
    begun, draws = time.time(), 0
    while bpy.context.window_manager.fluxface.running and time.time() < begun + PATIENCE:
        draws += 1
        yield 0.1
    seen["looks while running"] = max(draws, seen.get("looks while running", 0))


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
    yield 0.5
    hit("TAB")
    yield 0.5
    seen["mode"] = bpy.context.mode
    hit("THREE")
    for what, key in (("skin", "A"), ("pad", "LEFTMOUSE")):
        hit(key)
        yield 0.3
        yield from command("new tag")
        settings.tags[settings.active_tag].name = what
        yield 0.3
        look(f"tagged {what}")
    hit("TAB")
    yield 0.5
    settings.tags[1].use_heat, settings.tags[1].heat = True, 5.0
    settings.tags[0].use_convection, settings.tags[0].coefficient = True, 12.0
    seen["faces"] = {row["name"]: row["faces"] for row in tagged(part)}
    part.fluxface.material.name = "aluminium 6061-T6"
    yield from command("fluxface run")
    yield from run_ends()
    yield 1.0
    look("result")
    seen["first"] = told(part)
    bpy.context.scene.fluxface_view.showing = "PART"
    settings.size = 0.0011
    press(bpy.ops.fluxface.run)
    yield 1.5
    yield from command("fluxface cancel")
    yield from run_ends()
    seen["after cancel"] = told(part)
    settings.size = 0.0
    part.scale.z = 0.03
    press(bpy.ops.fluxface.run)
    yield from run_ends()
    yield 1.0
    look("after an edit")
    seen["after edit"] = told(part)
    picture = Path(FOLDER, "rendered.png")
    window, area, region = view()
    with bpy.context.temp_override(window=window, area=area, region=region):
        bpy.ops.fluxface.render_picture(filepath=str(picture))
    seen["rendered"] = picture.is_file()
    bpy.ops.preferences.addon_disable(module=MODULE)
    seen["left behind"] = [name for name in dir(bpy.types) if name.lower().startswith("fluxface")]
    bpy.ops.preferences.addon_enable(module=MODULE)
    seen["enabled again"] = hasattr(bpy.context.scene, "fluxface")
    home = Path(sys.modules[MODULE].__file__).parent
    repositories = bpy.context.preferences.extensions.repos
    bpy.ops.extensions.package_uninstall(repo_index=repositories.find("User Default"), pkg_id="fluxface")
    yield 1.0
    seen["after removal"] = [str(home)] if home.exists() else []
    seen["after removal"] += [name for name in dir(bpy.types) if name.lower().startswith("fluxface")]
    look("removed")


def tagged(part):
    """How many faces each tag has."""
    uids = [0] * len(part.data.polygons)
    part.data.attributes["fluxface_tag"].data.foreach_get("value", uids)
    return [{"name": tag.name, "faces": uids.count(tag.uid)} for tag in bpy.context.scene.fluxface.tags]


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
