"""What is said about a solved field: each tag's and part's temperatures and watts, and the balance."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..fem.quality import WIDE, Quality, quality
from ..fem.volume import cell_means
from ..physics.contact import Bond, Conductance
from ..physics.laws import Correlated, Linear
from ..physics.problem import CONVECTION, RADIATION, SOURCE, Patch, Problem, held_nodes
from ..physics.steady import Solution, heat_through
from ..result import FORMAT, Field, Summary
from .flux import heat_flux
from .sentences import where_heat_goes

HELD = "held"
# Of the volume: what is meshed too badly to go unsaid. Measured on plates, sinks, boxes and blocks: at most 0.0004.
MOST_WIDE = 0.01


def summary(problem: Problem, solution: Solution) -> Summary:
    """``summary.json`` but for the seconds of the stages that are not the solver's."""
    mesh, temperature = problem.mesh, solution.temperature
    entering = heat_by_term(problem, solution)
    part_of_node = np.empty(len(mesh.nodes), np.int32)
    part_of_node[mesh.cells] = mesh.cell_part[:, None]
    parts = _part_reports(problem, temperature, part_of_node)
    tags = [
        _tag_report(problem, temperature, patch, split)
        for patch, split in zip(problem.patches, entering, strict=True)
        if patch is not problem.patches[-1] or len(patch.facets)
    ]
    shape = quality(mesh)
    balanced = balance([*(heat for split in entering for heat in split.values()), *(part["heat"] for part in parts)])
    return {
        "format": FORMAT,
        "title": problem.case.title,
        "state": "solved",
        "hottest": _extreme(problem, temperature, part_of_node, int(temperature.argmax())),
        "coldest": _extreme(problem, temperature, part_of_node, int(temperature.argmin())),
        "tags": tags,
        "parts": parts,
        "contacts": [_contact_report(problem, temperature, contact) for contact in problem.contacts],
        "balance": balanced,
        "where_heat_goes": where_heat_goes(tags, parts, balanced["in"]),
        "error_estimate": None,
        "mesh": {
            "nodes": len(mesh.nodes),
            "cells": len(mesh.cells),
            "order": mesh.order,
            "smallest_dihedral_degrees": shape.smallest,
            "largest_dihedral_degrees": shape.largest,
            "share_of_wide_angles": shape.wide,
        },
        "solver": {
            "method": solution.method,
            "steps": solution.steps,
            "iterations": solution.iterations,
            "relative_residual": solution.relative_residual,
        },
        "warnings": [*warnings(problem), *shape_remarks(shape), *_film_remarks(problem, temperature)],
    }


def heat_by_term(problem: Problem, solution: Solution) -> list[dict[str, float]]:
    """W that enters each patch by each of its terms; what enters at held nodes is their consistent reaction."""
    nodes, _, shares = held_nodes(problem)
    reactions = solution.reaction[nodes] @ shares
    entering = heat_through(problem, solution.temperature)
    for patch, split, reaction in zip(problem.patches, entering, reactions.tolist(), strict=True):
        if patch.held is not None:
            split[HELD] = reaction
    return entering


def balance(heats: list[float]) -> dict[str, float]:
    """The sums of all heat that enters and all that leaves (W), and their gap as a share of what enters."""
    entering = sum(heat for heat in heats if heat > 0)
    leaving = sum(heat for heat in heats if heat < 0)
    gap = abs(entering + leaving) / entering if entering > 0 else abs(leaving)
    return {"in": entering, "out": leaving, "relative_gap": gap}


def _extreme(problem: Problem, temperature: np.ndarray, part_of_node: np.ndarray, node: int) -> dict[str, Any]:
    return {
        "temperature": float(temperature[node]),
        "at": problem.mesh.nodes[node].tolist(),
        "part": problem.case.parts[part_of_node[node]].name,
    }


def _tag_report(problem: Problem, temperature: np.ndarray, patch: Patch, split: dict[str, float]) -> dict[str, Any]:
    points = patch.points
    on_faces = temperature[problem.mesh.boundary[patch.facets]]
    empty = not len(patch.facets)
    return {
        "name": patch.name,
        "area": patch.area,
        "mean": None if empty else float(points.weight @ (points.shape @ temperature) / patch.area),
        "min": None if empty else float(on_faces.min()),
        "max": None if empty else float(on_faces.max()),
        "heat": sum(split.values()),
        "film": _mean_film(patch, temperature),
        "split": {kind: split.get(kind, 0.0) for kind in (CONVECTION, RADIATION, SOURCE, HELD)},
    }


