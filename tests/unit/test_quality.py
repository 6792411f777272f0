"""Angles between the faces of tetrahedra, on ones whose angles are known."""

from __future__ import annotations

import numpy as np
import pytest
from cases import mesh_of
from fluxface.solver.answers.report import shape_remarks
from fluxface.solver.fem.mesh import Mesh, joined, quadratic
from fluxface.solver.fem.quality import quality
from shapes import box

REGULAR = [[1, 1, 1], [-1, 1, -1], [1, -1, -1], [-1, -1, 1]]
CORNER = [[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1]]


def tetrahedron(corners: list[list[float]]) -> Mesh:
    none = np.zeros(0, np.int32)
    return Mesh(
        np.array(corners, float), np.arange(4)[None], np.zeros(1, np.int32), none.reshape(0, 3), none, none, none
    )


def flat(height: float) -> Mesh:
    """The corners of a square, of side 2, two opposite ones lifted: its two large angles are at the diagonals."""
    return tetrahedron([[1, 1, 0], [-1, -1, 0], [1, -1, height], [-1, 1, height]])


@pytest.mark.parametrize("order", [1, 2])
@pytest.mark.parametrize(
    ("mesh", "smallest", "largest"),
    [
        (tetrahedron(REGULAR), np.arccos(1 / 3), np.arccos(1 / 3)),
        (tetrahedron(CORNER), np.arctan(np.sqrt(2)), np.pi / 2),
        (flat(0.2), None, np.pi - 2 * np.arctan(0.2 / np.sqrt(2))),
    ],
    ids=["regular", "corner", "flat"],
)
def test_known_angles(mesh: Mesh, order: int, smallest: float | None, largest: float) -> None:
    shape = quality(mesh if order == 1 else quadratic(mesh))
    assert shape.largest == pytest.approx(np.degrees(largest), rel=1e-12)
    assert smallest is None or shape.smallest == pytest.approx(np.degrees(smallest), rel=1e-12)


def test_only_wide_angles_are_warned_of() -> None:
    """Not the flat cells of a plate, whose small angles do no harm."""
    plate = quality(mesh_of(box((0.1, 0.1, 0.0002)), 1))
    assert plate.smallest < 10 and plate.wide < 0.001 and shape_remarks(plate) == []
    # Of volumes 1/6 and 1/12.
    mixed = quality(joined([tetrahedron(CORNER), flat(1 / 16)]))
    assert mixed.wide == pytest.approx(1 / 3) and len(shape_remarks(mixed)) == 1
