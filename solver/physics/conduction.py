"""Conduction in each part: constant conductivity once and for all, tables over temperature at every iterate."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array

from ..fem.mesh import Mesh
from ..fem.reference import quadrature, shape_functions, shape_gradients
from ..fem.volume import Geometry, assemble, conduction_blocks, metric
from ..materials import Material, Property, Table
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


def constant_conduction(mesh: Mesh, shape: Geometry, materials: list[Material]) -> csr_array:
    """(N, N) W/K: the conduction of all parts whose conductivity does not depend on temperature."""
    tensors = np.zeros((len(materials), 3, 3))
    for index, material in enumerate(materials):
        if is_constant(material):
            tensors[index] = conductivity_tensor(material, np.zeros(1))[0]
    blocks = conduction_blocks(mesh.order, metric(shape, tensors[mesh.cell_part]))
    return assemble(mesh.cells, blocks, len(mesh.nodes))


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
        local = temperature[self.cells]
        residual, tangent = np.zeros((nodes, len(self.cells))), np.zeros((nodes, nodes, len(self.cells)))
        points, weights = quadrature(3, 2 * self.order)
        for point, weight in zip(points[:, None], weights, strict=True):
            values = shape_functions(point, self.order)[0]
            slopes = shape_gradients(point, self.order)[0]
            stepped = principal_values(self.material, local @ values + 1j * STEP)
            towards = np.einsum("aj,pjc->apc", slopes, self.along)
            gradient = np.einsum("apc,ca->pc", towards, local)
            mass = weight * self.volume
            flux = mass * stepped.real * gradient
            residual += np.einsum("apc,pc->ac", towards, flux)
            tangent += np.einsum("apc,bpc->abc", towards, mass * stepped.real * towards, optimize=True)
            drift = np.einsum("apc,pc->ac", towards, mass * stepped.imag / STEP * gradient)
            tangent += drift[:, None] * values[None, :, None]
        return (
            np.bincount(self.cells.T.ravel(), residual.ravel(), size),
            assemble(self.cells, tangent, size),
        )


def tabled_conduction(mesh: Mesh, shape: Geometry, part: int, name: str, material: Material) -> TabledConduction:
    mine = mesh.cell_part == part
    along = np.einsum("pk,jkc->pjc", principal_axes(material), shape.gradients[:, :, mine])
    return TabledConduction(name, material, mesh.order, mesh.cells[mine], shape.volume[mine], along)
