"""Contact between parts: where their faces lie against each other, and where their solids run through each other.

Two faces are *opposed* when their normals are, to within SMOOTH_TURN. An opposed pair is compared on its mean plane,
which halves the angle between them, so that a piece of overlap has the same area on either face and swapping the two
sides changes nothing. Plane faces that coincide are measured exactly.

Facets stand for a curved surface where they meet at a turn below SMOOTH_TURN. Where a convex one lies in a concave one
(a shaft in a bore of another number of segments) they are up to a facet's rise apart, or inside one another, even
though the surfaces they stand for touch; that much is added to the gap there, and nowhere else.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from .boxes import Boxes, boxes, meeting
from .surface import distances

SMOOTH_TURN = np.radians(35.0)  # curved surfaces have eleven facets to a full turn, or more
FLAT_TURN = np.radians(0.05)
GAP_OF_DIAGONAL = 1e-4
SLIVER = 1e-13  # of the smaller triangle's area
# Surfaces that cross at a smaller angle (sine of it) are left to the other places where the same solids cross.
LEAST_CROSSING = 0.04
# Any direction no modelled edge follows: rays along it do not run through edges.
ASKEW = np.linalg.qr(np.array([[0.31, 0.77, 0.29], [-0.61, 0.43, 0.53], [0.71, -0.13, 0.59]]))[0]


@dataclass(frozen=True)
class Overlap:
    """The true overlap of two triangulations, cut into K triangles.

    first, second: (K,) the triangles each piece lies on. first_barycentric, second_barycentric: (K, 3, 3) its three
    corners (axis 1) in the barycentric coordinates of each, which sum to 1 and are in 0..1 to rounding. area: (K,) m2.
    """

    first: np.ndarray
    second: np.ndarray
    first_barycentric: np.ndarray
    second_barycentric: np.ndarray
    area: np.ndarray


@dataclass(frozen=True)
class Crossing:
    """Two parts (indices) that occupy the same space, and points (n, 3) in m that lie inside both."""

    parts: tuple[int, int]
    points: np.ndarray


def overlap(first: np.ndarray, second: np.ndarray, gap: float) -> Overlap:
    """Where faces of ``first`` and ``second`` lie against each other within ``gap`` (m), either apart or overlapping.

    first: (F, 3, 3), second: (G, 3, 3) corners of outward-oriented triangles in m. Each side should be a part's whole
    surface, or whole smooth regions of it, for its curvature to be seen.

    Each piece belongs to one pair of triangles. The gap must be below the thickness of either part: a thinner one
    would be met on both its sides. On curved surfaces the pieces on one triangle may add up to slightly more than its
    area, by a fraction of the rise of a facet over its radius.

    The clipping is that of Sutherland & Hodgman, Reentrant polygon clipping, Communications of the ACM 17 (1974),
    in barycentric coordinates.
    """
    return _overlap(_faces(first), _faces(second), gap)


def covered_area(index: np.ndarray, area: np.ndarray, count: int) -> np.ndarray:
    """The area (count,) in m2 that the pieces (index (K,), area (K,)) cover of each of ``count`` triangles."""
    return np.bincount(index, weights=area, minlength=count)


def default_gap(first: np.ndarray, second: np.ndarray) -> float:
    """1e-4 of the diagonal of the pair's common bounding box (m); first (F, 3, 3), second (G, 3, 3) in m."""
    corners = np.concatenate([first.reshape(-1, 3), second.reshape(-1, 3)])
    return GAP_OF_DIAGONAL * float(np.linalg.norm(np.ptp(corners, axis=0)))


