"""Mending what is a matter of bookkeeping: doubled and flat faces, loose corners on edges, flipped faces, small holes.

Each step takes a surface, already welded, and gives the surface and how many faces or edges it changed.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from ..case import Surface
from .boxes import boxes, meeting
from .crossing import crossings
from .edges import boundary_sides, edges_of, groups, neighbours, shells
from .surface import areas, diagonal, enclosed_volume, triangle_corners
from .winding import closing_cone, windings

# Flatter triangles than this share of the part's diagonal have no area to speak of.
FLAT = 1e-6
STITCHES = 8
ASIDE = 1e-5  # of the diagonal: how far beside a face its two sides are probed
SAMPLES_OF_SHELL = 8


def tidied(surface: Surface) -> tuple[Surface, tuple[str, ...]]:
    """The surface with every step of bookkeeping taken, and a sentence on each that changed anything."""
    steps: tuple[tuple[Callable[[Surface], tuple[Surface, int]], str], ...] = (
        (without_flat, "Faces without an area were dropped ({})."),
        (without_doubled, "Doubled faces were dropped ({})."),
        (stitched, "Edges were split at corners that lie on them ({})."),
        (without_doubled, "Faces doubled after that were dropped ({})."),
        (oriented, "Faces that pointed the wrong way were turned ({})."),
        (without_inner, "Faces that lie within the solid were left out ({})."),
    )
    said = []
    for step, sentence in steps:
        surface, count = step(surface)
        if count:
            said.append(sentence.format(count))
    return surface, tuple(said)


def chosen(surface: Surface, faces: np.ndarray) -> Surface:
    """The surface of some of its triangles (indices or a mask), its vertices kept."""
    return Surface(
        surface.vertices, surface.triangles[faces], surface.part[faces], surface.tag[faces], surface.face[faces]
    )


def doubled(surface: Surface) -> np.ndarray:
    """(F,) whether a triangle is one too many over its corners; all are, where as many look one way as the other."""
    ordered = np.sort(surface.triangles, axis=1)
    _, group = np.unique(ordered, axis=0, return_inverse=True)
    group = group.reshape(-1)
    first, second, third = surface.triangles.T
    even = np.where(((first < second) ^ (second < third)) ^ (third < first), 1, -1)
    surplus = np.bincount(group, even)[group]
    order = np.lexsort((np.arange(len(group)), even != np.sign(surplus), group))
    leads = np.concatenate([[True], np.diff(group[order]) != 0]) if len(order) else np.zeros(0, bool)
    kept = np.zeros(len(group), bool)
    kept[order[leads]] = True
    return ~(kept & (surplus != 0))


def without_doubled(surface: Surface) -> tuple[Surface, int]:
    """One of each set of triangles over the same corners; none where as many look one way as the other."""
    extra = doubled(surface)
    return chosen(surface, ~extra), int(np.count_nonzero(extra))


def heights(corners: np.ndarray) -> np.ndarray:
    """(F,) m: of triangles (F, 3, 3), over their longest side."""
    longest = np.linalg.norm(corners - np.roll(corners, 1, axis=1), axis=2).max(axis=1)
    return 2 * areas(corners) / np.where(longest > 0, longest, 1.0)


def without_flat(surface: Surface) -> tuple[Surface, int]:
    """Without the triangles whose three corners lie on a line."""
    flat = heights(triangle_corners(surface)) < FLAT * diagonal(surface.vertices)
    return chosen(surface, ~flat), int(np.count_nonzero(flat))


def stitched(surface: Surface) -> tuple[Surface, int]:
    """Open sides split where open corners of other triangles lie on them."""
    split = 0
    for _ in range(STITCHES):
        surface, count = _stitched_once(surface)
        split += count
        if not count:
            break
    return surface, split


def _stitched_once(surface: Surface) -> tuple[Surface, int]:
    """Of each triangle at most one side is split, in as many pieces as it has corners on it."""
    edges = edges_of(surface.triangles)
    sides = boundary_sides(edges)
    if not len(sides):
        return surface, 0
    reach = FLAT * diagonal(surface.vertices)
    loose = np.unique(np.concatenate([edges.start[sides], edges.end[sides]]))
    start, end, at = surface.vertices[edges.start[sides]], surface.vertices[edges.end[sides]], surface.vertices[loose]
    pairs = list(meeting(boxes(np.minimum(start, end), np.maximum(start, end)), boxes(at, at), reach))
    side, corner = (np.concatenate(some) for some in zip(*pairs, strict=True)) if pairs else (np.zeros(0, int),) * 2
    along = end[side] - start[side]
    length = np.linalg.norm(along, axis=1)
    fraction = np.einsum("pi,pi->p", at[corner] - start[side], along) / length**2
    off = np.linalg.norm(at[corner] - start[side] - fraction[:, None] * along, axis=1)
    on = (off < reach) & (fraction * length > reach) & ((1 - fraction) * length > reach)
    side, corner, fraction = sides[side[on]], loose[corner[on]], fraction[on]
    on_tip = (surface.triangles[side // 3] == corner[:, None]).any(axis=1)  # the triangle's own third corner
    side, corner, fraction = side[~on_tip], corner[~on_tip], fraction[~on_tip]
    chosen_side = np.full(len(surface.triangles), -1)
    chosen_side[side // 3] = side
    now = chosen_side[side // 3] == side
    side, corner, fraction = side[now], corner[now], fraction[now]
    order = np.lexsort((fraction, side))
    return _split(surface, side[order], corner[order]), len(np.unique(side))


def _split(surface: Surface, side: np.ndarray, corner: np.ndarray) -> Surface:
    """Sides (S,), sorted, at most one a triangle, cut at corners (S,), which follow each other along each side."""
    face, local = side // 3, side % 3
    tip = surface.triangles[face, (local + 2) % 3]
    first = np.concatenate([[True], np.diff(side) != 0]) if len(side) else np.zeros(0, bool)
    last = np.roll(first, -1)
    before = np.where(first, surface.triangles[face, local], np.roll(corner, 1))
    pieces = np.stack([before, corner, tip], axis=1)
    ends = np.stack([corner, surface.triangles[face, (local + 1) % 3], tip], axis=1)[last]
    whole = np.setdiff1d(np.arange(len(surface.triangles)), face)
    origin = np.concatenate([whole, face, face[last]])
    triangles = np.concatenate([surface.triangles[whole], pieces, ends]).astype(np.int32)
    return replace(chosen(surface, origin), triangles=triangles)


def oriented(surface: Surface) -> tuple[Surface, int]:
    """Each shell of one direction throughout, outwards, but inwards where it bounds a cavity.

    A shell within the solid of another bounds a cavity unless both were given looking outwards.
    """
    count = len(surface.triangles)
    if not count:
        return surface, 0
    turned = against_their_shell(surface)
    shell = shells(surface.triangles)
    triangles = np.where(turned[:, None], surface.triangles[:, ::-1], surface.triangles)
    backwards = backward_shells(surface.vertices, triangles, shell)[shell]
    triangles = np.where(backwards[:, None], triangles[:, ::-1], triangles)
    changed = int(np.count_nonzero(turned != backwards))
    return replace(surface, triangles=np.ascontiguousarray(triangles, np.int32)), changed


def against_their_shell(surface: Surface) -> np.ndarray:
    """(F,) triangles to turn so that each shell has one direction: that of the greater part of its area.

    On two copies of each triangle, one as given and one turned, linked where they agree, a shell falls in two halves.
    """
    one, other, agree = neighbours(edges_of(surface.triangles))
    count = len(surface.triangles)
    one, other = one // 3, other // 3
    mate = np.where(agree, other, other + count)
    group = groups(np.concatenate([one, one + count]), np.concatenate([mate, (mate + count) % (2 * count)]), 2 * count)
    weight = np.bincount(group[:count], areas(triangle_corners(surface)), group.max() + 1)
    return weight[group[:count]] < weight[group[count:]]


def backward_shells(vertices: np.ndarray, triangles: np.ndarray, shell: np.ndarray) -> np.ndarray:
    """(S,) whether each shell is to be turned as a whole."""
    faces = [np.flatnonzero(shell == number) for number in range(shell.max() + 1)]
    chains = [np.concatenate([vertices[triangles[f]], closing_cone(vertices, triangles[f])]) for f in faces]
    volume = np.array([enclosed_volume(chain) for chain in chains])
    inside = _shells_inside(vertices, triangles, faces)
    inward = volume < 0
    final = np.where(inward, -1, 1)
    order = np.argsort(-np.abs(volume), kind="stable")
    for rank, number in enumerate(order):  # larger ones first: a shell is held by larger ones only
        around = order[:rank][inside[order[:rank], number]]
        holder = around[-1:]
        in_solid = final[around].sum() >= 1
        final[number] = -1 if in_solid and (inward[number] or inward[holder].any()) else 1
    return (final < 0) != inward


def _shells_inside(vertices: np.ndarray, triangles: np.ndarray, faces: list[np.ndarray]) -> np.ndarray:
    """(S, S) whether the first shell winds about all of some points of the second."""
    picks = [some[np.linspace(0, len(some) - 1, SAMPLES_OF_SHELL).astype(np.int64)] for some in faces]
    points = vertices[triangles[np.concatenate(picks)]].mean(axis=1)
    low, high = points.reshape(len(faces), -1, 3).min(axis=1), points.reshape(len(faces), -1, 3).max(axis=1)
    inside = np.zeros((len(faces), len(faces)), bool)
    for number, some in enumerate(faces):
        corners = vertices[triangles[some]].reshape(-1, 3)
        held = ((low >= corners.min(axis=0)) & (high <= corners.max(axis=0))).all(axis=1)
        held[number] = False
        if held.any():
            around = windings(points.reshape(len(faces), -1, 3)[held].reshape(-1, 3), vertices, triangles[some])
            inside[number, held] = (np.abs(around) > 0.5).reshape(-1, SAMPLES_OF_SHELL).all(axis=1)
    return inside


def without_inner(surface: Surface) -> tuple[Surface, int]:
    """Without the closed shells that have solid on both their sides; nothing where the surface crosses itself."""
    shell = shells(surface.triangles)
    if shell.max(initial=0) == 0 or len(crossings(surface.vertices, surface.triangles, most=1).pairs):
        return surface, 0
    corners = triangle_corners(surface)
    size = areas(corners)
    order = np.lexsort((-size, shell))
    largest = order[np.unique(shell[order], return_index=True)[1]]
    normal = np.cross(corners[largest, 1] - corners[largest, 0], corners[largest, 2] - corners[largest, 0])
    aside = ASIDE * normal / np.linalg.norm(normal, axis=1, keepdims=True)
    middle = corners[largest].mean(axis=1)
    outside, within = (
        windings(points, surface.vertices, surface.triangles) > 0.5 for points in (middle + aside, middle - aside)
    )
    inner = (outside & within)[shell]
    return chosen(surface, ~inner), int(np.count_nonzero(inner))


def with_faces(surface: Surface, triangles: np.ndarray, tagged: bool = True) -> Surface:
    """The surface and triangles (K, 3) that close its holes, each of the face of a triangle beside it, and of its tag
    unless they are to have none.
    """
    if not len(triangles):
        return surface
    near = np.full(len(surface.vertices), -1)
    near[surface.triangles.ravel()] = np.repeat(np.arange(len(surface.triangles)), 3)
    added = replace(chosen(surface, near[triangles[:, 0]]), triangles=triangles.astype(np.int32))
    if not tagged:
        added = replace(added, tag=np.full_like(added.tag, -1))
    return Surface(
        surface.vertices,
        *(np.concatenate([getattr(surface, key), getattr(added, key)]) for key in ("triangles", "part", "tag", "face")),
    )
