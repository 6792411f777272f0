"""The steady state: Newton's method on the heat balance of every node.

With R(T) the heat that each node is short of, the linear terms are one matrix and one load, assembled once; the
others give their residual and exact tangent at every iterate. Where all terms are linear the first step is the answer,
and further ones, if any, are iterative refinement with the same factors.

Temperatures are solved as rises above a reference near them: conduction then is free of the rounding that three hundred
kelvin on every node would bring.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from functools import reduce
from operator import add

import numpy as np
from scipy.optimize import brentq
from scipy.sparse import csr_array

from ..errors import Trouble
from ..fem.boundary import SurfacePoints, film_matrix, flux_load
from ..fem.linear_algebra import LinearSolver
from ..fem.mesh import Mesh
from ..fem.multigrid import midside_interpolation
from ..fem.volume import heat_load
from ..keeping import Kept
from .conduction import TabledConduction, constant_conduction, is_constant, tabled_conduction
from .contact import Bond, Conductance
from .laws import Law, Linear, flux_and_slope
from .problem import Problem, held_nodes

# What all free nodes together may still be short of, as a share of the heat that passes through the product.
TOLERANCE = 1e-10
# Close to balance it is rounding, not the method, that stops a step.
ROUNDING = 1e-9
MOST_STEPS = 60
# Radiation falls with the cube of the temperature: from a start far too cold the whole step is far too long.
SMALLEST_DAMPING = 2.0**-30
LINEAR_REDUCTION = 1e-12
NEWTON_REDUCTION = 1e-6

Progress = Callable[[float, str], None]


@dataclass(frozen=True)
class Solution:
    """temperature: (N,) K. reaction: (N,) W that enters at each held node; at free ones, what is left unbalanced."""

    temperature: np.ndarray
    reaction: np.ndarray
    method: str
    steps: int
    iterations: int
    relative_residual: float
    assembly_seconds: float


@dataclass(frozen=True)
class NonlinearSurface:
    """A law of a patch whose flux is not linear in the temperature."""

    name: str
    points: SurfacePoints
    law: Law

    def residual_and_tangent(self, temperature: np.ndarray) -> tuple[np.ndarray, csr_array]:
        flux, slope = flux_and_slope(self.law, self.points.shape @ temperature, self.points.facet)
        return -flux_load(self.points, flux), film_matrix(self.points, -slope)


@dataclass(frozen=True)
class System:
    """The balance of a problem: matrix @ (T - reference) - load + the nonlinear terms' residuals."""

    reference: float
    matrix: csr_array
    load: np.ndarray
    nonlinear: tuple[NonlinearSurface | TabledConduction | Bond, ...]

    @property
    def symmetric(self) -> bool:
        return all(isinstance(term, NonlinearSurface) for term in self.nonlinear)

    def residual_and_tangent(self, rise: np.ndarray) -> tuple[list[np.ndarray], csr_array]:
        """Residual (N,) W of the linear terms and of each nonlinear one, and the tangent (N, N) W/K of all."""
        found = [term.residual_and_tangent(self.reference + rise) for term in self.nonlinear]
        # The large one last here as below: adding copies.
        tangent = reduce(add, [*(tangent for _, tangent in found), self.matrix])
        return [self.matrix @ rise - self.load, *(residual for residual, _ in found)], tangent


def assembled(problem: Problem, reference: float, kept: Kept | None = None) -> System:
    """The system of all terms of the problem, temperatures counted from ``reference`` (K)."""
    kept = Kept() if kept is None else kept
    mesh, parts = problem.mesh, problem.case.parts
    load = heat_load(mesh, problem.volume, problem.heat_density[mesh.cell_part])
    nonlinear: list[NonlinearSurface | TabledConduction | Bond] = [
        tabled_conduction(mesh, index, f"the conductivity of '{part.name}'", part.material)
        for index, part in enumerate(parts)
        if not is_constant(part.material)
    ]
    for patch in problem.patches:
        for kind, law in patch.laws.items():
            if isinstance(law, Linear):
                load = load + flux_load(patch.points, law.flux(np.full(1, reference), patch.facets[:1]))
            else:
                nonlinear.append(NonlinearSurface(f"the {kind} of '{patch.name}'", patch.points, law))
    nonlinear += [contact for contact in problem.contacts if isinstance(contact, Bond) and not contact.is_constant]
    matrix = kept.made("matrix", _matrix_inputs(problem), lambda: _linear_matrix(problem, kept))
    return System(reference, matrix, load, tuple(nonlinear))


