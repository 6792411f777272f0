"""A part cut by a plane: what is left of its surface, and the section through its tetrahedra.

Places of the cut are told by the two nodes they lie between, so that other temperatures need no other cut.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ...solver.result import Field, skin_nodes

# A 10-node tetrahedron (mid-sides 01 12 02 03 13 23) as eight: what is quadratic over it is then seen as such.
EIGHTHS = np.array(
    [(0, 4, 6, 7), (4, 1, 5, 8), (6, 5, 2, 9), (7, 8, 9, 3), (4, 5, 6, 8), (6, 5, 9, 8), (6, 9, 7, 8), (6, 7, 4, 8)]
)


# Of the part's extent: nodes nearer to the plane are on it.
ON_PLANE = 1e-6


@dataclass(frozen=True)
class Solid:
    """What fills a part. nodes: (N, 3) in the part's own axes. cells: (M, 4 or 10). skin: (T, 3) nodes, outward there.

    centre: (M, 3), radius: (M,) of balls that hold the cells.
    """

    nodes: np.ndarray
    cells: np.ndarray
    skin: np.ndarray
    centre: np.ndarray
    radius: np.ndarray


@dataclass(frozen=True)
class Section:
    """places: (P, 3), each ``share`` (P,) of the way from node ``first`` (P,) to ``second`` (P,). triangles: (T, 3).

    The last ``faces`` triangles are the section itself, the others what is left of the surface.
    """

    places: np.ndarray
    triangles: np.ndarray
    faces: int
    first: np.ndarray
    second: np.ndarray
    share: np.ndarray

    def at(self, nodal: np.ndarray) -> np.ndarray:
        """What nodal values (N,) or (N, 3) come to at the places (P,) or (P, 3)."""
        share = self.share.reshape(-1, *[1] * (nodal.ndim - 1))
        return nodal[self.first] + share * (nodal[self.second] - nodal[self.first])


def solid_of(field: Field, part: int, matrix: np.ndarray) -> Solid:
    """matrix: (4, 4) from the world in metres to the part's own axes."""
    nodes = field.nodes @ matrix[:3, :3].T + matrix[:3, 3]
    cells = field.cells[field.cell_part == part]
    skin, triangles, of_part = skin_nodes(field)
    skin = skin[triangles[of_part == part]]
    if np.linalg.det(matrix[:3, :3]) < 0:
        skin = skin[:, ::-1]
    corners = nodes[cells[:, :4]]
    centre = corners.mean(axis=1)
    radius = np.linalg.norm(corners - centre[:, None], axis=2).max(axis=1)
    return Solid(nodes, cells, skin, centre, radius)


def section(solid: Solid, origin: np.ndarray, normal: np.ndarray) -> Section:
    """The part without what lies beyond the plane through ``origin`` (3,), where unit ``normal`` (3,) points."""
    height = (solid.nodes - origin) @ normal
    # The plane goes through nodes that are as good as on it: slivers beside them would be drawn as edges.
    height[np.abs(height) < ON_PLANE * np.ptp(solid.nodes, axis=0).max()] = 0.0
    kept, rim = _clipped(solid.skin, height)
    near = np.abs((solid.centre - origin) @ normal) <= solid.radius * (1 + 1e-6)
    cells = solid.cells[near]
    cells = cells[:, EIGHTHS].reshape(-1, 4) if cells.shape[1] == 10 else cells
    rim, cap = _through_nodes(rim, height), _through_nodes(_cut_through(cells, height), height)
    corners = np.concatenate([rim, cap])

    # Nodes that stay, and then the points between nodes, each once.
    low, high = np.sort(corners, axis=2).reshape(-1, 2).T
    between = low != high
    used = np.zeros(len(height), bool)
    used[kept], used[low[~between]] = True, True
    number, nodes = np.cumsum(used) - 1, np.flatnonzero(used)
    keys, point = np.unique(low[between].astype(np.int64) * len(height) + high[between], return_inverse=True)
    corner = number[low]
    corner[between] = len(nodes) + point.ravel()
    low, high = np.divmod(keys, len(height))
    first, second = np.concatenate([nodes, low]), np.concatenate([nodes, high])
    share = np.concatenate([np.zeros(len(nodes)), height[low] / (height[low] - height[high])])
    triangles = np.concatenate([number[kept], corner.reshape(-1, 3)])
    places = solid.nodes[first] + share[:, None] * (solid.nodes[second] - solid.nodes[first])
    return Section(places, _facing(places, triangles, len(cap), normal), len(cap), first, second, share)


def _through_nodes(corners: np.ndarray, height: np.ndarray) -> np.ndarray:
    """Triangles (C, 3, 2) of pairs of nodes, a node on the plane in place of its pair, less those that fold up."""
    on_plane = height[corners] == 0
    node = np.where(on_plane[..., :1], corners[..., :1], corners[..., 1:])
    corners = np.where(on_plane.any(axis=2, keepdims=True), node, corners)
    same = [(corners[:, i] == corners[:, j]).all(axis=1) for i, j in ((0, 1), (1, 2), (2, 0))]
    return corners[~np.any(same, axis=0)]


def _clipped(skin: np.ndarray, height: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Triangles (K, 3) that stay whole, and the rest of those that are cut, as pairs of nodes (C, 3, 2)."""
    beyond = height[skin] > 0
    count = beyond.sum(axis=1)
    # The corner alone on its side comes first; the order around stays.
    cut = np.flatnonzero((count == 1) | (count == 2))
    alone = np.where((count[cut] == 1)[:, None], beyond[cut], ~beyond[cut]).argmax(axis=1)
    a, b, c = (skin[cut, (alone + turn) % 3] for turn in range(3))
    tip = count[cut] == 2
    ab, ac = np.stack([a, b], axis=1), np.stack([a, c], axis=1)
    tips = np.stack([np.stack([a, a], axis=1), ab, ac], axis=1)[tip]
    bb, cc = np.stack([b, b], axis=1), np.stack([c, c], axis=1)
    stumps = [np.stack([bb, cc, ac], axis=1)[~tip], np.stack([bb, ac, ab], axis=1)[~tip]]
    return skin[count == 0], np.concatenate([tips, *stumps])


def _cut_through(cells: np.ndarray, height: np.ndarray) -> np.ndarray:
    """Triangles of the plane through tetrahedra (K, 4), as pairs of nodes (C, 3, 2)."""
    beyond = height[cells] > 0
    count = beyond.sum(axis=1)
    order = np.argsort(~beyond, axis=1, kind="stable")  # those beyond first
    a, b, c, d = np.take_along_axis(cells, order, axis=1).T

    def triangles(where: np.ndarray, *pairs: tuple[np.ndarray, np.ndarray]) -> np.ndarray:
        return np.stack([np.stack(pair, axis=1) for pair in pairs], axis=1)[where]

    return np.concatenate(
        [
            triangles(count == 1, (a, b), (a, c), (a, d)),
            triangles(count == 3, (d, a), (d, b), (d, c)),
            triangles(count == 2, (a, c), (a, d), (b, d)),
            triangles(count == 2, (a, c), (b, d), (b, c)),
        ]
    )


def _facing(places: np.ndarray, triangles: np.ndarray, faces: int, normal: np.ndarray) -> np.ndarray:
    """The triangles with the last ``faces`` of them turned to look along ``normal``."""
    cap = triangles[len(triangles) - faces :]
    corners = places[cap]
    away = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]) @ normal < 0
    return np.concatenate([triangles[: len(triangles) - faces], np.where(away[:, None], cap[:, ::-1], cap)])
