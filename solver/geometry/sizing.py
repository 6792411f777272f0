"""How large the tetrahedra shall be, for heat: of the whole part, in thin walls, and where heat is brought in.

Measured on invented parts, the rise of the patch's mean, against meshes of 0.24 to 1.2 million nodes:

- *Thin walls.* Across a wall heat takes a parabola at most, which one quadratic tetrahedron holds; what counts is how
  it spreads along. To keep tetrahedra as wide as the wall is thick costs nodes and brings nothing. A plate of
  200 x 200 x 0.3 mm with 10 W on 1 cm2: 236,000 nodes with a bound on the shape of cells and 0.2 % low, 41,000 nodes
  without it and 0.01 % low once the patch is refined. A sink of twelve 1 mm fins: 105,000 nodes and 0.15 % low against
  38,000 and 0.14 %. A size that is given holds along such walls too, up to ten times their thickness.
- *Where heat comes in* its flux jumps at the patch's outline, and there most of the error sits. A block of
  50 x 50 x 15 mm of 15 W/(m K) with 20 W on 1 cm2: 29,000 nodes and 0.46 % low; 33,000 and 0.01 % low once the
  patch has ten edges along its side.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..case import Surface, Tag
from .surface import areas, triangle_corners
from .thickness import thin_places

REGULAR = 1.0 / (6.0 * np.sqrt(2.0))  # volume of the regular tetrahedron of unit edge
# Measured on boxes of 1e3 to 4e5 tetrahedra: with the largest volume at 1.5 regular tetrahedra of the wanted edge,
# the mean edge comes out within 2 % of it (4 % on coarse ones) and the mean volume at 0.76.
LARGEST_CELL = 1.5
MEAN_CELL = 0.76
CELLS_BY_DEFAULT = 20_000
# Edges along the side of a square patch that brings heat in.
EDGES_OF_A_PATCH = 10
# Above so many points that walls would take if tetrahedra were as wide as they are thick, they need not be.
POINTS_OF_WALLS = 10_000
# Bounds on the ratio of a tetrahedron's circumradius to its shortest edge and on its dihedral angles, in degrees.
# A ratio of 30 or 100 would spare more nodes still where walls are below a thousandth of the part, but there are
# surfaces on which the mesher then fails or never ends.
COMPACT_CELLS, FLAT_CELLS = "1.414/10", "10/0"
# The longest edge over the mean, once edges are halved: right-angled triangles whose longest sides are spread between
# it and 1 / sqrt(2) of it.
LONGEST_EDGE = 1.45


def size_by_default(volume: float) -> float:
    """Mean edge (m) at which a compact body of ``volume`` (m3) takes CELLS_BY_DEFAULT tetrahedra."""
    return float(np.cbrt(volume / (CELLS_BY_DEFAULT * MEAN_CELL * REGULAR)))


def points_of_walls(corners: np.ndarray, size: float) -> float:
    """How many points walls thinner than ``size`` (m) take if tetrahedra are as wide as they are thick."""
    face, wall = thin_places(corners, size)
    area = areas(corners)
    return float(area.sum() / area[face].sum() * (area[face] / wall**2).sum())


def sizes_at(surface: Surface, tags: Sequence[Tag], untagged: Tag, chosen: bool) -> np.ndarray:
    """(F,) m: the longest edge each triangle shall have; infinite where the part's own size will do.

    A tag that brings heat in has its faces refined when sizes are ``chosen``, and not given by the case.
    """
    every = (untagged, *tags)
    area = np.bincount(surface.tag + 1, areas(triangle_corners(surface)), len(every))
    of_tag = np.full(len(every), np.inf)
    for number, tag in enumerate(every):
        if tag.size is not None:
            of_tag[number] = LONGEST_EDGE * tag.size
        elif chosen and (tag.heat or tag.heat_flux or tag.temperature is not None):
            of_tag[number] = np.sqrt(area[number]) / EDGES_OF_A_PATCH
    return of_tag[surface.tag + 1]
