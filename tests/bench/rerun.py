"""How long a designer waits from pressing Run to the colours when one thing was changed since the last run.

    python3 tests/bench/rerun.py              three rounds
    python3 tests/bench/rerun.py --rounds 7

Each round runs the work lamp cold, with no worker, and then once after each change, so that what else the machine does
weighs on all alike. Prints medians and asserts nothing.
"""

from __future__ import annotations

import argparse
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "demo_scenes"))

import environment  # noqa: E402

MILLIMETRES = 3.0  # the mesh size


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--rounds", type=int, default=3, help="how many (default: %(default)s)")
    options = parser.parse_args()
    environment.enter(__file__)
    from fluxface import addon

    addon.register()
    try:
        measure(options.rounds)
    finally:
        addon.unregister()
    return 0


def measure(rounds: int) -> None:
    """Run the lamp after each of the changes, ``rounds`` times, and print the table."""
    import bpy
    import numpy as np
    from fluxface.addon import study
    from production import hushed, prepared

    with tempfile.TemporaryDirectory() as folder, hushed():
        part = prepared("work_lamp", Path(folder) / "work_lamp.blend", {})
        bpy.context.scene.fluxface.size = MILLIMETRES
        changes = changes_of(part)
        seconds = np.array([[waited(change) for change in changes.values()] for _ in range(rounds)])
        mesh = study.summary(study.outcome(bpy.context.scene, [part]))["mesh"]
    print(f"Work lamp, {mesh['nodes']:,} nodes, order {mesh['order']}; bpy {bpy.app.version_string}")
    print(f"seconds from Run to colours, {rounds} rounds\n{'':24}{'median':>9}{'least':>9}{'of cold':>9}")
    median, least = np.median(seconds, axis=0), seconds.min(axis=0)
    for name, middle, best in zip(changes, median, least, strict=True):
        print(f"{name:24}{middle:9.3f}{best:9.3f}{middle / median[0]:9.2f}")


def waited(change: Callable[[], None]) -> float:
    """Seconds from pressing Run to the colours, after the change."""
    import bpy
    from production import run

    change()
    bpy.context.view_layer.update()
    seconds: dict[str, float] = {}
    run(seconds)
    return sum(seconds.values())


def changes_of(part) -> dict[str, Callable[[], None]]:
    """What a designer changes between two runs, each by its name."""
    import bpy
    import numpy as np
    from fluxface.addon import jobs

    pad, fins = bpy.context.scene.fluxface.tags

    def more_watts() -> None:
        pad.heat += 1.0

    def better_film() -> None:
        fins.coefficient += 0.5

    def move() -> None:
        part.location.x += 10.0

    def stretch() -> None:
        places = np.empty((len(part.data.vertices), 3), np.float32)
        part.data.vertices.foreach_get("co", places.reshape(-1))
        places[:, 0] *= 1.002
        part.data.vertices.foreach_set("co", places.reshape(-1))
        part.data.update()

    return {
        "cold": jobs.stop_all,
        "nothing changed": lambda: None,
        "loads changed": more_watts,
        "films changed": better_film,
        "moved": move,
        "small edit": stretch,
    }


if __name__ == "__main__":
    sys.exit(main())
