"""From a case to its result: check, mesh, assemble, solve, say."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from . import memory
from .answers import report
from .answers.responses import responses
from .case import Case, Surface, Tag
from .errors import Trouble
from .fem.mesh import Mesh, joined, ordered, quadratic
from .geometry.carrying import tag_areas
from .geometry.closing import ON_THEIR_WORD, UNASKED, Limits
from .geometry.inspection import Finding, bounds_solid, inspected
from .geometry.mending import Mended, mended
from .geometry.overlap import crossing_parts, touching_parts
from .geometry.sizing import sizes_at
from .geometry.surface import areas, diagonal, enclosed_volume, one_part, triangle_corners, united, weld
from .geometry.tetrahedra import expected_nodes, fill, may_be_mended
from .keeping import Kept
from .physics import steady
from .physics.film import film_law
from .physics.problem import adrift, check_sheds_heat, faces, put_together
from .result import Field, Responses, Summary
from .room import check_room

# stage, fraction of it, text
Progress = Callable[[str, float, str], None]


@dataclass(frozen=True)
class Solved:
    summary: Summary
    field: Field


@dataclass(frozen=True)
class Body:
    """One part made ready: a surface that bounds a solid, and what is to be said of the one that was given.

    mended: how it was reached where the given one did not bound a solid, with the mesh if one was made already.
    """

    surface: Surface
    findings: tuple[Finding, ...]
    mended: Mended | None = None


# The mesh of a part's surface, or None where none is wanted; part's index.
Fill = Callable[[Surface, int], Mesh | None]


def findings(case: Case) -> list[dict[str, Any]]:
    """What is to be said of each part's surface, whatever state it is in, as the command line tells it."""
    found = [inspected(_welded(case, index), part.name, case.accuracy.size) for index, part in enumerate(case.parts)]
    return [
        {"name": part.name, "findings": [vars(finding) for finding in some]}
        for part, some in zip(case.parts, found, strict=True)
    ]


def check(case: Case, fill: Fill = lambda surface, part: None) -> list[Body]:
    """Each part's surface found to bound a solid, or mended until ``fill`` takes it; tags found to have faces.

    Raises Trouble of kind "case", "geometry" or "adrift", and what ``fill`` raises that is none of geometry.
    """
    _check_tags(case)
    surfaces = [_welded(case, index) for index in range(len(case.parts))]
    _check_ways_out(case, surfaces)
    bodies = [_body(case, index, surface, fill) for index, surface in enumerate(surfaces)]
    _check_apart(case, [body.surface for body in bodies])
    for index, tag in enumerate(case.tags):
        if tag.convection and tag.convection.correlation and index in case.surface.tag:
            tagged = case.surface.triangles[case.surface.tag == index]
            film_law(tag.convection, faces(case.surface.vertices, tagged, case))
    return bodies


def _welded(case: Case, index: int) -> Surface:
    surface, name = one_part(case.surface, index), case.parts[index].name
    if len(surface.triangles):
        _check_extent(surface, name)
        surface = weld(surface)
    if not len(surface.triangles):
        raise Trouble("geometry", f"'{name}' has no faces with an area.", "Give it a body with a volume.")
    return surface


def _body(case: Case, index: int, surface: Surface, fill: Fill) -> Body:
    found = tuple(inspected(surface, case.parts[index].name, case.accuracy.size))
    return Body(surface, found) if bounds_solid(found) else _mended_body(case, index, surface, found, fill)


def _mended_body(
    case: Case, index: int, surface: Surface, found: tuple[Finding, ...], fill: Fill, limits: Limits = UNASKED
) -> Body:
    tags = [tag.name for tag in case.tags]
    made = mended(surface, case.parts[index].name, tags, lambda candidate: fill(candidate, index), limits)
    _check_heat_kept(case, index, surface, made.surface)
    return Body(made.surface, found, made)


