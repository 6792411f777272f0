"""The cost of each stage against the size of the mesh, as a table and a plot, and the slope of its growth."""

from __future__ import annotations

import time
from pathlib import Path

import numpy as np
import problems
from comparing import one
from fluxface.solver.parallel import side_by_side, slices
from matplotlib.figure import Figure

STAGES = ("mesh", "order", "assemble", "set up", "solve")
BANDWIDTH = 0.5  # at least so much of it, as a goal
TRIAD, IN_CACHE, REPEATS = 20_000_000, 20_000, 5


def measured(rungs: dict[int, tuple[int, ...]], folder: Path, out: Path) -> tuple[dict, dict]:
    """Print and plot the ladder of both shapes; rungs: counts of cells for each order.

    {name: {"ratio": .., "goal": .., "at_least": True}} of the bandwidth at the largest size, and {name: slope}.
    """
    triad, shares, slopes = bandwidth(), {}, {}
    figure = Figure((7, 5), layout="constrained")
    axes = figure.subplots()
    for shape in problems.SHAPES:
        for order, counts in rungs.items():
            rows = np.array([_rung(shape, order, cells, folder) for cells in counts])
            name = f"{shape}, {('linear', 'quadratic')[order - 1]}"
            slopes[name] = slope = np.polyfit(np.log(rows[:, 0]), np.log(rows[:, 3:7].sum(axis=1)), 1)[0].item()
            print(f"\n{name}: processor seconds grow as nodes to the {slope:.2f} after meshing")
            print(f"{'nodes':>12}" + "".join(f"{stage:>10}" for stage in (*STAGES, "steps", "bandwidth")))
            for nodes, mesh, iterations, *stages, moved in rows:
                spent = "".join(f"{seconds:10.2f}" for seconds in (mesh, *stages))
                print(f"{nodes:12,.0f}{spent}{iterations:10.0f}{moved / triad:10.2f}")
            share = float(rows[-1, -1] / triad)
            shares[f"{name}: bandwidth"] = {"ratio": share, "goal": BANDWIDTH, "at_least": True}
            axes.loglog(rows[:, 0], rows[:, 3:7].sum(axis=1), "o-", label=f"{name}: slope {slope:.2f}")
    axes.set(xlabel="nodes", ylabel="processor seconds after meshing")
    axes.grid(True, which="both", alpha=0.3)
    axes.legend()
    out.mkdir(exist_ok=True)
    figure.savefig(out / "cost.png", dpi=150)
    print(f"\nBandwidth is the solve's share of a triad's {triad / 2**30:.1f} GiB/s. The plot is {out / 'cost.png'}.")
    return shares, slopes


def _rung(shape: str, order: int, cells: int, folder: Path) -> list[float]:
    """Nodes, seconds of meshing, iterations, processor seconds of the stages after it, bytes a second of the solve."""
    began = time.perf_counter()
    mesh = problems.fitted(problems.SHAPES[shape](), cells)
    seconds, given = time.perf_counter() - began, folder / "rung.npz"
    problems.write(mesh, order, given)
    run = one("ours", "-", given)
    assert run is not None
    spent = [run["processor"][stage] for stage in STAGES[1:]]
    return [run["unknowns"], seconds, run["iterations"], *spent, run["moved"] / run["wall"]["solve"]]


def bandwidth() -> float:
    """Bytes per second that a = b + s c moves on all threads: McCalpin, Memory bandwidth and machine balance (1995)."""
    a, b, c = np.zeros(TRIAD), np.ones(TRIAD), np.ones(TRIAD)

    def piece(part: slice) -> None:
        np.multiply(c[part], 3.0, out=a[part])
        np.add(a[part], b[part], out=a[part])

    spent = []
    for _ in range(REPEATS):
        began = time.perf_counter()
        side_by_side(piece, slices(TRIAD, IN_CACHE))
        spent.append(time.perf_counter() - began)
    # What the second line takes of a is still in the cache.
    return 3 * a.nbytes / min(spent)
