"""How thick the walls of a part are: from faces straight inwards to the next face."""

from __future__ import annotations

import numpy as np

from .boxes import boxes, boxes_of, meeting
from .surface import area_vectors

SAMPLES = 4000
SKIN = 1e-7  # of the reach: hits nearer than that are the face itself


def thin_places(corners: np.ndarray, reach: float) -> tuple[np.ndarray, np.ndarray]:
    """Some faces (S,) of a closed, outward-oriented surface (F, 3, 3), and the wall (S,) in m under each one's middle.

    The faces are spread evenly over their numbers; a wall thicker than ``reach`` (m) is given as infinite.
    """
    face = np.unique(np.linspace(0, len(corners) - 1, SAMPLES).astype(np.int64))
    vectors = area_vectors(corners)
    normal = vectors / np.maximum(np.linalg.norm(vectors, axis=1, keepdims=True), np.finfo(float).tiny)
    start = corners[face].mean(axis=1)
    end = start - reach * normal[face]
    wall = np.full(len(face), np.inf)
    for ray, other in meeting(boxes(np.minimum(start, end), np.maximum(start, end)), boxes_of(corners)):
        facing = np.einsum("pi,pi->p", normal[face[ray]], normal[other])
        ray, other, facing = (some[facing < -0.5] for some in (ray, other, facing))
        direction = -normal[face[ray]]
        depth = np.einsum("pi,pi->p", corners[other, 0] - start[ray], normal[other]) / -facing
        at = start[ray] + depth[:, None] * direction
        sides = np.roll(corners[other], -1, axis=1) - corners[other]
        inwards = np.einsum("pci,pi->pc", np.cross(sides, at[:, None] - corners[other]), normal[other])
        hit = (inwards >= 0).all(axis=1) & (depth > SKIN * reach) & (depth <= reach)
        np.minimum.at(wall, ray[hit], depth[hit])
    return face, wall