def _check_heat_kept(case: Case, index: int, given: Surface, made: Surface) -> None:
    """Find no tag that brings heat to have lost every face in mending: its watts would be missing unnoticed."""
    elsewhere = case.surface.tag[case.surface.part != index]
    for number in np.setdiff1d(given.tag, np.union1d(made.tag, elsewhere)):
        tag = case.tags[number]
        if tag.heat or tag.heat_flux:
            gone = given.tag == number
            raise Trouble(
                "geometry",
                f"The tag '{tag.name}' brings heat, and mending '{case.parts[index].name}' left none of its faces.",
                "Tag faces that lie on the outside of the part, or mend it by hand.",
                np.unique(given.face[gone]).tolist(),
                triangle_corners(given)[gone].mean(axis=1).tolist(),
            )


def _check_apart(case: Case, surfaces: list[Surface]) -> None:
    """Find no two solids to run through each other by more than the gap of their contact."""
    corners, part = _all_corners(surfaces)
    wide = {frozenset(contact.parts): contact.gap for contact in case.contacts if contact.gap is not None}
    for crossing in crossing_parts(corners, part):
        gap = wide.get(frozenset(crossing.parts))
        pair = np.isin(part, crossing.parts)
        if gap is not None and not crossing_parts(corners[pair], part[pair], gap):
            continue
        first, second = (case.parts[index].name for index in crossing.parts)
        raise Trouble(
            "geometry",
            f"'{first}' and '{second}' run through each other.",
            "Move one of them, or cut it with the other (a boolean difference does).",
            points=crossing.points.tolist(),
        )


def _all_corners(surfaces: list[Surface]) -> tuple[np.ndarray, np.ndarray]:
    """The corners (F, 3, 3) of all parts' triangles and their parts (F,)."""
    counts = [len(surface.triangles) for surface in surfaces]
    return np.concatenate([triangle_corners(surface) for surface in surfaces]), np.repeat(range(len(counts)), counts)


def touching(case: Case, surfaces: list[Surface]) -> list[dict[str, Any]]:
    """The pairs of parts that touch, found by themselves, and the area (m2) over which they do."""
    return [
        {"parts": [case.parts[i].name, case.parts[j].name], "area": area}
        for i, j, area in touching_parts(*_all_corners(surfaces))
    ]


def _unnamed_contacts(case: Case, surfaces: list[Surface]) -> list[str]:
    named = [{case.parts[index].name for index in contact.parts} for contact in case.contacts]
    return [
        f"'{pair['parts'][0]}' and '{pair['parts'][1]}' touch over {1e4 * pair['area']:.3g} cm2 "
        "and exchange no heat there, as no contact names them."
        for pair in touching(case, surfaces)
        if set(pair["parts"]) not in named
    ]


def _check_extent(surface: Surface, name: str) -> None:
    if not diagonal(surface.vertices):
        raise Trouble("geometry", f"'{name}' has no size: all its vertices are at one place.", "Check its scale.")


def _check_tags(case: Case) -> None:
    used = set(np.unique(case.surface.tag).tolist())
    for index, tag in enumerate(case.tags):
        if index not in used and replace(tag, name="") != Tag(""):
            raise Trouble("case", f"The tag '{tag.name}' has no faces.", "Give it faces, or remove the tag.")


def _check_ways_out(case: Case, surfaces: list[Surface]) -> None:
    """Parts in contact none of whose faces fixes a temperature are found before they are meshed."""
    fixing = [_fixes_temperature(tag) for tag in (*case.tags, case.untagged)]
    fixed = {index for index, surface in enumerate(surfaces) if any(fixing[tag] for tag in np.unique(surface.tag))}
    reached: set[int] = set()
    while reached != fixed:
        reached = set(fixed)
        for contact in case.contacts:
            if reached & set(contact.parts):
                fixed |= set(contact.parts)
    for index, part in enumerate(case.parts):
        if index not in fixed:
            raise adrift(part.name, surfaces[index].vertices.mean(axis=0))


def _fixes_temperature(tag: Tag) -> bool:
    film = tag.convection is not None and (tag.convection.correlation is not None or bool(tag.convection.coefficient))
    return tag.temperature is not None or film or (tag.radiation is not None and tag.radiation.emissivity > 0)


