"""Conduction in each part: constant conductivity once and for all, tables over temperature at every iterate."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array

from ..fem.around import summed_matrix
from ..fem.mesh import Mesh
from ..fem.reference import quadrature, shape_functions, shape_gradients
from ..fem.volume import CELLS_AT_ONCE, conduction_matrix, geometry
from ..materials import Material, Property, Table
from ..parallel import side_by_side, slices
from .laws import STEP


def is_constant(material: Material) -> bool:
    return not any(isinstance(along, Table) for along in material.conductivity)


def principal_axes(material: Material) -> np.ndarray:
    """(3, 3) rows are the unit directions of the three conductivities, in world axes."""
    return np.eye(3) if material.axes is None else np.array(material.axes)


def principal_values(material: Material, temperature: np.ndarray) -> np.ndarray:
    """(3, ...) W/(m K) along the principal axes at temperature (...) K, real or complex."""
    values = [_at(along, temperature) for along in material.conductivity]
    return np.stack(values * (3 // len(values)))


def _at(value: Property, temperature: np.ndarray) -> np.ndarray:
    return value(temperature) if isinstance(value, Table) else np.full_like(temperature, value)


def conductivity_tensor(material: Material, temperature: np.ndarray) -> np.ndarray:
    """(M, 3, 3) W/(m K) at temperature (M,) K."""
    axes = principal_axes(material)
    return np.einsum("pi,pm,pj->mij", axes, principal_values(material, temperature), axes)


def constant_conduction(mesh: Mesh, materials: list[Material]) -> csr_array:
    """(N, N) W/K: the conduction of all parts whose conductivity does not depend on temperature."""
    tensors = np.zeros((len(materials), 3, 3))
    for index, material in enumerate(materials):
        if is_constant(material):
            tensors[index] = conductivity_tensor(material, np.zeros(1))[0]
    return conduction_matrix(mesh, tensors)


@dataclass(frozen=True)
class TabledConduction:
    """The conduction of one part whose conductivity depends on temperature.

    cells: (C, n). volume: (C,) m3. along: (3, 3, C) 1/m, slope along principal axis p (axis 0) of parent coordinate j.
    """

    name: str
    material: Material
    order: int
    cells: np.ndarray
    volume: np.ndarray
    along: np.ndarray

    def residual_and_tangent(self, temperature: np.ndarray) -> tuple[np.ndarray, csr_array]:
        """(N,) W and (N, N) W/K, exact but for the quadrature of the tables; temperature (N,) K."""
        size, nodes = len(temperature), self.cells.shape[1]
        residual, tangent = np.zeros((nodes, len(self.cells))), np.zeros((nodes, len(self.cells), nodes))

        def of_piece(piece: slice) -> None:
            local = temperature.take(self.cells[piece]).T
            residual[:, piece], tangent[:, piece] = self._of_cells(local, self.volume[piece], self.along[..., piece])

        side_by_side(of_piece, slices(len(self.cells), CELLS_AT_ONCE))
        return (
            np.bincount(self.cells.T.ravel(), residual.ravel(), size),
            summed_matrix(self.cells, lambda place, chosen: tangent[place].take(chosen, axis=0), size),
        )

    def _of_cells(self, local: np.ndarray, volume: np.ndarray, along: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """The same of some cells alone, (n, c) and (n, c, n); local (n, c) K, volume (c,), along (3, 3, c)."""
        nodes, count = local.shape
        residual, tangent = np.zeros((nodes, count)), np.zeros((nodes, nodes, count))
        points, weights = quadrature(3, 2 * self.order)
        for point, weight in zip(points[:, None], weights, strict=True):
            values = shape_functions(point, self.order)[0]
            towards = shape_gradients(point, self.order)[0] @ along
            gradient = (towards * local).sum(axis=1)
            stepped = weight * volume * principal_values(self.material, values @ local + 1j * STEP)
            residual += (towards * (stepped.real * gradient)[:, None]).sum(axis=0)
            for principal, conductance in zip(towards, stepped.real, strict=True):
                tangent += (conductance * principal)[:, None] * principal
            drift = (towards * (stepped.imag / STEP * gradient)[:, None]).sum(axis=0)
            tangent += drift[:, None] * values[:, None]
        return residual, tangent.transpose(0, 2, 1)


def tabled_conduction(mesh: Mesh, part: int, name: str, material: Material) -> TabledConduction:
    mine = np.flatnonzero(mesh.cell_part == part)
    shape = geometry(mesh, mine)
    along = np.einsum("pk,jkc->pjc", principal_axes(material), shape.gradients)
    return TabledConduction(name, material, mesh.order, mesh.cells[mine], shape.volume, along)
