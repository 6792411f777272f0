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
PATIENCE, LEAST_SECONDS = 8.0, 40.0
# What each library is tried with; others of peers.py took half as long again or more on the linear sink.
# Direct: PARDISO by way of pypardiso.
METHODS = {
    "ngsolve": {1: ("bddc", "h1amg"), 2: ("bddc", "bddc, h1amg coarse")},
    "scikit_fem": dict.fromkeys((1, 2), ("smoothed aggregation", "pardiso")),
    "mfem": dict.fromkeys((1, 2), ("Gauss-Seidel",)),
}
# Iterations stop at a residual; temperatures follow it with the condition of the system.
AGREE = 1e-5

Run = dict[str, Any]


class TooSlow(Exception):
    """A library took longer than it was given."""


def compared(comparison: Any, folder: Path) -> dict[str, dict[str, Any]]:
    """Print a table; {name: {"ratio": .., "goal": ..}}, with "bound" where a library was given up: no more than that.

    The ratio is None where a library is missing, failed or found other temperatures.
    """
    mesh = problems.meshed(problems.SHAPES[comparison.shape](), comparison.cells)
    given = folder / "given.npz"
    problems.write(mesh, comparison.order, given)
    began = time.perf_counter()
    ours = [_own(given)]
    seconds = max(LEAST_SECONDS, PATIENCE * (time.perf_counter() - began))
    print(f"\n{comparison.name}: {len(mesh.cells):,} in fact, {ours[0]['unknowns']:,} unknowns", flush=True)
    tried = {library: _tried(library, comparison.order, given, seconds) for library in comparison.goals}
    for _ in range(comparison.runs - 1):  # what was tried first is each one's first run
        ours.append(_own(given))
        for library, (method, runs, _) in tried.items():
            run = method and _one_or_none(library, method, given, seconds)
            if run:
                runs.append(run)
    print(f"{'medians':44}{'wall s':>8}{'cpu s':>8}{'GiB':>6}{'its':>5}{'residual':>10}{'ratio':>7}{'goal':>6}")
    _print_row("ours", ours)
    found: dict[str, dict[str, Any]] = {}
    for library, goal in comparison.goals.items():
        method, runs, in_time = tried[library]
        ratio, bound = None, not runs and not in_time
        if runs and _agree(ours[0], runs[0], library):
            ratio = max(_median(ours, kind) / _median(runs, kind) for kind in ("wall", "processor"))
            _print_row(f"{library}, {method}", runs, f"{ratio:7.2f}{goal:6.2f}")
        elif bound:
            ratio = _median(ours, "wall") / seconds
            print(f"  {library} was given up after {seconds:.0f} s{ratio:47.2f}{goal:6.2f}  at most")
        elif not runs:
            print(f"  {library} is missing or did not manage it")
        found[f"{comparison.name}: {library}"] = {"ratio": ratio, "goal": goal} | ({"bound": True} if bound else {})
    if comparison.memory and ours[-1]["peak"]:
        share = ours[-1]["peak"] / comparison.memory
        found[f"{comparison.name}: memory"] = {"ratio": share, "goal": 1.0}
        print(f"  memory: {share:.2f} of {comparison.memory / 2**30:.0f} GiB")
    return found


def one(library: str, method: str, given: Path, seconds: float | None = None) -> Run | None:
    """One process's stages, and the rise of temperature it found; None if it failed or fell short of the residual.

    Raises TooSlow.
    """
    rise = given.with_name("rise.npy")
    command = [sys.executable, str(SCRIPT), library, method, str(given), str(rise)]
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=seconds, check=True)
    except subprocess.TimeoutExpired as late:
        raise TooSlow from late
    except subprocess.CalledProcessError:
        return None
    found = json.loads(done.stdout.splitlines()[-1])
    return found | {"rise": np.load(rise)} if found["residual"] <= TRUE_RESIDUAL else None


def _own(given: Path) -> Run:
    run = one("ours", "-", given)
    if run is None:
        raise SystemExit("A run of ours failed or fell short of the residual.")
    return run


def _one_or_none(library: str, method: str, given: Path, seconds: float) -> Run | None:
    try:
        return one(library, method, given, seconds)
    except TooSlow:
        return None


def _tried(library: str, order: int, given: Path, seconds: float) -> tuple[str | None, list[Run], bool]:
    """The method that takes the least processor time and its run, if any; whether all of them ended in time."""
    best, least, in_time = None, np.inf, True
    runs: list[Run] = []
    for method in METHODS[library][order]:
        try:
            run = one(library, method, given, seconds)
        except TooSlow:
            in_time = False
            continue
        if run and (spent := sum(run["processor"].values())) < least:
            best, least, runs = method, spent, [run]
    return best, runs, in_time


def _agree(ours: Run, theirs: Run, library: str) -> bool:
    apart = np.abs(ours["rise"] - theirs["rise"]).max() / ours["rise"].max()
    if apart > AGREE:
        print(f"  {library} finds other temperatures: {apart:.1e} of the largest rise apart")
    return bool(apart <= AGREE)


def _median(runs: list[Run], kind: str) -> float:
    return float(np.median([sum(run[kind].values()) for run in runs]))


def _print_row(name: str, runs: list[Run], end: str = "") -> None:
    last = runs[-1]
    print(
        f"  {name:42}{_median(runs, 'wall'):8.2f}{_median(runs, 'processor'):8.2f}{(last['peak'] or 0) / 2**30:6.1f}"
        f"{last['iterations']:5d}{last['residual']:10.1e}{end}",
        flush=True,
    )
