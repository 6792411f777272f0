"""How quickly the add-on answers while a large part is tagged and shown; prints medians and asserts nothing.

    python3 tests/bench/tagging.py [--faces 100000] [--times 7]

Needs the host's module. A sphere of quadrilaterals is tagged, grown over, picked from and looked at; then the panels
are drawn on a layout that writes down what it is given, with thirty tags.
"""

from __future__ import annotations

import argparse
import math
import statistics
import sys
import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import bpy
import numpy as np
from fluxface import addon

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

TAGS = 30


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--faces", type=int, default=100_000, help="of the part, about (default: %(default)s)")
    parser.add_argument("--times", type=int, default=7, help="each is done (default: %(default)s)")
    options = parser.parse_args()
    bpy.ops.wm.read_factory_settings(use_empty=True)
    addon.register()
    rings = round(math.sqrt(options.faces / 1.6))
    bpy.ops.mesh.primitive_uv_sphere_add(segments=round(options.faces / rings), ring_count=rings, radius=0.05)
    print(f"{len(bpy.context.object.data.polygons)} faces, bpy {bpy.app.version_string}; median and slowest, ms")
    tell(tagging() | choosing() | looking() | panels() | colouring(), options.times)
    addon.unregister()


def tell(actions: dict[str, Callable[[], object]], times: int) -> None:
    for name, act in actions.items():
        seconds = []
        for _ in range(times):
            started = time.perf_counter()
            act()
            seconds.append(time.perf_counter() - started)
        print(f"{name:44}{1e3 * statistics.median(seconds):9.2f}{1e3 * max(seconds):9.2f}", flush=True)


def tagging() -> dict[str, Callable[[], object]]:
    from fluxface.addon import tags, upkeep

    def begin_edit() -> None:
        bpy.ops.object.mode_set(mode="EDIT")
        bpy.ops.mesh.select_all(action="SELECT")

    tags.new(bpy.context.scene, "skin")
    return {
        "object mode: all faces given to a tag": bpy.ops.fluxface.tag_give,
        "(edit mode is entered, all is selected)": begin_edit,
        "edit mode: all faces given to a tag": bpy.ops.fluxface.tag_give,
        "edit mode: measured and redrawn after an edit": upkeep.refresh,
    }


def choosing() -> dict[str, Callable[[], object]]:
    from fluxface.addon import patches, picking, tags
    from fluxface.addon.overlay import tag_colours

    def seeds() -> np.ndarray:
        return np.arange(len(tags.read(bpy.context.object.data))) == 7

    def grown_smooth() -> None:
        added = patches.smooth_patch(patches.facets_of(bpy.context.object), seeds(), math.radians(30.0))
        tags.select(bpy.context.object.data, added)

    def grown_flat() -> None:
        patches.flat_patch(patches.facets_of(bpy.context.object), seeds(), math.radians(90.0))

    def picked() -> None:
        surface = tag_colours.skins[bpy.context.object.name]
        picking.first_hit(surface, np.array((0.0, 0.01, 1.0)), np.array((0.0, 0.0, -1.0)))

    return {
        "selection grown to a smooth patch, all faces": grown_smooth,
        "flat patch of half the faces": grown_flat,
        "tag under the pointer": picked,
    }


def looking() -> dict[str, Callable[[], object]]:
    from fluxface.addon.glance import glance
    from fluxface.addon.overlay import tag_colours

    def whole():
        # Made anew, so that no measure is kept from one look to the next.
        return replace(tag_colours.skins[bpy.context.object.name])

    def opened():
        surface = whole()
        return replace(surface, triangles=surface.triangles[5:], uid=surface.uid[5:], face=surface.face[5:])

    def split():
        surface = whole()
        corners = np.arange(3 * len(surface.triangles), dtype=np.int32).reshape(-1, 3)
        return replace(surface, vertices=surface.vertices[surface.triangles].reshape(-1, 3), triangles=corners)

    kept: dict[str, object] = {}

    def looked(make):
        def act() -> None:
            surface = kept.setdefault(make.__name__, make())
            glance(replace(surface), "part")

        return act

    return {f"glance, {make.__name__}": looked(make) for make in (whole, opened, split)}


def colouring() -> dict[str, Callable[[], object]]:
    """A result of 200 000 vertices gets its colours: all that follows a run, and what a dragged load asks for."""
    from fluxface.addon import view
    from fluxface.addon.view.material import SHOWN
    from fluxface.addon.view.result_object import MARK, TEMPERATURE, mesh_of, new_child, write_kelvin
    from fluxface.addon.view.settings import refresh

    side = 447
    scene, part = bpy.context.scene, bpy.context.object
    u, v = np.meshgrid(*[np.linspace(0.0, 0.1, side)] * 2, indexing="ij")
    corner = (np.arange(side - 1)[:, None] * side + np.arange(side - 1)).ravel()
    triangles = np.concatenate([corner[:, None] + (0, side, side + 1), corner[:, None] + (0, side + 1, 1)])
    mesh = mesh_of("colours", np.stack([u, v, 0 * u], axis=-1).reshape(-1, 3), triangles)
    temperature = (300.0 + 500.0 * u * np.cos(40.0 * v)).ravel()
    for name in (TEMPERATURE, SHOWN):
        write_kelvin(mesh, name, temperature)
    new_child(part, mesh, MARK)
    return {
        f"colours of {side**2} vertices": lambda: refresh(scene),
        f"other temperatures on {side**2} vertices": lambda: view.recolour(scene, [part], [temperature]),
    }


def panels() -> dict[str, Callable[[], object]]:
    from fluxface.addon import tags, upkeep

    scene = bpy.context.scene

    def begin() -> None:
        if len(scene.fluxface.tags) >= TAGS:
            return
        bpy.ops.object.mode_set(mode="OBJECT")
        part = bpy.context.object
        while len(scene.fluxface.tags) < TAGS:
            tag = tags.new(scene, "tag")
            tag.use_convection = tag.use_radiation = True
        uids = np.array([tag.uid for tag in scene.fluxface.tags], np.int32)
        every = np.ones(len(part.data.polygons), bool)
        tags.give(part.data, every, uids[np.arange(len(every)) * TAGS // len(every)])
        upkeep.refresh()

    import drawn_panels

    def draw(panel):
        return lambda: drawn_panels.drawn(scene, panel)

    drawn = {f"panel: {panel.bl_label}": draw(panel) for panel in drawn_panels.PANELS}
    return {f"({TAGS} tags are made)": begin, **drawn}


if __name__ == "__main__":
    main()
