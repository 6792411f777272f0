"""Our way to ask the mesher against its own defaults at the same size: time, shapes of cells, iterations on them."""

from __future__ import annotations

import resource
import time
from collections.abc import Callable
from pathlib import Path
from unittest.mock import patch

import numpy as np
import problems
from comparing import one
from fluxface.solver.fem.mesh import Mesh
from fluxface.solver.fem.quality import quality
from fluxface.solver.geometry import tetrahedra
from fluxface.solver.geometry.sizing import LARGEST_CELL, REGULAR

RUNS = 2
GOAL = 0.2  # of the time that the defaults take


def compared(shape: str, cells: int, folder: Path) -> dict[str, dict[str, float]]:
    """Print a table; the ratios of time, iterations and smallest angle (theirs to ours) and their goals."""
    surface = problems.SHAPES[shape]()
    runs: dict[str, list[tuple[Mesh, float, float]]] = {"ours": [], "defaults": []}
    for _ in range(RUNS):
        for name, way in (("ours", problems.fitted), ("defaults", by_default)):
            runs[name].append(timed(lambda way=way: way(surface, cells)))
    print(f"\n{shape}, meshing for {cells:,} tetrahedra; least of {RUNS}")
    print(f"{'':12}{'cells':>12}{'wall s':>9}{'cpu s':>9}{'least angle':>13}{'its':>5}")
    wall, processor, angle, steps = (dict.fromkeys(runs, 0.0) for _ in range(4))
    for name, some in runs.items():
        mesh = some[0][0]
        wall[name], processor[name] = (min(run[kind] for run in some) for kind in (1, 2))
        problems.write(mesh, 1, folder / "meshed.npz")
        solved = one("ours", "-", folder / "meshed.npz")
        angle[name], steps[name] = quality(mesh).smallest, solved["iterations"] if solved else np.inf
        print(
            f"  {name:10}{len(mesh.cells):12,}{wall[name]:9.2f}{processor[name]:9.2f}{angle[name]:13.2f}"
            f"{steps[name]:5.0f}",
            flush=True,
        )
    return {
        f"{shape}, meshing: time": {"ratio": max(s["ours"] / s["defaults"] for s in (wall, processor)), "goal": GOAL},
        f"{shape}, meshing: iterations": {"ratio": steps["ours"] / steps["defaults"], "goal": 1.0},
        f"{shape}, meshing: smallest angle": {"ratio": angle["defaults"] / angle["ours"], "goal": 1.0},
    }


def by_default(surface, cells: int) -> Mesh:
    """What TetGen makes with all its settings left as they are but the largest cell; A and Q change no cell."""

    def switches(size: float, *_) -> str:
        return f"pqa{LARGEST_CELL * REGULAR * size**3:.12e}AQ"

    with patch.object(tetrahedra, "_switches", switches):
        return problems.fitted(surface, cells)


def timed(make: Callable[[], Mesh]) -> tuple[Mesh, float, float]:
    """The mesh, wall and processor seconds, those of the mesher's own process included."""
    began, before = time.perf_counter(), _processor()
    mesh = make()
    return mesh, time.perf_counter() - began, _processor() - before


def _processor() -> float:
    children = resource.getrusage(resource.RUSAGE_CHILDREN)
    return time.process_time() + children.ru_utime + children.ru_stime
