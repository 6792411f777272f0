"""Mending a surface that does not bound a solid as it is: a ladder, each rung tried only when the ones before failed.

The first rung is bookkeeping (tidying.py, holes.py); the further ones are libraries, each in a process of its own. What
a rung gives is taken only when it is closed, free of crossings and of the volume that the surface given winds about:
a wrong volume that nobody notices is the worst outcome.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..case import Surface
from ..errors import Trouble
from ..fem.mesh import Mesh
from .apart import Apart, run_apart
from .carrying import carried, tag_areas
from .crossing import crossings
from .edges import boundary_sides, edges_of, shells, solid_shells
from .holes import holes
from .surface import areas, centred, enclosed_volume, triangle_corners, weld
from .tidying import chosen, oriented, stitched, with_faces, without_doubled, without_flat
from .winding import windings, wound_volume

# Closing more than this share of the surface is a guess at the shape. Common practice, no source.
LARGEST_HOLE, ALL_HOLES = 0.03, 0.06
SAME_VOLUME = 0.01
SAME_AREA = 0.02
SNAP = 1e-5
ASIDE = 1e-5  # of the diagonal: how far beside a face its two sides are probed
TOOL_SECONDS, LADDER_SECONDS = 60, 120
SHARES = ("1e-3", "3e-4")  # of the diagonal, the width of the envelope


@dataclass(frozen=True)
class Mended:
    """A surface that was mended and the mesh that fills it, if one was asked for; said, warnings: a sentence each."""

    surface: Surface
    mesh: Mesh | None
    said: tuple[str, ...]
    warnings: tuple[str, ...]


@dataclass(frozen=True)
class Rung:
    """A candidate surface, and the sentences that say what was done to reach it."""

    surface: Surface
    said: tuple[str, ...]


def mended(surface: Surface, name: str, tags: Sequence[str], fill: Callable[[Surface], Mesh | None]) -> Mended:
    """The surface of one part, already welded, mended until ``fill`` takes it. tags: the names of the case's tags.

    Raises Trouble of kind "geometry" that names the place when no rung does, and the Trouble of ``fill`` that is none
    of geometry.
    """
    unit, centre, scale = centred(surface)
    tidy, said = _tidied(unit)
    reach = np.stack([unit.vertices.min(axis=0), unit.vertices.max(axis=0)])
    wanted = _Wanted(wound_volume(tidy.vertices, tidy.triangles, reach), reach)
    if wanted.volume < 1e-9:
        raise Trouble("geometry", f"'{name}' encloses no volume.", "Give it a thickness, or check its scale.")
    closed, closing = _closed(tidy, surface, name)
    missing: list[str] = []
    for rung in _in_time(_rungs(Rung(closed, said + closing), missing)):
        if wanted.is_met_by(rung.surface):
            there = replace(rung.surface, vertices=rung.surface.vertices * scale + centre)
            try:
                mesh = fill(there)
            except Trouble as trouble:
                if trouble.kind != "geometry":
                    raise
                continue
            return Mended(there, mesh, tuple(dict.fromkeys(rung.said)), _area_warnings(surface, there, tags))
    raise _beyond_mending(surface, closed, name, missing)


def _in_time(rungs: Iterator[Rung]) -> Iterator[Rung]:
    """The rungs that are begun within LADDER_SECONDS; a designer does not wait longer for one part."""
    began = time.monotonic()
    while time.monotonic() - began < LADDER_SECONDS:
        try:
            yield next(rungs)
        except StopIteration:
            return


# The first rung ------------------------------------------------------------------------------------------------------


def _tidied(surface: Surface) -> tuple[Surface, tuple[str, ...]]:
    steps: tuple[tuple[Callable[[Surface], tuple[Surface, int]], str], ...] = (
        (without_flat, "Faces without an area were dropped ({})."),
        (without_doubled, "Doubled faces were dropped ({})."),
        (stitched, "Edges were split at corners that lie on them ({})."),
        (without_doubled, "Faces doubled after that were dropped ({})."),
        (oriented, "Faces that pointed the wrong way were turned ({})."),
        (_without_inner, "Faces that lie within the solid were left out ({})."),
    )
    said = []
    for step, sentence in steps:
        surface, count = step(surface)
        if count:
            said.append(sentence.format(count))
    return surface, tuple(said)


def _without_inner(surface: Surface) -> tuple[Surface, int]:
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


def _closed(tidy: Surface, given: Surface, name: str) -> tuple[Surface, tuple[str, ...]]:
    """The surface with its small holes closed.

    Raises Trouble of kind "geometry" where a hole is not small.
    """
    edges = edges_of(tidy.triangles)
    found = holes(tidy.vertices, edges)
    if not found:
        return tidy, ()
    whole = float(areas(triangle_corners(tidy)).sum())
    large = [hole for hole in found if not len(hole.triangles) or hole.area > LARGEST_HOLE * whole]
    if large or sum(hole.area for hole in found) > ALL_HOLES * whole:
        raise open_trouble(given, tidy, name)
    closed = with_faces(tidy, np.concatenate([hole.triangles for hole in found]))
    share = 100 * sum(hole.area for hole in found) / whole
    return closed, (f"Small holes were closed ({len(found)}, {share:.2g} % of the surface).",)


def open_trouble(given: Surface, tidy: Surface, name: str) -> Trouble:
    """That the surface is open, and where; tidy: the same in its unit frame, without what tidying mends."""
    edges = edges_of(tidy.triangles)
    sides = boundary_sides(edges)
    _, centre, scale = centred(given)
    middles = 0.5 * (tidy.vertices[edges.start[sides]] + tidy.vertices[edges.end[sides]]) * scale + centre
    return Trouble(
        "geometry",
        f"The surface of '{name}' is open: {len(sides)} edges do not have a face on both sides.",
        "Close the holes there (select the edges and fill), give sheets a thickness, and run again.",
        np.unique(tidy.face[sides // 3]).tolist(),
        middles.tolist(),
    )


# The ladder ----------------------------------------------------------------------------------------------------------


def _rungs(tidy: Rung, missing: list[str]) -> Iterator[Rung]:
    """Candidates in order; the libraries that are not installed are added to ``missing``."""
    united = "Shells that touched or ran through each other were united."
    smoothed = "Details below {} of the part's size were smoothed away."
    cut = "Crossing faces were cut along their crossings."
    repaired = "Faces that ran through each other were cut out and the gaps closed."
    rebuilt = "The surface was rebuilt to within {} of the part's size."

    def made_by(tool: str, source: Rung, argument: str, *said: str) -> Iterator[Rung]:
        made = _made_by(tool, source, argument, missing)
        if made is not None:
            rung = Rung(made, (*source.said, *said))
            yield rung
            yield _snapped(rung)

    yield tidy
    yield _snapped(tidy)
    yield from made_by("union", tidy, "1e-5", united)
    yield from made_by("union", tidy, "2e-4", united, smoothed.format("2e-4"))
    for exact in made_by("exact_union", tidy, "", cut):
        yield exact
        yield from made_by("exact_union", exact, "", cut)
        yield from made_by("union", exact, "1e-5", cut, smoothed.format("1e-5"))
    for alone in made_by("shell_by_shell", tidy, "", repaired):
        yield alone
        yield from made_by("union", alone, "1e-5", united)
    for share in SHARES:
        yield from made_by("envelope", tidy, share, rebuilt.format(share))


def _snapped(rung: Rung) -> Rung:
    """Near vertices joined once more, and what that leaves tidied."""
    surface, _ = _tidied(weld(rung.surface, SNAP))
    found = [hole.triangles for hole in holes(surface.vertices, edges_of(surface.triangles))]
    closed = with_faces(surface, np.concatenate(found)) if found else surface
    return Rung(closed, (*rung.said, f"Vertices nearer than {SNAP:g} of the part's size were joined."))


def _made_by(tool: str, source: Rung, argument: str, missing: list[str]) -> Surface | None:
    """What a library makes of a surface, with its tags; None when it is missing or fails."""
    surface = source.surface
    arrays = {
        "points": surface.vertices,
        "facets": surface.triangles.astype(np.int64),
        "markers": np.unique(np.stack([surface.face, surface.tag]), axis=1, return_inverse=True)[1].reshape(-1),
        "shell": solid_shells(surface.vertices, surface.triangles),
    }
    try:
        made = run_apart(tool, arrays, argument, TOOL_SECONDS)
    except Apart as apart:
        if apart.kind == "missing":
            missing.append(apart.text)
        return None
    if not len(made["facets"]) or not np.isfinite(made["points"]).all():
        return None
    return carried(surface, made["points"], made["facets"])


@dataclass(frozen=True)
class _Wanted:
    """What a mended surface must be: of the ``volume`` that the given one winds about, within ``reach`` (2, 3)."""

    volume: float
    reach: np.ndarray

    def is_met_by(self, surface: Surface) -> bool:
        if not len(surface.triangles) or not edges_of(surface.triangles).closed:
            return False
        if len(crossings(surface.vertices, surface.triangles, most=1).pairs):
            return False
        volume = wound_volume(surface.vertices, surface.triangles, self.reach)
        alike = abs(volume - self.volume) <= SAME_VOLUME * self.volume
        return alike and abs(enclosed_volume(triangle_corners(surface)) - volume) <= SAME_VOLUME * volume


# What is said --------------------------------------------------------------------------------------------------------


def _area_warnings(before: Surface, after: Surface, tags: Sequence[str]) -> tuple[str, ...]:
    old, new = tag_areas(before, len(tags)), tag_areas(after, len(tags))
    return tuple(
        f"The tag '{name}' {'lost' if is_now < was else 'gained'} {_per_cent(abs(is_now / was - 1))} of its area "
        f"in mending: {1e4 * was:.4g} cm2 became {1e4 * is_now:.4g} cm2."
        for name, was, is_now in zip(tags, old.tolist(), new.tolist(), strict=False)
        if abs(is_now - was) > SAME_AREA * was
    )


def _per_cent(share: float) -> str:
    return f"{100 * share:.3g} %"


def _beyond_mending(surface: Surface, closed: Surface, name: str, missing: list[str]) -> Trouble:
    met = crossings(surface.vertices, surface.triangles)
    mend = "Separate or unite the crossing faces (a boolean union does) and run again."
    if missing:
        mend += f" More can be mended when these are installed: {', '.join(sorted(set(missing)))}."
    if len(met.pairs):
        faces = np.unique(surface.face[met.pairs.ravel()]).tolist()
        message = f"{len(faces)} faces of '{name}' run through or lie upon each other, and no way to mend it did."
        return Trouble("geometry", message, mend, faces, met.at.tolist())
    _, centre, scale = centred(surface)
    thin = np.argsort(areas(triangle_corners(closed)))[:10]
    return Trouble(
        "geometry",
        f"'{name}' could not be filled with tetrahedra, and no way to mend it did.",
        "Look for needle-thin faces, such as these, and for faces nearly touching; remove them and run again.",
        np.unique(closed.face[thin]).tolist(),
        (triangle_corners(closed)[thin].mean(axis=1) * scale + centre).tolist(),
    )
