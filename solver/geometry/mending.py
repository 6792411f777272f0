"""Mending a surface that does not bound a solid as it is: a ladder, each rung tried only when the ones before failed.

What a rung (ladder.py) gives is taken only when it is closed, free of crossings and of the volume that the surface
given winds about: a wrong volume that nobody notices is the worst outcome.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..case import Surface
from ..errors import Trouble
from ..fem.mesh import Mesh
from .carrying import tag_areas
from .closing import Limits, closed
from .crossing import crossings
from .edges import edges_of
from .ladder import Rung, rungs
from .surface import areas, centred, enclosed_volume, triangle_corners
from .tetrahedra import may_be_mended
from .tidying import tidied, without_doubled
from .winding import wound_volume

SAME_VOLUME = 0.01
SAME_AREA = 0.02


@dataclass(frozen=True)
class Mended:
    """A surface that was mended and the mesh that fills it, if one was asked for; said, warnings: a sentence each."""

    surface: Surface
    mesh: Mesh | None
    said: tuple[str, ...]
    warnings: tuple[str, ...]


def mended(
    surface: Surface, name: str, tags: Sequence[str], fill: Callable[[Surface], Mesh | None], limits: Limits
) -> Mended:
    """The surface of one part, already welded, mended until ``fill`` takes it. tags: the names of the case's tags.

    limits: on the holes to close.

    Raises Trouble of kind "geometry" that names the place when no rung does, and the Trouble of ``fill`` that is none
    of geometry.
    """
    unit, centre, scale = centred(surface)
    tidy, said = tidied(unit)
    reach = np.stack([unit.vertices.min(axis=0), unit.vertices.max(axis=0)])
    wanted = _Wanted(wound_volume(tidy.vertices, tidy.triangles, reach), reach)
    if wanted.volume < 1e-9:
        raise Trouble("geometry", f"'{name}' encloses no volume.", "Give it a thickness, or check its scale.")
    whole, closing, warnings = closed(tidy, name, centre, scale, limits)
    missing: list[str] = []
    for rung in rungs(Rung(whole, said + closing), missing):
        if wanted.is_met_by(rung.surface):
            there = replace(rung.surface, vertices=rung.surface.vertices * scale + centre)
            try:
                mesh = fill(there)
            except Trouble as trouble:
                if not may_be_mended(trouble):
                    raise
                continue
            warnings += _area_warnings(surface, there, tags)
            return Mended(there, mesh, tuple(dict.fromkeys(rung.said)), warnings)
    raise _beyond_mending(surface, whole, name, missing)


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
    once, _ = without_doubled(before)  # a face that lies there twice was never twice the area
    old, new = tag_areas(once, len(tags)), tag_areas(after, len(tags))
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
