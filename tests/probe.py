"""Solving a case as a user does, from case folder to result folder, and reading its field at points."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from fluxface.solver.case import Case, write_case
from fluxface.solver.command_line import main
from fluxface.solver.fem.reference import shape_functions
from fluxface.solver.result import Field, Summary, read_field, read_summary
from scipy.spatial import cKDTree

ZERO_CELSIUS = 273.15  # K
CANDIDATES = 200


@dataclass(frozen=True)
class Solved:
    """The result folder of a case, read back."""

    summary: Summary
    field: Field

    def tag(self, name: str) -> dict[str, Any]:
        """The summary's row of a tag."""
        return next(row for row in self.summary["tags"] if row["name"] == name)

    def part(self, name: str) -> dict[str, Any]:
        """The summary's row of a part."""
        return next(row for row in self.summary["parts"] if row["name"] == name)

    def kelvin(self, points: Sequence[Sequence[float]], part: int | None = None) -> np.ndarray:
        """(P,) K at points (P, 3), m; at an interface, of the part that is named by its number."""
        return temperature_at(self.field, points, part)

    def celsius(self, points: Sequence[Sequence[float]], part: int | None = None) -> np.ndarray:
        """(P,) °C at points (P, 3), m; see :meth:`kelvin`."""
        return self.kelvin(points, part) - ZERO_CELSIUS


def solved(case: Case, folder: Path) -> Solved:
    """Write the case into ``folder``, solve it by the command line, and read the result; checks that heat balances."""
    write_case(case, folder)
    assert main(["solve", str(folder), "--progress", "none"]) == 0
    result = Solved(read_summary(folder / "result"), read_field(folder / "result"))
    assert result.summary["balance"]["relative_gap"] < 1e-9
    return result


def temperature_at(field: Field, points: Sequence[Sequence[float]], part: int | None = None) -> np.ndarray:
    """(P,) K: the field at points (P, 3), m, by the shape functions of the tetrahedron that holds each.

    Raises ValueError for a point that lies in no tetrahedron (of the part, if one is named).
    """
    places = np.asarray(points, dtype=float)
    cells = field.cells if part is None else field.cells[field.cell_part == part]
    corners = field.nodes[cells[:, :4]]
    _, near = cKDTree(corners.mean(axis=1)).query(places, min(CANDIDATES, len(cells)))
    near = near.reshape(len(places), -1)
    edges = np.swapaxes(corners[near, 1:] - corners[near, :1], -1, -2)
    inner = np.linalg.solve(edges, (places[:, None] - corners[near, 0])[..., None])[..., 0]
    barycentric = np.concatenate([1.0 - inner.sum(axis=-1, keepdims=True), inner], axis=-1)
    rows = np.arange(len(places))
    best = barycentric.min(axis=-1).argmax(axis=1)
    found = barycentric[rows, best]
    if found.min() < -1e-6:
        raise ValueError(f"no tetrahedron holds {places[found.min(axis=1).argmin()]}")
    values = shape_functions(found, 1 if cells.shape[1] == 4 else 2)
    return np.einsum("pn,pn->p", values, field.temperature[cells[near[rows, best]]])
