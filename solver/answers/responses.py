"""How a linear case answers to each of its loads.

The steady balance of a case without radiation, correlations or tables is linear and homogeneous in its loads: heats,
fluxes, ambient and held temperatures, the latter counted from absolute zero. The response to a load is the solution of
the same case with that load at one and all others at nought; the case's own is the sum of values times responses.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, replace

import numpy as np

from ..case import Case, Part, Tag
from ..errors import Trouble
from ..fem.linear_algebra import LinearSolver
from ..fem.mesh import Mesh
from ..fem.volume import cell_means
from ..keeping import Kept
from ..physics import steady
from ..physics.conduction import is_constant
from ..physics.problem import Patch, Problem, held_nodes, put_together
from ..result import Responses
from . import report

# Sums of responses are to be right to 1e-8.
REDUCTION = 1e-12


@dataclass(frozen=True)
class Load:
    """owner: "tag", "part" or "untagged"; index: in the case's list. key: which of its values. value: SI."""

    owner: str
    index: int
    name: str
    key: str
    value: float


def loads_of(case: Case) -> list[Load]:
    """Every load of the case that is not nought."""
    found = []
    owners = [("tag", index, tag) for index, tag in enumerate(case.tags)] + [("untagged", 0, case.untagged)]
    for owner, index, tag in owners:
        values = {
            "heat": tag.heat,
            "heat_flux": tag.heat_flux,
            "ambient": tag.convection.ambient if tag.convection else 0.0,
            "temperature": tag.temperature or 0.0,
        }
        found += [Load(owner, index, tag.name, key, value) for key, value in values.items() if value]
    for index, part in enumerate(case.parts):
        values = {"heat": part.heat, "heat_density": part.heat_density}
        found += [Load("part", index, part.name, key, value) for key, value in values.items() if value]
    return found


def why_not_linear(case: Case) -> str:
    """What makes the case nonlinear, in words; empty when nothing does."""
    for tag in (*case.tags, case.untagged):
        if tag.radiation is not None:
            return f"'{tag.name}' radiates"
        if tag.convection is not None and tag.convection.correlation is not None:
            return f"the film of '{tag.name}' follows its temperature"
    for part in case.parts:
        if not is_constant(part.material):
            return f"the conductivity of '{part.name}' follows its temperature"
    return ""


def responses(case: Case, mesh: Mesh, kept: Kept) -> Responses:
    """The responses of a case on its mesh.

    Raises Trouble of kind "case" when the case is not linear.
    """
    reason = why_not_linear(case)
    if reason:
        raise Trouble(
            "case", f"Temperatures are no sum of responses to loads: {reason}.", "Solve for each set of loads."
        )
    loads = loads_of(case)
    problems = [put_together(_with_alone(case, load), mesh) for load in loads]
    temperature, reactions = _solved(problems, kept)
    tables = [_table(*of_load) for of_load in zip(problems, temperature, reactions, strict=True)]
    told = [{"owner": load.owner, "name": load.name, "key": load.key} for load in loads]
    return Responses(
        loads=np.frombuffer(json.dumps(told).encode(), np.uint8),
        values=np.array([load.value for load in loads]),
        temperature=temperature,
        tag_mean=np.array([table[0] for table in tables]),
        tag_heat=np.array([table[1] for table in tables]),
        part_mean=np.array([table[2] for table in tables]),
        part_heat=np.array([table[3] for table in tables]),
    )


def _with_alone(case: Case, load: Load) -> Case:
    """The case with one load at one and all others at nought."""
    chosen = {(load.owner, load.index): load.key}
    return replace(
        case,
        tags=tuple(_alone(tag, chosen.get(("tag", index))) for index, tag in enumerate(case.tags)),
        untagged=_alone(case.untagged, chosen.get(("untagged", 0))),
        parts=tuple(_part_alone(part, chosen.get(("part", index))) for index, part in enumerate(case.parts)),
    )


def _alone(tag: Tag, key: str | None) -> Tag:
    return replace(
        tag,
        heat=float(key == "heat"),
        heat_flux=float(key == "heat_flux"),
        convection=tag.convection and replace(tag.convection, ambient=float(key == "ambient")),
        temperature=None if tag.temperature is None else float(key == "temperature"),
    )


def _part_alone(part: Part, key: str | None) -> Part:
    return replace(part, heat=float(key == "heat"), heat_density=float(key == "heat_density"))


def _solved(problems: list[Problem], kept: Kept) -> tuple[np.ndarray, np.ndarray]:
    """Temperatures (L, N) and reactions (L, N) W of problems that differ in their loads alone."""
    systems = [steady.assembled(problem, 0.0, kept) for problem in problems]
    matrix = systems[0].matrix
    nodes = held_nodes(problems[0])[0]
    free = np.delete(np.arange(matrix.shape[0]), nodes)
    temperature = np.zeros((matrix.shape[0], len(problems)))
    temperature[nodes] = np.stack([held_nodes(problem)[1] for problem in problems], axis=1)
    load = np.stack([system.load for system in systems], axis=1)

    def new_solver() -> LinearSolver:
        return steady.solver_of(problems[0].mesh, True, free)

    solver = kept.made("solver", (*kept.inputs("matrix"), nodes), new_solver)
    on_free = steady.on_free(matrix, free, free)
    temperature[free] = solver.solve_all(on_free, (load - matrix @ temperature)[free], REDUCTION)
    return temperature.T.copy(), (matrix @ temperature - load).T


def _table(
    problem: Problem, temperature: np.ndarray, reaction: np.ndarray
) -> tuple[list[float], list[float], np.ndarray, np.ndarray]:
    """Means and heats of the tags that have faces, and of the parts."""
    solution = steady.Solution(temperature, reaction, "", 0, 0, 0.0, 0.0)
    entering = report.heat_by_term(problem, solution)
    rows = [
        (_mean(patch, temperature), sum(split.values()))
        for patch, split in zip(problem.patches, entering, strict=True)
        if patch is not problem.patches[-1] or len(patch.facets)
    ]
    mesh, count = problem.mesh, len(problem.case.parts)
    volume = np.bincount(mesh.cell_part, problem.volume, count)
    warmth = np.bincount(mesh.cell_part, problem.volume * cell_means(mesh, temperature), count)
    return [mean for mean, _ in rows], [heat for _, heat in rows], warmth / volume, problem.heat_density * volume


def _mean(patch: Patch, temperature: np.ndarray) -> float:
    points = patch.points
    return float(points.weight @ (points.shape @ temperature) / patch.area) if len(patch.facets) else np.nan
