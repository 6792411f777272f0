"""Live loads: how often the part can be shown in other temperatures while a load is dragged.

    python3 tests/bench/live.py [--vertices 100000]

Needs the host's module. A plate is run at the size that gives its result about so many surface vertices; then its watts
are changed again and again, each change going all the way to the attributes that are drawn.
"""

from __future__ import annotations

import argparse
import statistics
import sys
import time
from pathlib import Path

import bpy
from fluxface import addon

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

UPDATES = 60


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--vertices", type=int, default=100_000, help="on the surface, about (default: %(default)s)")
    wanted = parser.parse_args().vertices
    bpy.ops.wm.read_factory_settings(use_empty=True)
    addon.register()
    from fluxface.addon import live
    from fluxface.addon.view.result_object import result_of
    from modelled import lamp

    scene = bpy.context.scene
    part = lamp(scene)
    part.scale = (4.0, 5.0, 0.1)  # a plate of 320 x 300 x 2 mm: nearly all of its nodes are on its surface
    # On a surface of triangles of mean edge s there is a vertex for every 0.87 s² or so.
    scene.fluxface.size = (2 * 0.32 * 0.3 / (0.87 * wanted)) ** 0.5
    scene.fluxface.max_nodes = 20_000_000
    bpy.ops.fluxface.run()
    started = time.perf_counter()
    while live.live.look() is not None:
        time.sleep(0.01)
    print(f"responses made in {time.perf_counter() - started:.2f} s after the run")
    seconds = []
    for number in range(UPDATES + 1):
        started = time.perf_counter()
        scene.fluxface.tags["pad"].heat = 12.0 + 0.1 * (number + 1)
        seconds.append(time.perf_counter() - started)
    assert part.fluxface.outcome.live
    median = statistics.median(seconds[1:])
    print(f"{len(result_of(part).data.vertices)} surface vertices: first {1e3 * seconds[0]:.0f} ms, then")
    print(f"median {1e3 * median:.1f} ms, slowest {1e3 * max(seconds[1:]):.1f} ms: {1 / median:.0f} updates a second")
    addon.unregister()


if __name__ == "__main__":
    main()
