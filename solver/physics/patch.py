"""What a film correlation may know of a tag's faces: their shape, their slope, and lengths measured on them.

Every measure is unchanged by turning the part together with gravity, by the way its faces are triangulated, and scales
with the part. A measure that the faces do not have (the height of a level face, the diameter of a flat one) is 0.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

# A length below this share of the patch's own size is rounding, not a length.
ROUNDING = 1e-9


@dataclass(frozen=True)
class Patch:
    """The triangles of one tag.

    corners: (B, 3, 3) m. normals: (B, 3) unit, outward. areas: (B,) m2. gravity: (3,) unit.
    """

    corners: np.ndarray
    normals: np.ndarray
    areas: np.ndarray
    gravity: np.ndarray

    @property
    def upward(self) -> np.ndarray:
        """(B,) the cosine between each outward normal and straight up: 1 faces up, 0 is upright, -1 faces down."""
        return -self.normals @ self.gravity

    @property
    def along(self) -> np.ndarray:
        """(B,) the share of gravity along each face, the cosine of its lean from the vertical."""
        return np.linalg.norm(np.cross(self.normals, self.gravity), axis=1)

    def only(self, chosen: np.ndarray) -> Patch:
        """The triangles for which ``chosen`` (B,) holds."""
        return Patch(self.corners[chosen], self.normals[chosen], self.areas[chosen], self.gravity)


def height(patch: Patch) -> float:
    """Extent along gravity, m."""
    points = patch.corners.reshape(-1, 3)
    depth = points @ patch.gravity
    extent = float(np.ptp(depth))
    return extent if extent > ROUNDING * float(np.ptp(points, axis=0).max()) else 0.0


def plate_run(patch: Patch) -> float:
    """Length of a leaning plate from its lower edge to its upper one, m: its height over the mean cosine of its lean.

    Faces are taken to lean by 60° at most, where the correlations that need this length end.
    """
    lean = np.average(np.maximum(patch.along, 0.5), weights=patch.areas)
    return height(patch) / float(lean)


def area_over_rim(patch: Patch) -> float:
    """Area over perimeter, m: the rim is made of the edges that belong to one triangle only. 0 when there is no rim."""
    points, index = np.unique(patch.corners.reshape(-1, 3), axis=0, return_inverse=True)
    edges = np.sort(index.reshape(-1, 3)[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2), axis=1)
    ends, count = np.unique(edges, axis=0, return_counts=True)
    rim = ends[count == 1]
    perimeter = float(np.linalg.norm(points[rim[:, 0]] - points[rim[:, 1]], axis=1).sum())
    return float(patch.areas.sum()) / perimeter if perimeter > 0 else 0.0


def longer_side(patch: Patch) -> float:
    """The longer side of the rectangle that has the patch's second moments of area, m; exact for a rectangle."""
    centroids = patch.corners.mean(axis=1)
    area = patch.areas.sum()
    centre = patch.areas @ centroids / area
    corners, centroids = patch.corners - centre, centroids - centre
    # The second moment of a triangle: A/12 times the sum over its corners and nine times its centroid.
    moment = np.einsum("b,bij,bik->jk", patch.areas / 12, corners, corners)
    moment += np.einsum("b,bj,bk->jk", patch.areas * 9 / 12, centroids, centroids)
    return float(np.sqrt(12 * max(np.linalg.eigvalsh(moment)[-1], 0.0) / area))


def sphere_diameter(patch: Patch) -> float:
    """Diameter of the sphere fitted to the corners, m; exact for any part of a sphere."""
    return 2 * _fitted_radius(patch.corners, patch.areas)


def cylinder_diameter(patch: Patch) -> float:
    """Diameter of the circle fitted to the patch seen along its axis, m; exact for any part of a cylinder.

    The axis is the direction that the normals avoid; faces across it (the ends of a stub) are left out.
    """
    _, directions = np.linalg.eigh(np.einsum("b,bi,bj->ij", patch.areas, patch.normals, patch.normals))
    axis, across = directions[:, 0], directions[:, 1:]
    lateral = np.abs(patch.normals @ axis) < np.sqrt(0.5)
    return 2 * _fitted_radius(patch.corners[lateral] @ across, patch.areas[lateral])


def _fitted_radius(corners: np.ndarray, areas: np.ndarray) -> float:
    """Radius of the circle or sphere through ``corners`` (B, 3, 2 or 3), least squares weighted by area; 0 if flat.

    |p|^2 = 2 p.c + (r^2 - |c|^2) is linear in the unknown centre c and the bracket.
    """
    dimensions = corners.shape[-1]
    points = corners.reshape(-1, dimensions)
    if not len(points):
        return 0.0
    weights = np.sqrt(np.repeat(areas / areas.sum(), 3))
    middle = points.mean(axis=0)
    size = float(np.abs(points - middle).max())
    points = (points - middle) / size
    system = np.column_stack([2 * points, np.ones(len(points))]) * weights[:, None]
    solution, _, rank, _ = np.linalg.lstsq(system, (points**2).sum(axis=1) * weights, rcond=ROUNDING)
    if rank <= dimensions:
        return 0.0
    centre, bracket = solution[:-1], solution[-1]
    return size * float(np.sqrt(bracket + centre @ centre))