def _mean_film(patch: Patch, temperature: np.ndarray) -> float | None:
    """W/(m2 K), the mean over the area; None where there is no film."""
    law = patch.laws.get(CONVECTION)
    if isinstance(law, Correlated):
        points = patch.points
        return float(points.weight @ law.coefficient(points.shape @ temperature, points.facet) / patch.area)
    return law.coefficient if isinstance(law, Linear) else None


def _part_reports(problem: Problem, temperature: np.ndarray, part_of_node: np.ndarray) -> list[dict[str, Any]]:
    mesh, count = problem.mesh, len(problem.case.parts)
    volume = np.bincount(mesh.cell_part, problem.volume, count)
    warmth = np.bincount(mesh.cell_part, problem.volume * cell_means(mesh, temperature), count)
    surface = np.zeros(count)
    for patch in problem.patches:
        surface += np.bincount(mesh.boundary_part[patch.points.facet], patch.points.weight, count)
    inside = [temperature[part_of_node == index] for index in range(count)]
    return [
        {
            "name": part.name,
            "material": part.material.name,
            "volume": float(volume[index]),
            "area": float(surface[index]),
            "mass": None if part.material.density is None else float(part.material.density * volume[index]),
            "mean": float(warmth[index] / volume[index]),
            "min": float(inside[index].min()),
            "max": float(inside[index].max()),
            "heat": float(problem.heat_density[index] * volume[index]),
        }
        for index, part in enumerate(problem.case.parts)
    ]


def _contact_report(problem: Problem, temperature: np.ndarray, contact: Conductance | Bond) -> dict[str, Any]:
    """Area, mean drop and heat, both counted from the first part to the second."""
    joint = contact.joint
    weight = joint.first.points.weight
    return {
        "parts": [problem.case.parts[side.part].name for side in (joint.first, joint.second)],
        "area": joint.area,
        "drop": float(weight @ (joint.jump @ temperature) / joint.area),
        "heat": float(weight @ contact.heat_across(temperature)),
    }


def warnings(problem: Problem) -> list[str]:
    """What a designer should know though the case was solved, a sentence each."""
    _, _, shares = held_nodes(problem)
    held = [index for index, patch in enumerate(problem.patches) if patch.held is not None]
    found = []
    for index, first in enumerate(held):
        for second in held[index + 1 :]:
            one, other = problem.patches[first], problem.patches[second]
            if one.held != other.held and ((shares[:, first] > 0) & (shares[:, second] > 0)).any():
                found.append(
                    f"The tags '{one.name}' and '{other.name}' hold different temperatures and meet: "
                    "the mean holds where they do."
                )
    return found


def shape_remarks(shape: Quality) -> list[str]:
    """A warning where so much of the mesh is badly shaped that it matters."""
    if shape.wide <= MOST_WIDE:
        return []
    return [
        f"{100 * shape.wide:.0f} % of the volume is meshed with tetrahedra that have an angle above {WIDE:g} degrees, "
        "and temperatures there may be off: choose another mesh size and compare."
    ]


def _film_remarks(problem: Problem, temperature: np.ndarray) -> list[str]:
    return [
        f"The film of '{patch.name}': {remark}"
        for patch in problem.patches
        for law in patch.laws.values()
        if isinstance(law, Correlated)
        for remark in law.remarks(patch.points.shape @ temperature, patch.points.facet)
    ]


def field(problem: Problem, solution: Solution) -> Field:
    """``field.npz``: the temperatures on their mesh, and the heat flux at cells and nodes."""
    mesh = problem.mesh
    at_cells, at_nodes = heat_flux(problem, solution.temperature)
    shown = ~bonded_faces(problem)
    return Field(
        nodes=mesh.nodes,
        cells=mesh.cells,
        cell_part=mesh.cell_part,
        temperature=solution.temperature,
        boundary=mesh.boundary[shown],
        boundary_tag=mesh.boundary_tag[shown],
        boundary_part=mesh.boundary_part[shown],
        boundary_face=mesh.boundary_face[shown],
        heat_flux=at_nodes,
        cell_heat_flux=at_cells,
    )


def bonded_faces(problem: Problem) -> np.ndarray:
    """(B,) whether a boundary triangle lies wholly within bonds, and so bounds nothing."""
    bonded = np.zeros(len(problem.mesh.boundary), bool)
    for contact in problem.contacts:
        if isinstance(contact, Bond):
            for side in (contact.joint.first, contact.joint.second):
                bonded[side.points.facet] = True
    return bonded & problem.joined