def facet_rises(corners: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """How far (m) the curved surface that a facet stands for bulges out over it, and how far it is hollow; (F,) each.

    corners: (F, 3, 3) m, outward-oriented; a rise is seen where neighbours are there.
    """
    faces = _faces(corners)
    return faces.convex_rise, faces.concave_rise


def touching_parts(corners: np.ndarray, part: np.ndarray, gap: float | None = None) -> list[tuple[int, int, float]]:
    """The pairs of parts (i < j) that touch, and the area (m2) over which they do.

    corners: (F, 3, 3) m, outward-oriented. part: (F,). gap: m, or None for each pair's :func:`default_gap`.
    """
    found = []
    for i, j, first, second, within in _pairs_of_parts(corners, part, gap):
        area = float(_overlap(first, second, within).area.sum())
        if area > 0:
            found.append((i, j, area))
    return found


def crossing_parts(corners: np.ndarray, part: np.ndarray, gap: float | None = None) -> list[Crossing]:
    """The pairs of parts whose solids overlap by more than ``gap``, also where one lies wholly within the other.

    corners: (F, 3, 3) m, closed and outward-oriented per part. part: (F,). gap: m, or None for each pair's
    :func:`default_gap`. A part in a hollow of another does not cross it.

    Solids that overlap do so just inside the lines where their surfaces meet, or else one holds a whole piece of the
    other; so those places are probed. Overlaps thinner than about three gaps may go unseen.
    """
    found = []
    for i, j, first, second, within in _pairs_of_parts(_turned(corners), part, gap):
        inside = _common_points(first, second, within)
        if len(inside):
            found.append(Crossing((i, j), inside @ ASKEW.T))
    return found


# Faces of one side -------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class _Faces:
    """One side: corners (F, 3, 3), unit normal (F, 3), area (F,), what ``_rises`` tells, body (F,), tree of its boxes.

    A body is a set of triangles that hang together by their vertices. The boxes take in the facets' rises.
    """

    corners: np.ndarray
    normal: np.ndarray
    area: np.ndarray
    convex_rise: np.ndarray
    concave_rise: np.ndarray
    body: np.ndarray
    tree: Boxes


def _faces(corners: np.ndarray) -> _Faces:
    corners = np.asarray(corners, dtype=float).reshape(-1, 3, 3)
    across = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    length = np.linalg.norm(across, axis=1)
    normal = across / np.where(length > 0, length, 1.0)[:, None]
    vertex = _vertices(corners)
    convex, concave = _rises(corners, normal, length / 2, vertex)
    reach = (convex + concave)[:, None]
    tree = boxes(corners.min(axis=1) - reach, corners.max(axis=1) + reach)
    return _Faces(corners, normal, length / 2, convex, concave, _bodies(vertex), tree)


def _vertices(corners: np.ndarray) -> np.ndarray:
    """A number (F, 3) for each corner, the same for corners at the same place."""
    points = corners.reshape(-1, 3)
    order = np.lexsort(points.T)
    fresh = np.any(np.diff(points[order], axis=0) != 0, axis=1)
    number = np.empty(len(points), dtype=np.int64)
    number[order] = np.concatenate([np.zeros(min(len(points), 1), dtype=np.int64), np.cumsum(fresh)])
    return number.reshape(-1, 3)


def _bodies(vertex: np.ndarray) -> np.ndarray:
    joined = _components(vertex[:, [0, 1]].ravel(), vertex[:, [1, 2]].ravel(), int(vertex.max(initial=-1)) + 1)
    return joined[vertex[:, 0]]


def _components(one: np.ndarray, other: np.ndarray, count: int) -> np.ndarray:
    graph = coo_array((np.ones(len(one), dtype=np.int8), (one, other)), shape=(count, count))
    return connected_components(graph, directed=False)[1] if count else np.zeros(0, dtype=np.int32)


def _rises(
    corners: np.ndarray, normal: np.ndarray, area: np.ndarray, vertex: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """What :func:`facet_rises` returns.

    A chord of width w that turns by t from one to the next has the rise w/2 tan(t/4). A facet is a plane patch of
    triangles; each of its edges counts by the share of the facet that it spans, twice curved facets add up both ways.
    Widths come from second moments of area: exact for a triangle, a fifth too much for a rectangle. Of two widths that
    meet the lesser counts, so that a fillet does not make a curved surface of the plane beside it.
    """
    count = len(corners)
    left, right, start, along = _shared_edges(corners, vertex)
    cosine = np.einsum("ei,ei->e", normal[left], normal[right])
    flat = cosine > np.cos(FLAT_TURN)
    facet = _components(left[flat], right[flat], count)
    facet_area, moment = _moments(corners, area, facet)

    bent = ~flat & (cosine > np.cos(SMOOTH_TURN))
    left, right, start, along = left[bent], right[bent], start[bent], along[bent]
    length = np.linalg.norm(along, axis=1)
    direction = along / length[:, None]
    sides = np.stack([left, right])
    inward = np.cross(normal[sides], direction)
    spread = np.einsum("sei,seij,sej->se", inward, moment[facet[sides]], inward) / facet_area[facet[sides]]
    width = np.sqrt(18 * np.maximum(spread, 0.0))
    rise = width.min(axis=0) / 2 * np.tan(np.arccos(np.clip(cosine[bent], -1, 1)) / 4)
    share = length * width / (2 * facet_area[facet[sides]]) * rise
    out = np.einsum("ei,ei->e", corners[right].mean(axis=1) - start, normal[left]) < 0
    rises = [np.bincount(facet[sides[:, way]].ravel(), share[:, way].ravel(), count)[facet] for way in (out, ~out)]
    return rises[0], rises[1]


def _shared_edges(corners: np.ndarray, vertex: np.ndarray) -> tuple[np.ndarray, ...]:
    """The edges between exactly two triangles: both triangles (E,), a point of the edge and the edge itself (E, 3)."""
    ends = np.stack([vertex, np.roll(vertex, -1, axis=1)], axis=-1).reshape(-1, 2)
    key = ends.min(axis=1) * (vertex.max(initial=0) + 1) + ends.max(axis=1)
    order = np.argsort(key, kind="stable")
    _, first, uses = np.unique(key[order], return_index=True, return_counts=True)
    first = first[uses == 2]
    one, other = order[first], order[first + 1]
    start = corners[one // 3, one % 3]
    return one // 3, other // 3, start, corners[one // 3, (one % 3 + 1) % 3] - start


def _moments(corners: np.ndarray, area: np.ndarray, facet: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Of each facet (numbers up to F) the area (F,) in m2 and the second moments about its centroid (F, 3, 3) in m4."""
    count = len(corners)
    total = np.bincount(facet, area, count)
    total[total == 0] = 1.0
    centroid = corners.mean(axis=1)
    centre = np.stack([np.bincount(facet, area * centroid[:, axis], count) for axis in range(3)], axis=1)
    offset = corners - (centre / total[:, None])[facet, None]
    summed = offset.sum(axis=1)
    each = np.einsum("fci,fcj->fij", offset, offset) + summed[:, :, None] * summed[:, None, :]
    moment = np.zeros((count, 3, 3))
    np.add.at(moment, facet, each * (area / 12)[:, None, None])
    return total, moment


# Pairs of parts -----------------------------------------------------------------------------------------------------


def _pairs_of_parts(
    corners: np.ndarray, part: np.ndarray, gap: float | None
) -> Iterator[tuple[int, int, _Faces, _Faces, float]]:
    """Each pair of parts whose bounding boxes meet, with its faces and its gap."""
    faces = {int(number): _faces(corners[part == number]) for number in np.unique(part)}
    for i, j in combinations(faces, 2):
        within = default_gap(faces[i].corners, faces[j].corners) if gap is None else gap
        one, other = faces[i].tree, faces[j].tree
        if (np.maximum(one.low[0], other.low[0]) <= np.minimum(one.high[0], other.high[0]) + within).all():
            yield i, j, faces[i], faces[j], within


# Overlap -----------------------------------------------------------------------------------------------------------


def _overlap(first: _Faces, second: _Faces, gap: float) -> Overlap:
    none = np.zeros(0, dtype=np.int64)
    pieces = [Overlap(none, none, np.zeros((0, 3, 3)), np.zeros((0, 3, 3)), np.zeros(0))]
    pieces += [_pieces(first, second, i, j, gap) for i, j in meeting(first.tree, second.tree, gap)]
    return Overlap(*(np.concatenate([vars(piece)[name] for piece in pieces]) for name in vars(pieces[0])))


def _pieces(first: _Faces, second: _Faces, i: np.ndarray, j: np.ndarray, gap: float) -> Overlap:
    """The overlap of the triangles i (P,) of ``first``, each with its own of j (P,)."""
    cosine = np.einsum("pi,pi->p", first.normal[i], second.normal[j])
    opposed = cosine < -np.cos(SMOOTH_TURN)
    i, j = i[opposed], j[opposed]
    mates, clearance = _mates(first, second, i, j, cosine[opposed])
    first_in_second = (first.convex_rise[i] > 0) & (second.concave_rise[j] > 0)
    second_in_first = (second.convex_rise[j] > 0) & (first.concave_rise[i] > 0)
    apart = gap + first_in_second * first.convex_rise[i] + second_in_first * second.convex_rise[j]
    inside = gap + first_in_second * second.concave_rise[j] + second_in_first * first.concave_rise[i]
    # All that bounds a piece is linear on the first triangle, so its values (P, 3) at the corners there say it all.
    bounds = np.concatenate([mates, np.stack([apart[:, None] - clearance, clearance + inside[:, None]], -1)], axis=2)

    possible = (bounds.max(axis=1) > 0).all(axis=1)
    i, j, mates, bounds = i[possible], j[possible], mates[possible], bounds[possible]
    polygon = np.broadcast_to(np.eye(3), (len(i), 3, 3))
    size = np.full(len(i), 3)
    for bound in range(bounds.shape[2]):
        if (bounds[:, :, bound] < 0).any():
            polygon, size = _clipped(polygon, size, bounds[:, :, bound])
            left = size >= 3
            polygon, size, i, j, mates, bounds = (a[left] for a in (polygon, size, i, j, mates, bounds))
    owner, on_first = _fan(polygon, size)
    i, j = i[owner], j[owner]
    # The determinant of barycentric coordinates, which sum to 1: the share of the triangle's area.
    one, two = on_first[:, 1, 1:] - on_first[:, 0, 1:], on_first[:, 2, 1:] - on_first[:, 0, 1:]
    area = np.abs(one[:, 0] * two[:, 1] - one[:, 1] * two[:, 0]) * first.area[i]
    kept = area > SLIVER * np.minimum(first.area[i], second.area[j])
    on_second = np.einsum("kcv,kvm->kcm", on_first[kept], mates[owner[kept]])
    return Overlap(i[kept], j[kept], on_first[kept], on_second, area[kept])


def _mates(
    first: _Faces, second: _Faces, i: np.ndarray, j: np.ndarray, cosine: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Where the corners of triangles i fall on triangles j along the pair's mean normal, and how far that is.

    Returns barycentric coordinates on j (P, 3 corners, 3) and the clearance (P, 3) in m, negative where i is inside.
    """
    mean = (first.normal[i] - second.normal[j]) / np.sqrt(2 - 2 * cosine)[:, None]
    origin = second.corners[j, 0]
    one, two = second.corners[j, 1] - origin, second.corners[j, 2] - origin
    offset = first.corners[i] - origin[:, None]
    span = np.einsum("pi,pi->p", np.cross(one, two), mean)[:, None]
    along_one = np.einsum("pci,pi->pc", offset, np.cross(two, mean) / span)
    along_two = np.einsum("pci,pi->pc", offset, np.cross(mean, one) / span)
    mates = np.stack([1 - along_one - along_two, along_one, along_two], axis=-1)
    clearance = np.einsum("pci,pi->pc", offset, second.normal[j]) / np.sqrt((1 - cosine) / 2)[:, None]
    return mates, clearance


def _clipped(polygon: np.ndarray, size: np.ndarray, bound: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Convex polygons (P, V, 3), ``size`` (P,) corners each, cut to where the linear function ``bound`` (P, 3) is >= 0.

    Returns polygons (P, V + 1, 3) and their sizes.
    """
    slot = np.arange(polygon.shape[1])
    used = slot < size[:, None]
    following = np.where(slot + 1 < size[:, None], slot + 1, 0)
    value = np.einsum("pvc,pc->pv", polygon, bound)
    next_value = np.take_along_axis(value, following, axis=1)
    next_corner = np.take_along_axis(polygon, following[:, :, None], axis=1)
    inside = used & (value >= 0)
    cuts = used & ((value >= 0) != (next_value >= 0))
    fraction = value / np.where(cuts, value - next_value, 1.0)
    cut = polygon + fraction[:, :, None] * (next_corner - polygon)
    corner = np.stack([polygon, cut], axis=2).reshape(len(polygon), 2 * len(slot), 3)
    kept = np.stack([inside, cuts], axis=2).reshape(len(polygon), 2 * len(slot))
    order = np.argsort(~kept, axis=1, kind="stable")[:, : len(slot) + 1]
    return np.take_along_axis(corner, order[:, :, None], axis=1), np.minimum(kept.sum(axis=1), len(slot) + 1)


def _fan(polygon: np.ndarray, size: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The triangles that the polygons (P, V, 3) are made of: their polygon (K,) and their corners (K, 3, 3)."""
    owner, middle = np.nonzero(np.arange(1, polygon.shape[1] - 1) < size[:, None] - 1)
    corners = np.stack([polygon[owner, 0], polygon[owner, middle + 1], polygon[owner, middle + 2]], axis=1)
    return owner, corners


# Crossing ----------------------------------------------------------------------------------------------------------


def _turned(corners: np.ndarray) -> np.ndarray:
    """The corners in axes that no modelled edge follows, rounded alike wherever they are alike."""
    return (np.asarray(corners, dtype=float)[..., None] * ASKEW).sum(axis=-2)


def _common_points(first: _Faces, second: _Faces, gap: float) -> np.ndarray:
    """Points (n, 3) that lie inside both, deeper than ``gap`` and what facets cost; in askew axes."""
    probes = [_heart(first, gap), _heart(second, gap)]
    probes += [_beside_meeting_line(first, second, i, j, gap) for i, j in meeting(first.tree, second.tree, 0.0)]
    points = np.concatenate(probes)
    for side in (first, second):
        points = points[_clear(side, points, gap)]
    for side in (first, second):
        points = points[_enclosed(side, points)]
    return points


def _heart(faces: _Faces, gap: float) -> np.ndarray:
    """A point (n, 3) just under the largest triangle of each body."""
    order = np.argsort(-faces.area, kind="stable")
    largest = order[np.unique(faces.body[order], return_index=True)[1]]
    depth = 1.5 * (gap + faces.concave_rise[largest])
    return faces.corners[largest].mean(axis=1) - depth[:, None] * faces.normal[largest]


def _beside_meeting_line(first: _Faces, second: _Faces, i: np.ndarray, j: np.ndarray, gap: float) -> np.ndarray:
    """Points (n, 3) under both triangles of those pairs i, j (P,) that meet in a line, next to its midpoint.

    The line by the interval method of Möller, A fast triangle-triangle intersection test, Journal of Graphics
    Tools 2 (1997).
    """
    cosine = np.einsum("pi,pi->p", first.normal[i], second.normal[j])
    proper = (1 - cosine**2 > LEAST_CROSSING**2) & (first.area[i] > 0) & (second.area[j] > 0)
    i, j, cosine = i[proper], j[proper], cosine[proper]
    normal, other_normal = first.normal[i], second.normal[j]
    line = np.cross(normal, other_normal)
    origin = first.corners[i, :1]
    corners, others = first.corners[i] - origin, second.corners[j] - origin
    offset = np.einsum("pi,pi->p", others[:, 0], other_normal)
    low, high = _interval(corners, line, other_normal, offset, gap)
    other_low, other_high = _interval(others, line, normal, np.zeros(len(i)), gap)
    low, high = np.maximum(low, other_low), np.minimum(high, other_high)

    meets = low < high
    normal, other_normal, line = normal[meets], other_normal[meets], line[meets]
    square = 1 - cosine[meets] ** 2
    beta = offset[meets] / square
    middle = (low[meets] + high[meets]) / 2 / square
    place = origin[meets, 0] + beta[:, None] * (other_normal - cosine[meets, None] * normal) + middle[:, None] * line
    depth = 1.5 * (gap + np.maximum(first.concave_rise[i[meets]], second.concave_rise[j[meets]]))
    return place - (depth / (1 + cosine[meets]))[:, None] * (normal + other_normal)


def _interval(
    corners: np.ndarray, line: np.ndarray, normal: np.ndarray, offset: np.ndarray, gap: float
) -> tuple[np.ndarray, np.ndarray]:
    """Where triangles (P, 3, 3) meet the planes ``normal`` . x = ``offset``, from and to along ``line``; (P,) each.

    Corners within a thousandth of the gap count as on the plane. Without a meeting, from is +inf and to is -inf.
    """
    height = np.einsum("pci,pi->pc", corners, normal) - offset[:, None]
    height[np.abs(height) < 1e-3 * gap] = 0.0
    along = np.einsum("pci,pi->pc", corners, line)
    next_height, next_along = np.roll(height, -1, axis=1), np.roll(along, -1, axis=1)
    passes = height * next_height < 0
    fraction = height / np.where(passes, height - next_height, 1.0)
    place = np.concatenate([along, along + fraction * (next_along - along)], axis=1)
    meets = np.concatenate([height == 0, passes], axis=1)
    return np.where(meets, place, np.inf).min(axis=1), np.where(meets, place, -np.inf).max(axis=1)


def _clear(faces: _Faces, points: np.ndarray, gap: float) -> np.ndarray:
    """Whether points (S, 3) are farther than ``gap`` from every triangle, and than its hollow rise besides; (S,)."""
    clear = np.ones(len(points), dtype=bool)
    for point, face in meeting(boxes(points, points), faces.tree, gap):
        near = distances(points[point], faces.corners[face]) <= gap + faces.concave_rise[face]
        clear[point[near]] = False
    return clear


def _enclosed(faces: _Faces, points: np.ndarray) -> np.ndarray:
    """Whether points (S, 3) lie in the material, by how often a ray along the third axis leaves and enters it; (S,)."""
    far = points.copy()
    far[:, 2] = np.maximum(points[:, 2], faces.tree.high[0][0, 2])
    leaves = np.zeros(len(points))
    for point, face in meeting(boxes(points, far), faces.tree, 0.0):
        offset = faces.corners[face] - points[point, None]
        flat, next_flat = offset[:, :, :2], np.roll(offset, -1, axis=1)[:, :, :2]
        turn = flat[:, :, 0] * next_flat[:, :, 1] - flat[:, :, 1] * next_flat[:, :, 0]
        through = (turn > 0).all(axis=1) | (turn < 0).all(axis=1)
        rises = faces.normal[face, 2]
        height = np.einsum("pi,pi->p", offset[:, 0], faces.normal[face])
        hit = through & (height * rises > 0)
        leaves += np.bincount(point[hit], np.sign(rises[hit]), len(points))
    return leaves > 0.5
