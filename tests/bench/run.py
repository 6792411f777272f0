"""What the solver costs against its size, and the same meshes in general-purpose libraries; asserts nothing.

    python3 tests/bench/run.py               10 000 to 1 000 000 nodes, and the goals; some twenty minutes
    python3 tests/bench/run.py --quick       up to 100 000 nodes, and the libraries on small meshes
    python3 tests/bench/run.py --json FILE   also writes the ratios and their goals
    python3 tests/bench/lamp.py              from pressing Run to the colours, on the work lamp

Every run is a process of its own; ours and the others' take turns. A ratio is the worse of wall time and processor
time. Tables go to the terminal, the plot to tests/bench/out/cost.png. FILE is written anew after each table, so that
what was measured is not lost.
"""

from __future__ import annotations

import argparse
import json
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
sys.path[:0] = [str(ROOT / "demo_scenes"), str(ROOT / "tests")]
OUT = Path(__file__).resolve().parent / "out"

import environment  # noqa: E402

LADDER = {1: (60_000, 180_000, 600_000, 1_800_000, 5_700_000), 2: (7_000, 22_000, 70_000, 220_000, 720_000)}
QUICK_RUNGS = 3
# Largest share of each library's time that ours may take, in all it does after meshing.
LINEAR = {"ngsolve": 0.33, "scikit_fem": 0.2, "mfem": 0.15}
QUADRATIC = {"ngsolve": 0.4, "scikit_fem": 0.15}
LARGE = {"ngsolve": 0.5, "scikit_fem": 0.5, "mfem": 0.5}


@dataclass(frozen=True)
class Comparison:
    shape: str
    order: int
    cells: int
    goals: dict[str, float]
    runs: int = 3
    memory: int | None = None  # bytes that ours may take at most

    @property
    def name(self) -> str:
        return f"{self.shape}, {self.cells:,} tetrahedra, {('linear', 'quadratic')[self.order - 1]}"


GOALS = [
    *(Comparison(shape, 1, 1_000_000, LINEAR) for shape in ("sink", "block")),
    *(Comparison(shape, 2, 200_000, QUADRATIC) for shape in ("sink", "block")),
    Comparison("sink", 2, 1_000_000, LARGE, runs=1, memory=8 << 30),
]
MESHING, QUICK_MESHING = 200_000, 20_000  # tetrahedra
QUICK = [Comparison("sink", 1, 100_000, LINEAR), Comparison("sink", 2, 20_000, QUADRATIC)]


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--quick", action="store_true", help="small meshes alone")
    parser.add_argument("--json", type=Path, metavar="FILE", help="write the ratios and their goals")
    options = parser.parse_args()
    environment.enter(__file__, "bench")
    import comparing
    import ladder
    import meshing

    found: dict[str, dict] = {"ratios": {}, "slopes": {}}

    def keep(ratios: dict, slopes: dict | None = None) -> None:
        found["ratios"] |= ratios
        found["slopes"] |= slopes or {}
        if options.json:
            options.json.write_text(json.dumps(found, indent=1), "utf-8")

    with tempfile.TemporaryDirectory() as folder:
        for shape in ("sink", "block"):
            keep(meshing.compared(shape, QUICK_MESHING if options.quick else MESHING, Path(folder)))
        for comparison in QUICK if options.quick else GOALS:
            keep(comparing.compared(comparison, Path(folder)))
        rungs = {order: sizes[: QUICK_RUNGS if options.quick else None] for order, sizes in LADDER.items()}
        keep(*ladder.measured(rungs, Path(folder), OUT))
    if options.json:
        print(f"{options.json} holds the ratios.")
    return 0


if __name__ == "__main__":
    sys.exit(main())