def checked_summary(case: Case, bodies: list[Body]) -> dict[str, Any]:
    """What ``fluxface check`` tells of a sound case: measures, findings and mending of parts, areas of tags; SI."""
    surfaces = [body.surface for body in bodies]
    corners = [triangle_corners(surface) for surface in surfaces]
    tag_area = np.sum([tag_areas(surface, len(case.tags)) for surface in surfaces], axis=0)
    return {
        "state": "mended" if any(body.mended for body in bodies) else "sound",
        "parts": [
            {
                "name": part.name,
                "volume": enclosed_volume(part_corners),
                "area": float(areas(part_corners).sum()),
                "mass": part.material.density and part.material.density * enclosed_volume(part_corners),
                "size": np.ptp(body.surface.vertices, axis=0).tolist(),
                "findings": [vars(finding) for finding in body.findings],
                "mending": list(body.mended.said) if body.mended else [],
            }
            for part, body, part_corners in zip(case.parts, bodies, corners, strict=True)
        ],
        "tags": [
            {"name": tag.name, "area": float(area)}
            for tag, area in zip((*case.tags, case.untagged), tag_area, strict=True)
        ],
        "touching": touching(case, surfaces),
        "warnings": mending_warnings(bodies),
    }


def mending(case: Case, bodies: list[Body]) -> list[str]:
    """What was done to the parts that did not bound a solid, a sentence each."""
    return [
        f"'{part.name}': {sentence}"
        for part, body in zip(case.parts, bodies, strict=True)
        if body.mended
        for sentence in body.mended.said
    ]


def mending_warnings(bodies: list[Body]) -> list[str]:
    return [warning for body in bodies if body.mended for warning in body.mended.warnings]


def filling(case: Case, progress: Progress) -> Callable[[Surface, int], Mesh]:
    """What makes the linear tetrahedra of a part out of its surface and index, as the case asks for them."""

    def filled(surface: Surface, index: int) -> Mesh:
        name = case.parts[index].name
        progress("mesh", index / len(case.parts), f"filling '{name}'")
        finest = sizes_at(surface, case.tags, case.untagged, case.accuracy.size is None)
        return fill(surface, name, index, case.accuracy, finest)

    return filled


def meshed(case: Case, progress: Progress) -> tuple[list[Body], Mesh]:
    """The parts made ready, and the tetrahedra that fill them, of the order that the case asks for."""

    filled = filling(case, progress)
    bodies, meshes = check(case, filled), []
    for index, body in enumerate(bodies):
        if body.mended is None:
            try:
                meshes.append(filled(body.surface, index))
                continue
            except Trouble as trouble:
                if not may_be_mended(trouble):
                    raise
            # A surface in which nothing is found amiss can be refused all the same.
            bodies[index] = body = _mended_body(case, index, body.surface, body.findings, filled)
        assert body.mended is not None and body.mended.mesh is not None
        meshes.append(body.mended.mesh)
    mesh = ordered(joined(meshes))
    if case.accuracy.order == 2:
        mesh = quadratic(mesh)
    if len(mesh.nodes) > case.accuracy.max_nodes:
        raise Trouble(
            "limits",
            f"The case takes {len(mesh.nodes)} nodes, above the bound of {case.accuracy.max_nodes}.",
            "Choose a larger size, or raise the bound on nodes.",
        )
    progress("mesh", 1.0, f"{len(mesh.cells)} tetrahedra, {len(mesh.nodes)} nodes")
    return bodies, mesh


def _meshed_in_room(case: Case, progress: Progress, kept: Kept) -> tuple[list[Body], Mesh]:
    """:func:`meshed`, where memory will do for the rest as well, as far as can be told before and after."""
    surfaces = [_welded(case, index) for index in range(len(case.parts))]
    expected = sum(expected_nodes(surface, case.accuracy) for surface in surfaces)
    if expected <= case.accuracy.max_nodes:  # else that is told
        check_room(case, expected, kept)
    bodies, mesh = meshed(case, progress)
    check_room(case, len(mesh.nodes), kept)
    return bodies, mesh


