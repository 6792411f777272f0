"""The ways to mend a surface, from the cheapest on: bookkeeping first, then libraries, each in a process of its own."""

from __future__ import annotations

import time
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ..case import Surface
from .apart import Apart, run_apart
from .carrying import carried
from .edges import edges_of, solid_shells
from .holes import holes
from .surface import weld
from .tidying import tidied, with_faces

SNAP = 1e-5
# s: for a tool, with so much more for each triangle, and for all of them; a designer does not wait longer for one part.
TOOL_SECONDS, SECONDS_PER_FACE, LADDER_SECONDS = 40.0, 3e-4, 90.0
SHARES = ("1e-3", "3e-4")  # of the diagonal, the width of the envelope


@dataclass(frozen=True)
class Rung:
    """A candidate surface, and the sentences that say what was done to reach it."""

    surface: Surface
    said: tuple[str, ...]


def rungs(tidy: Rung, missing: list[str]) -> Iterator[Rung]:
    """Candidates in order, begun within LADDER_SECONDS; libraries that are not installed are added to ``missing``."""
    began = time.monotonic()
    for rung in _all_rungs(tidy, missing):
        yield rung
        if time.monotonic() - began > LADDER_SECONDS + SECONDS_PER_FACE * len(tidy.surface.triangles):
            return


def _all_rungs(tidy: Rung, missing: list[str]) -> Iterator[Rung]:
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
            yield from _snapped(rung)

    yield tidy
    yield from _snapped(tidy)
    yield from made_by("union", tidy, "1e-5", united)
    yield from made_by("union", tidy, "2e-4", united, smoothed.format("2e-4"))
    for exact in made_by("exact_union", tidy, "", cut):
        yield exact
        yield from made_by("union", exact, "1e-5", cut, smoothed.format("1e-5"))
    for alone in made_by("shell_by_shell", tidy, "", repaired):
        yield alone
        yield from made_by("union", alone, "1e-5", united)
    for share in SHARES:
        yield from made_by("envelope", tidy, share, rebuilt.format(share))


def _snapped(rung: Rung) -> Iterator[Rung]:
    """Near vertices joined once more, and what that leaves tidied; nothing where no vertices are near."""
    joined = weld(rung.surface, SNAP)
    if len(joined.vertices) == len(rung.surface.vertices):
        return
    surface, _ = tidied(joined)
    found = [hole.triangles for hole in holes(surface.vertices, edges_of(surface.triangles))]
    closed = with_faces(surface, np.concatenate(found)) if found else surface
    yield Rung(closed, (*rung.said, f"Vertices nearer than {SNAP:g} of the part's size were joined."))


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
        made = run_apart(tool, arrays, argument, TOOL_SECONDS + SECONDS_PER_FACE * len(surface.triangles))
    except Apart as apart:
        if apart.kind == "missing":
            missing.append(apart.text)
        return None
    if not len(made["facets"]) or not np.isfinite(made["points"]).all():
        return None
    return carried(surface, made["points"], made["facets"])