def _linear_matrix(problem: Problem, kept: Kept) -> csr_array:
    """(N, N) W/K of all terms that are linear in the temperature."""
    mesh, materials = problem.mesh, [part.material for part in problem.case.parts]
    matrices = [
        film_matrix(patch.points, law.coefficient)
        for patch in problem.patches
        for law in patch.laws.values()
        if isinstance(law, Linear) and law.coefficient
    ]
    matrices += [
        contact.residual_and_tangent(np.zeros(len(mesh.nodes)))[1]
        for contact in problem.contacts
        if isinstance(contact, Conductance) or contact.is_constant
    ]
    inputs = (mesh.nodes, mesh.cells, mesh.cell_part, materials)
    conduction = kept.made("conduction", inputs, lambda: constant_conduction(mesh, materials))
    # The large one last: adding copies.
    return reduce(add, [*matrices, conduction])


def _matrix_inputs(problem: Problem) -> tuple[object, ...]:
    """All that the linear terms' matrix depends on; loads are not among it."""
    mesh, case = problem.mesh, problem.case
    films = [
        sum((law.coefficient for law in patch.laws.values() if isinstance(law, Linear)), 0.0)
        for patch in problem.patches
    ]
    materials = [part.material for part in case.parts]
    return (mesh.nodes, mesh.cells, mesh.cell_part, mesh.boundary_tag, materials, case.contacts, films)


def balanced_temperature(problem: Problem) -> float:
    """K: where to start. The mean of what is held, or else the uniform temperature at which all heat is shed."""
    held = [(patch.held, patch.area) for patch in problem.patches if patch.held is not None and patch.area]
    if held:
        temperatures, areas = np.array(held).T
        return float(temperatures @ areas / areas.sum())

    released = float(problem.heat_density[problem.mesh.cell_part] @ problem.volume)

    def surplus(temperature: float) -> float:
        return released + sum(
            float(patch.points.weight @ law.flux(np.full(len(patch.points.facet), temperature), patch.points.facet))
            for patch in problem.patches
            for law in patch.laws.values()
        )

    high = 400.0
    while surplus(high) > 0 and high < 1e6:
        high *= 2.0
    if surplus(high) > 0 or surplus(1.0) < 0:
        return 300.0
    return float(brentq(surplus, 1.0, high, xtol=1e-3))


def heat_through(problem: Problem, temperature: np.ndarray) -> list[dict[str, float]]:
    """W that enters each patch by each of its laws; temperature (N,) K."""
    return [
        {
            kind: float(patch.points.weight @ law.flux(patch.points.shape @ temperature, patch.points.facet))
            for kind, law in patch.laws.items()
        }
        for patch in problem.patches
    ]


def solve(
    problem: Problem,
    start: float | None = None,
    progress: Progress = lambda fraction, text: None,
    kept: Kept | None = None,
) -> Solution:
    """The steady temperatures; start: K, uniform, chosen if None. kept: matrices and solvers of earlier problems.

    Raises Trouble of kind "unconverged" that says which term fought.
    """
    began = time.perf_counter()
    kept = Kept() if kept is None else kept
    system = assembled(problem, balanced_temperature(problem) if start is None else start, kept)
    assembly_seconds = time.perf_counter() - began
    nodes, held, _ = held_nodes(problem)
    free = np.delete(np.arange(len(problem.mesh.nodes)), nodes)

    def new_solver() -> LinearSolver:
        return solver_of(problem.mesh, system.symmetric, free)

    # What a nonlinear problem's solver was set up for is gone with its last iterate.
    linear = not system.nonlinear
    linear_solver = kept.made("solver", (*kept.inputs("matrix"), nodes), new_solver) if linear else new_solver()
    iterations_before = linear_solver.iterations
    reduction = NEWTON_REDUCTION if system.nonlinear else LINEAR_REDUCTION

    rise = np.zeros(len(problem.mesh.nodes))
    rise[nodes] = held - system.reference
    iterate = Iterate(rise, *system.residual_and_tangent(rise))
    steps = 0
    while True:
        share = _unbalanced_share(problem, system, iterate, free)
        if share <= TOLERANCE:
            break
        left = f"{100 * share:.2g} % of the heat is still unbalanced" if steps else f"{len(free)} temperatures"
        progress(min(0.95, steps / 10.0), left)
        change = linear_solver.solve(on_free(iterate.tangent, free, free), -iterate.residual[free], reduction)
        following = _damped(system, iterate, free, change, SMALLEST_DAMPING if share > ROUNDING else 1.0)
        steps += 1
        if following is None and share <= ROUNDING:
            break
        if following is None or steps == MOST_STEPS:
            raise _unconverged(system, iterate, change, free, share, steps)
        iterate = following
    progress(1.0, "all heat is balanced")
    return Solution(
        temperature=system.reference + iterate.rise,
        reaction=iterate.residual,
        method=linear_solver.method,
        steps=steps,
        iterations=linear_solver.iterations - iterations_before,
        relative_residual=share,
        assembly_seconds=assembly_seconds,
    )


