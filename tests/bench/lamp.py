"""How long it takes from pressing Run to the colours, on the work lamp; prints medians and asserts nothing.

    python3 tests/bench/lamp.py              seven runs
    python3 tests/bench/lamp.py --runs 15

The first run, which finds nothing warm, is told apart from the others.
"""

from __future__ import annotations

import argparse
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "demo_scenes"))

import environment  # noqa: E402

STAGES = ("export", "mesh", "assemble", "solve", "report", "start, read and write", "read back", "colours")


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--runs", type=int, default=7, help="how many (default: %(default)s)")
    options = parser.parse_args()
    if options.runs < 2:
        parser.error("--runs must be at least 2")
    environment.enter(__file__)
    from fluxface import addon

    addon.register()
    try:
        measure(options.runs)
    finally:
        addon.unregister()
    return 0


def measure(runs: int) -> None:
    """Run the lamp ``runs`` times and print the table."""
    import bpy
    import numpy as np
    from fluxface.addon import study
    from production import hushed, prepared

    with tempfile.TemporaryDirectory() as folder, hushed():
        part = prepared("work_lamp", Path(folder) / "work_lamp.blend", {})
        rows = np.array([one_run() for _ in range(runs)])
        mesh = study.summary(study.outcome(bpy.context.scene, [part]))["mesh"]
    print(
        f"Work lamp, {mesh['nodes']:,} nodes, order {mesh['order']}; seconds, {runs} runs, bpy {bpy.app.version_string}"
    )
    print(f"{'':24}{'first':>9}{'median':>9}{'least':>9}{'most':>9}")
    for stage, column in zip(
        (*STAGES, "from Run to colours"), np.column_stack([rows, rows.sum(axis=1)]).T, strict=True
    ):
        later = column[1:]
        print(f"{stage:24}{column[0]:9.3f}{np.median(later):9.3f}{later.min():9.3f}{later.max():9.3f}")


def one_run() -> list[float]:
    """Seconds of each of STAGES."""
    import bpy
    from fluxface.addon import study
    from fluxface.solver.result import read_field
    from production import run, timed

    seconds: dict[str, float] = {}
    run(seconds)
    left = study.outcome(bpy.context.scene, study.parts(bpy.context))
    with timed(seconds, "read back"):
        read_field(Path(left.folder))
    spent = study.summary(left)["seconds"]
    seconds |= {stage: spent[stage] for stage in ("mesh", "assemble", "solve", "report")}
    seconds["start, read and write"] = seconds["solver"] - sum(
        spent[s] for s in ("mesh", "assemble", "solve", "report")
    )
    # Colours were timed with the reading of the field in them.
    seconds["colours"] -= seconds["read back"]
    return [seconds[stage] for stage in STAGES]


if __name__ == "__main__":
    sys.exit(main())
