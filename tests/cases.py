"""Cases and meshes for tests, in one line each. Materials are invented; lengths in metres, temperatures in kelvin."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from fluxface.solver.case import UNTAGGED, Accuracy, Case, Part, Surface, Tag
from fluxface.solver.fem.mesh import Mesh, quadratic
from fluxface.solver.geometry.surface import weld
from fluxface.solver.geometry.tetrahedra import fill
from fluxface.solver.materials import Material, Property


def metal(*conductivity: Property) -> Material:
    """An invented material: one conductivity, or three along the world's axes, W/(m K)."""
    return Material("invented metal", conductivity or (50.0,), density=2000.0, heat_capacity=500.0)


def case_of(
    surface: Surface,
    tags: Sequence[Tag],
    *,
    material: Material | Sequence[Material] | None = None,
    heat: float | Sequence[float] = 0.0,
    untagged: Tag = UNTAGGED,
    order: int = 2,
    size: float | None = None,
    **others: Any,
) -> Case:
    """A case whose parts are all there are in the surface; material and heat (W): one for all, or one for each."""
    count = int(surface.part.max()) + 1
    materials = [material or metal()] * count if material is None or isinstance(material, Material) else material
    heats = np.broadcast_to(heat, count).tolist()
    parts = [Part(f"part {i}", materials[i], heat=heats[i]) for i in range(count)]
    return Case(surface, tuple(parts), tuple(tags), untagged, accuracy=Accuracy(order, size), **others)


def mesh_of(surface: Surface, order: int, size: float | None = None) -> Mesh:
    """The tetrahedra of a surface of one part."""
    mesh = fill(weld(surface), "part", 0, Accuracy(order, size))
    return mesh if order == 1 else quadratic(mesh)


@dataclass(frozen=True)
class Ran:
    """What a run of the command line gave: its exit code and the lines of its two streams."""

    code: int
    out: str
    err: str

    @property
    def trouble(self) -> dict[str, Any]:
        """The JSON on the last line of stderr."""
        return json.loads(self.err.splitlines()[-1])


def run(*arguments: object, cwd: Path | None = None) -> Ran:
    """``python -m fluxface.solver`` with the arguments, in a process of its own."""
    command = [sys.executable, "-m", "fluxface.solver", *map(str, arguments)]
    environment = {**os.environ, "PYTHONIOENCODING": "utf-8"}
    done = subprocess.run(
        command, cwd=cwd, env=environment, capture_output=True, encoding="utf-8", timeout=300, check=False
    )
    return Ran(done.returncode, done.stdout, done.stderr)
