"""Ours and the general-purpose libraries on the same mesh, in turns; each of those with the best of its methods."""

from __future__ import annotations

import json
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import numpy as np
import problems
from measuring import TRUE_RESIDUAL

SCRIPT = Path(__file__).resolve().parent / "one_solve.py"
# A library's method is given up after so many times our own time, or so many seconds if that is more.
PATIENCE, LEAST_SECONDS = 30.0, 60.0
# What each library is tried with. Direct: PARDISO by way of pypardiso.
METHODS = {
    "ngsolve": {1: ("h1amg", "bddc", "multigrid, h1amg coarse", "local"), 2: ("bddc", "bddc, h1amg coarse", "local")},
    "scikit_fem": dict.fromkeys(
        (1, 2), ("smoothed aggregation", "smoothed aggregation, Chebyshev", "Ruge-Stuben", "pardiso")
    ),
    "mfem": dict.fromkeys((1, 2), ("Gauss-Seidel",)),
}
# Iterations stop at a residual; temperatures follow it with the condition of the system.
AGREE = 1e-5

Run = dict[str, Any]


def compared(comparisons: list, runs: int, folder: Path) -> dict[str, dict[str, float]]:
    """Print a table for each comparison; {name: {"ratio": .., "goal": ..}}."""
    ratios = {}
    for comparison in comparisons:
        mesh = problems.meshed(problems.SHAPES[comparison.shape](), comparison.cells)
        given = folder / "given.npz"
        problems.write(mesh, comparison.order, given)
        began = time.perf_counter()
        one("ours", "-", given)
        seconds = max(LEAST_SECONDS, PATIENCE * (time.perf_counter() - began))
        best = {library: _best(library, comparison.order, given, seconds) for library in comparison.goals}
        ours, theirs = [], {library: [] for library, method in best.items() if method}
        for _ in range(runs):
            ours.append(one("ours", "-", given))
            for library in theirs:
                theirs[library].append(one(library, best[library], given))
                _check(ours[-1], theirs[library][-1], library)
        print(f"\n{comparison.name}: {len(mesh.cells):,} in fact, {ours[0]['unknowns']:,} unknowns; medians of {runs}")
        print(f"{'':44}{'wall s':>8}{'cpu s':>8}{'GiB':>6}{'its':>5}{'residual':>10}{'ratio':>7}{'goal':>6}")
        _print_row("ours", ours)
        for library, goal in comparison.goals.items():
            if library not in theirs:
                print(f"  {library} did not manage it")
                continue
            ratio = max(_median(ours, kind) / _median(theirs[library], kind) for kind in ("wall", "processor"))
            _print_row(f"{library}, {best[library]}", theirs[library], f"{ratio:7.2f}{goal:6.2f}")
            ratios[f"{comparison.name}: {library}"] = {"ratio": ratio, "goal": goal}
    return ratios


def one(library: str, method: str, given: Path, seconds: float | None = None) -> Run | None:
    """One process's stages, and the rise of temperature it found; None if it failed, took too long or fell short."""
    rise = given.with_name("rise.npy")
    command = [sys.executable, str(SCRIPT), library, method, str(given), str(rise)]
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=seconds, check=True)
    except (subprocess.TimeoutExpired, subprocess.CalledProcessError):
        return None
    found = json.loads(done.stdout.splitlines()[-1])
    return found | {"rise": np.load(rise)} if found["residual"] <= TRUE_RESIDUAL else None


def _best(library: str, order: int, given: Path, seconds: float) -> str | None:
    tried = {method: one(library, method, given, seconds) for method in METHODS[library][order]}
    spent = {method: sum(run["processor"].values()) for method, run in tried.items() if run}
    return min(spent, key=lambda method: spent[method]) if spent else None


def _check(ours: Run | None, theirs: Run | None, library: str) -> None:
    if ours is None or theirs is None:
        raise SystemExit(f"A run of ours or of {library} failed or fell short of the residual.")
    apart = np.abs(ours["rise"] - theirs["rise"]).max() / ours["rise"].max()
    if apart > AGREE:
        raise SystemExit(f"{library} finds other temperatures: {apart:.1e} of the largest rise apart.")


def _median(runs: list[Run], kind: str) -> float:
    return float(np.median([sum(run[kind].values()) for run in runs]))


def _print_row(name: str, runs: list[Run], end: str = "") -> None:
    last = runs[-1]
    print(
        f"  {name:42}{_median(runs, 'wall'):8.2f}{_median(runs, 'processor'):8.2f}{(last['peak'] or 0) / 2**30:6.1f}"
        f"{last['iterations']:5d}{last['residual']:10.1e}{end}",
        flush=True,
    )
