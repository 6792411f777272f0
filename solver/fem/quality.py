"""How well shaped the tetrahedra are, by the angles between their faces."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..parallel import slices
from .mesh import Mesh
from .volume import CELLS_AT_ONCE, geometry

# Degrees. What spoils the error of a tetrahedron is its largest angle; small ones, as flat cells in thin walls have
# them, do no harm. Krizek, On the maximum angle condition for linear tetrahedral elements, SIAM J. Numer. Anal. 29
# (1992) 513. Where to draw the line is our own choice.
WIDE = 170.0


@dataclass(frozen=True)
class Quality:
    """smallest, largest: degrees, of all angles between two faces of one cell. wide: share of the volume in cells with
    an angle above WIDE.
    """

    smallest: float
    largest: float
    wide: float


def quality(mesh: Mesh) -> Quality:
    """Measured on the straight-sided tetrahedra of either order."""
    pieces = [_extreme_cosines(mesh, piece) for piece in slices(len(mesh.cells), CELLS_AT_ONCE)]
    volume, least, most = (np.concatenate(some) for some in zip(*pieces, strict=True))
    smallest, largest = np.degrees(np.arccos(np.clip([most.max(), least.min()], -1.0, 1.0))).tolist()
    return Quality(smallest, largest, float(volume[least < np.cos(np.radians(WIDE))].sum() / volume.sum()))


def _extreme_cosines(mesh: Mesh, piece: slice) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Of each cell of a piece its volume (m3), and the least and the largest cosine of its six dihedral angles."""
    shape = geometry(mesh, piece)
    # The gradients of the barycentric coordinates are normal to the faces.
    normals = np.concatenate([-shape.gradients.sum(axis=0, keepdims=True), shape.gradients])
    normals /= np.sqrt((normals**2).sum(axis=1, keepdims=True))
    cosines = np.stack([-(normals[i] * normals[j]).sum(axis=0) for i, j in zip(*np.triu_indices(4, 1), strict=True)])
    return shape.volume, cosines.min(axis=0), cosines.max(axis=0)
