"""One library, one mesh, a process of its own: ``python one_solve.py LIBRARY METHOD MESH.npz RISE.npy``, JSON out."""

from __future__ import annotations

import contextlib
import json
import os
import sys
from pathlib import Path

for variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(variable, "1" if sys.argv[1] == "ours" else "2")

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

import measuring  # noqa: E402
import numpy as np  # noqa: E402
import ours  # noqa: E402
import peers  # noqa: E402
import problems  # noqa: E402
from fluxface.solver import memory  # noqa: E402

SOLVERS = {"ours": ours.solve} | {solve.__name__: solve for solve in (peers.scikit_fem, peers.ngsolve, peers.mfem)}


def main(library: str, method: str, given: str, rise: str) -> None:
    clock = measuring.Clock()
    if library == "ours":
        memory.keep_freed_memory()  # as the solver's own process does
    with contextlib.redirect_stdout(sys.stderr):
        answer = SOLVERS[library](*problems.read(Path(given)), method, clock)
    np.save(rise, answer.rise)
    numbers = {"residual": answer.residual, "iterations": answer.iterations, "unknowns": answer.unknowns}
    numbers["moved"] = answer.moved
    print(json.dumps({"wall": clock.wall, "processor": clock.processor, "peak": memory.peak(), **numbers}))


if __name__ == "__main__":
    main(*sys.argv[1:])
