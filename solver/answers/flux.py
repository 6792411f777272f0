"""The heat flux of a solved field, at the middle of each cell and at the nodes."""

from __future__ import annotations

import numpy as np

from ..fem.around import summed_at_nodes
from ..fem.mesh import CELL_EDGES, Mesh
from ..fem.reference import shape_functions
from ..fem.volume import CELLS_AT_ONCE, geometry, gradients_at
from ..materials import Material
from ..parallel import slices
from ..physics.conduction import is_constant, principal_axes, principal_values
from ..physics.problem import Problem

MIDDLE = np.full(4, 0.25)


def heat_flux(problem: Problem, temperature: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(M, 3) W/m2 at the middle of each cell, and (N, 3) at the nodes: the volume-weighted mean of the cells there."""
    mesh, materials = problem.mesh, [part.material for part in problem.case.parts]
    pieces = slices(len(mesh.cells), CELLS_AT_ONCE)
    at_cells = np.concatenate([_flux(mesh, materials, temperature, piece, MIDDLE) for piece in pieces])
    uniform = mesh.order == 1 and all(is_constant(material) for material in materials)
    places = _local_nodes(mesh.order)

    def weighted(place: int, chosen: np.ndarray) -> np.ndarray:
        flux = at_cells[chosen] if uniform else _flux(mesh, materials, temperature, chosen, places[place])
        return problem.volume[chosen, None] * np.column_stack([flux, np.ones(len(chosen))])

    sums = summed_at_nodes(mesh.cells, weighted, len(mesh.nodes))
    return at_cells, sums[:, :3] / sums[:, 3:]


def _flux(
    mesh: Mesh, materials: list[Material], temperature: np.ndarray, chosen: slice | np.ndarray, point: np.ndarray
) -> np.ndarray:
    """(k, 3) W/m2: -K grad T at one barycentric point (4,) of the chosen cells (k,)."""
    local, part = temperature.take(mesh.cells[chosen]), mesh.cell_part[chosen]
    gradient = gradients_at(geometry(mesh, chosen), local, point[None])[0]
    there = local @ shape_functions(point[None], mesh.order)[0]
    flux = np.empty_like(gradient)
    for index, material in enumerate(materials):
        mine = part == index
        axes = principal_axes(material)
        flux[:, mine] = -axes.T @ (principal_values(material, there[mine]) * (axes @ gradient[:, mine]))
    return flux.T


def _local_nodes(order: int) -> np.ndarray:
    """(n, 4) barycentric coordinates of an element's own nodes."""
    corners = np.eye(4)
    return corners if order == 1 else np.concatenate([corners, corners[CELL_EDGES].mean(axis=1)])
