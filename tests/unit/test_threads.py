"""Answers do not depend on how many threads worked on them."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
import shapes
from cases import case_of, metal
from fluxface.solver.case import Convection, Tag, write_case
from fluxface.solver.parallel import THREADS_VARIABLE
from fluxface.solver.result import read_field


@pytest.mark.slow
def test_temperatures_agree_on_one_thread_and_on_three(tmp_path: Path) -> None:
    surface = shapes.tagged(shapes.box((0.05, 0.04, 0.03)), 0, shapes.facing("-z"))
    tags = [Tag("heated", heat_flux=1e4)]
    air = Tag("", convection=Convection(298.15, 10.0))
    # Large enough for products in several blocks of rows, and for work in several pieces everywhere.
    write_case(case_of(surface, tags, material=metal(50.0), untagged=air, size=0.0019), tmp_path)
    fields = []
    for threads in (1, 3):
        out = tmp_path / f"on {threads}"
        solve = ["solve", str(tmp_path), "--out", str(out), "--progress", "none"]
        environment = {**os.environ, THREADS_VARIABLE: str(threads)}
        subprocess.run([sys.executable, "-m", "fluxface.solver", *solve], env=environment, check=True, timeout=300)
        fields.append(read_field(out))
    one, three = (field.temperature for field in fields)
    assert len(one) > 30_000 and np.ptp(one) > 1.0
    assert np.abs(one - three).max() <= 1e-10 * one.max()