def respond(case: Case, kept: Kept) -> Responses:
    """How a linear case answers to each of its loads; quick where the case has just been solved.

    Raises Trouble of kind "case" when it is not linear, and as :func:`solve` does.
    """
    kept.reused.clear()
    _check_tags(case)
    _, mesh = kept.made("mesh", _meshing_inputs(case), lambda: meshed(case, lambda stage, fraction, text: None))
    check_sheds_heat(put_together(case, mesh))
    return responses(case, mesh, kept)


def _meshing_inputs(case: Case) -> tuple[Any, ...]:
    """All that the mesh of a case depends on; values of loads and materials are not among it."""
    return (
        *vars(case.surface).values(),
        case.accuracy,
        [part.name for part in case.parts],
        [(tag.name, tag.size, _brings_heat(tag)) for tag in (*case.tags, case.untagged)],
        [(contact.parts, contact.gap) for contact in case.contacts],
    )


def _brings_heat(tag: Tag) -> bool:
    return bool(tag.heat or tag.heat_flux or tag.temperature is not None)


def mend(case: Case, progress: Progress = lambda stage, fraction, text: None) -> tuple[Case, list[Body]]:
    """The case with the surfaces of those parts mended that could not be filled as they were; the others as given.

    It is asked for, so that holes are closed that solving refuses. A tag that is left without a face carries nothing
    any more. Raises Trouble of kind "geometry" when a part is
    beyond mending, "limits" when it takes too many nodes.
    """
    filled, bodies, surfaces = filling(case, progress), [], []
    for index, part in enumerate(case.parts):
        surface = _welded(case, index)
        body = Body(surface, tuple(inspected(surface, part.name, case.accuracy.size)))
        if not (bounds_solid(body.findings) and _is_filled(surface, index, filled)):
            body = _mended_body(case, index, surface, body.findings, filled, ON_THEIR_WORD)
        bodies.append(body)
        surfaces.append(body.surface if body.mended else one_part(case.surface, index))
    made = replace(case, surface=united(surfaces))
    lost = np.setdiff1d(case.surface.tag, made.surface.tag)
    tags = tuple(Tag(tag.name) if number in lost else tag for number, tag in enumerate(case.tags))
    return replace(made, tags=tags), bodies


def _is_filled(surface: Surface, index: int, fill: Fill) -> bool:
    try:
        fill(surface, index)
    except Trouble as trouble:
        if not may_be_mended(trouble):
            raise
        return False
    return True


def solve(case: Case, progress: Progress = lambda stage, fraction, text: None, kept: Kept | None = None) -> Solved:
    """kept: what earlier cases left to be used again, and where this one leaves its own.

    Raises Trouble of every kind the contract lists.
    """
    began = time.perf_counter()
    kept = Kept() if kept is None else kept
    kept.reused.clear()
    _check_tags(case)
    bodies, mesh = kept.made("mesh", _meshing_inputs(case), lambda: _meshed_in_room(case, progress, kept))
    memory_used = {"mesh": memory.peak()}
    filled = time.perf_counter()
    progress("assemble", 0.0, "putting the terms together")
    problem = put_together(case, mesh)
    check_sheds_heat(problem)
    put = time.perf_counter()
    solution = steady.solve(problem, kept=kept, progress=lambda fraction, text: progress("solve", fraction, text))
    memory_used["solve"] = memory.peak()
    solved = time.perf_counter()
    progress("write", 0.0, "summing up")
    summary = report.summary(problem, solution)
    field = report.field(problem, solution)
    summary["mending"] = mending(case, bodies)
    summary["reused"] = list(kept.reused)
    summary["memory"] = {**memory_used, "report": memory.peak()}
    summary["warnings"] += mending_warnings(bodies) + _unnamed_contacts(case, [body.surface for body in bodies])
    ended = time.perf_counter()
    summary["seconds"] = {
        "mesh": filled - began,
        "assemble": put - filled + solution.assembly_seconds,
        "solve": solved - put - solution.assembly_seconds,
        "report": ended - solved,
        "total": ended - began,
    }
    return Solved(summary, field)
