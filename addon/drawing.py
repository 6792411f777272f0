"""What all that is drawn over the 3D view shares."""

from __future__ import annotations

from mathutils import Matrix

# Towards the eye, enough to win over the face itself and too little to show through a thin wall: as a share of the
# distance in perspective, and of the whole depth without it.
LIFT = 1e-3
FLAT_LIFT = 5e-7


def lifted(projection: Matrix) -> Matrix:
    """The projection with everything a little nearer to the eye in depth, and nowhere else."""
    nearer = projection.copy()
    if projection[3][3]:
        nearer[2][3] -= FLAT_LIFT
    else:
        nearer[2][3] *= 1.0 + LIFT
    return nearer
