"""From a case to its result: check, mesh, assemble, solve, say."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from .answers import report
from .case import Case, Surface, Tag
from .errors import Trouble
from .fem.mesh import Mesh, joined, quadratic
from .geometry.overlap import crossing_parts, touching_parts
from .geometry.surface import areas, check_bounds_solid, diagonal, enclosed_volume, one_part, triangle_corners, weld
from .geometry.tetrahedra import fill
from .physics import steady
from .physics.film import film_law
from .physics.problem import adrift, check_sheds_heat, faces, put_together
from .result import Field, Summary

# stage, fraction of it, text
Progress = Callable[[str, float, str], None]


@dataclass(frozen=True)
class Solved:
    summary: Summary
    field: Field


def check(case: Case) -> list[Surface]:
    """Each part's surface, welded and found to bound a solid; tags found to have faces.

    Raises Trouble of kind "case", "geometry" or "adrift".
    """
    _check_tags(case)
    surfaces = []
    for index, part in enumerate(case.parts):
        surface = one_part(case.surface, index)
        if len(surface.triangles):
            _check_extent(surface, part.name)
            surface = weld(surface)
        check_bounds_solid(surface, part.name)
        surfaces.append(surface)
    _check_ways_out(case, surfaces)
    _check_apart(case, surfaces)
    for index, tag in enumerate(case.tags):
        if tag.convection and tag.convection.correlation and index in case.surface.tag:
            tagged = case.surface.triangles[case.surface.tag == index]
            film_law(tag.convection, faces(case.surface.vertices, tagged, case))
    return surfaces


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


def checked_summary(case: Case, surfaces: list[Surface]) -> dict[str, Any]:
    """What ``fluxface check`` tells of a sound case: each part's measures and each tag's area, SI units."""
    corners = [triangle_corners(surface) for surface in surfaces]
    tag_area = np.zeros(len(case.tags) + 1)
    for surface, part_corners in zip(surfaces, corners, strict=True):
        tag_area += np.bincount(surface.tag % len(tag_area), areas(part_corners), len(tag_area))
    return {
        "parts": [
            {
                "name": part.name,
                "volume": enclosed_volume(part_corners),
                "area": float(areas(part_corners).sum()),
                "size": np.ptp(surface.vertices, axis=0).tolist(),
            }
            for part, surface, part_corners in zip(case.parts, surfaces, corners, strict=True)
        ],
        "tags": [
            {"name": tag.name, "area": float(area)}
            for tag, area in zip((*case.tags, case.untagged), tag_area, strict=True)
        ],
        "touching": touching(case, surfaces),
    }


def mesh_of(case: Case, surfaces: list[Surface], progress: Progress) -> Mesh:
    """The tetrahedra of all parts, of the order that the case asks for."""
    meshes = []
    for index, (part, surface) in enumerate(zip(case.parts, surfaces, strict=True)):
        progress("mesh", index / len(surfaces), f"filling '{part.name}'")
        meshes.append(fill(surface, part.name, index, case.accuracy))
    mesh = joined(meshes)
    if case.accuracy.order == 2:
        mesh = quadratic(mesh)
    if len(mesh.nodes) > case.accuracy.max_nodes:
        raise Trouble(
            "limits",
            f"The case takes {len(mesh.nodes)} nodes, above the bound of {case.accuracy.max_nodes}.",
            "Choose a larger size, or raise the bound on nodes.",
        )
    progress("mesh", 1.0, f"{len(mesh.cells)} tetrahedra, {len(mesh.nodes)} nodes")
    return mesh


def solve(case: Case, progress: Progress = lambda stage, fraction, text: None) -> Solved:
    """Raises Trouble of every kind the contract lists."""
    began = time.perf_counter()
    surfaces = check(case)
    mesh = mesh_of(case, surfaces, progress)
    meshed = time.perf_counter()
    progress("assemble", 0.0, "putting the terms together")
    problem = put_together(case, mesh)
    check_sheds_heat(problem)
    put = time.perf_counter()
    solution = steady.solve(problem, progress=lambda fraction, text: progress("solve", fraction, text))
    solved = time.perf_counter()
    progress("write", 0.0, "summing up")
    summary = report.summary(problem, solution)
    field = report.field(problem, solution)
    summary["warnings"] += _unnamed_contacts(case, surfaces)
    ended = time.perf_counter()
    summary["seconds"] = {
        "mesh": meshed - began,
        "assemble": put - meshed + solution.assembly_seconds,
        "solve": solved - put - solution.assembly_seconds,
        "report": ended - solved,
        "total": ended - began,
    }
    return Solved(summary, field)