@dataclass(frozen=True)
class Iterate:
    """rise: (N,) K. residuals: W, of the linear terms (N,) and of each nonlinear one. tangent: (N, N) W/K."""

    rise: np.ndarray
    residuals: list[np.ndarray]
    tangent: csr_array

    @property
    def residual(self) -> np.ndarray:
        return np.sum(self.residuals, axis=0)


def solver_of(mesh: Mesh, symmetric: bool, free: np.ndarray) -> LinearSolver:
    """For matrices on the free nodes of a mesh."""
    return LinearSolver(symmetric, _free_interpolation(mesh, free))


def on_free(matrix: csr_array, rows: np.ndarray, columns: np.ndarray) -> csr_array:
    """The rows and columns of those numbers, rising; the matrix itself where they are all."""
    some = matrix if len(rows) == matrix.shape[0] else matrix[rows]
    return some if len(columns) == matrix.shape[1] else some[:, columns]


def _free_interpolation(mesh: Mesh, free: np.ndarray) -> csr_array | None:
    """From linear functions to quadratic ones, between the free nodes of both; None for a linear mesh."""
    if mesh.order == 1:
        return None
    whole = midside_interpolation(mesh)
    return on_free(whole, free, free[free < whole.shape[1]])


def _unbalanced_share(problem: Problem, system: System, iterate: Iterate, free: np.ndarray) -> float:
    """What the free nodes are short of, as a share of the heat that passes.

    Where next to none passes, rounding is what is left of it: so much as could be that counts as ROUNDING.
    """
    left = np.abs(iterate.residual[free]).sum()
    terms = [heat for heats in heat_through(problem, system.reference + iterate.rise) for heat in heats.values()]
    released = problem.heat_density[problem.mesh.cell_part] * problem.volume
    held = np.delete(iterate.residual, free)
    passing = 0.5 * (np.abs(terms).sum() + np.abs(released).sum() + np.abs(held).sum())
    if left <= TOLERANCE * passing:
        return float(left / passing) if left else 0.0
    return float(left / (passing + np.finfo(float).eps / ROUNDING * _summed(system, iterate)[free].sum()))


def _summed(system: System, iterate: Iterate) -> np.ndarray:
    """(N,) W, the size of what adds up to each node's residual: linear terms by the rise, the others by all of T."""
    summed = _sizes(system.matrix) @ np.abs(iterate.rise)
    if system.nonlinear:
        summed += _sizes(iterate.tangent - system.matrix) @ np.abs(system.reference + iterate.rise)
    return summed


def _sizes(matrix: csr_array) -> csr_array:
    """The absolute values of all entries."""
    return csr_array((np.abs(matrix.data), matrix.indices, matrix.indptr), shape=matrix.shape)


def _damped(system: System, iterate: Iterate, free: np.ndarray, change: np.ndarray, smallest: float) -> Iterate | None:
    """The longest of the steps 1, 1/2, 1/4, ... ``smallest`` along ``change`` that lessens the residual, if any does.

    Armijo, Pacific J. Math. 16 (1966) 1.
    """
    before = np.linalg.norm(iterate.residual[free])
    damping = 1.0
    while damping >= smallest:
        rise = iterate.rise.copy()
        rise[free] += damping * change
        following = Iterate(rise, *system.residual_and_tangent(rise))
        if np.linalg.norm(following.residual[free]) <= (1.0 - 1e-4 * damping) * before:
            return following
        damping *= 0.5
    return None


def _unconverged(
    system: System, iterate: Iterate, change: np.ndarray, free: np.ndarray, share: float, steps: int
) -> Trouble:
    """Names the term whose residual strays most from its tangent over the step that would not settle."""
    rise = iterate.rise.copy()
    rise[free] += change
    now, then = iterate.residuals[1:], system.residual_and_tangent(rise)[0][1:]
    names = [term.name for term in system.nonlinear]
    strays = [float(np.linalg.norm((after - before)[free])) for before, after in zip(now, then, strict=True)]
    culprit = names[int(np.argmax(strays))] if names else "the conduction between very unlike materials"
    return Trouble(
        "unconverged",
        f"The temperatures did not settle in {steps} steps, with {share:.1e} of the heat unbalanced; "
        f"{culprit} fought most.",
        "Check the values of that term; a given film coefficient in its place settles always.",
    )
