"""Heat that crosses from one part to another where their faces lie against each other.

The two triangulations do not match: every integral runs over the pieces of their true overlap, with the shape
functions of both sides at the same points, so that what leaves one part enters the other.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array, diags_array

from ..case import Case, Contact
from ..errors import Trouble
from ..fem.boundary import SurfacePoints, points_at
from ..fem.mesh import CELL_FACES, Mesh
from ..fem.reference import quadrature, shape_gradients
from ..fem.volume import Geometry
from ..geometry.overlap import Overlap, covered_area, default_gap, overlap
from ..geometry.surface import area_vectors, areas
from ..materials import Material, Table
from .conduction import is_constant, principal_axes, principal_values
from .laws import STEP

# A face is wholly in contact when this share of it is.
WHOLLY = 1.0 - 1e-6
# Above 1 the bonded form is stable; twice that for each of the two faces that a cell may have in the joint.
BOND_PENALTY = 4.0


@dataclass(frozen=True)
class Side:
    """One part's side of a contact. normal: (P, 3) out of the first part at the points."""

    part: int
    points: SurfacePoints
    normal: np.ndarray


@dataclass(frozen=True)
class Joint:
    """The overlap of two parts' faces in one contact of the case; the points of both sides correspond."""

    contact: Contact
    first: Side
    second: Side

    @property
    def area(self) -> float:
        return self.first.points.area

    @property
    def jump(self) -> csr_array:
        """(P, N): the temperature of the first side less that of the second."""
        return csr_array(self.first.points.shape - self.second.points.shape)


@dataclass(frozen=True)
class Covered:
    """The pieces of boundary triangles that lie in contacts: facet (K,), barycentric corners (K, 3, 3), area (K,)."""

    facet: np.ndarray
    corners: np.ndarray
    area: np.ndarray


def joints(case: Case, mesh: Mesh) -> tuple[list[Joint], Covered]:
    """Every contact's overlap on the mesh, and what it takes of the boundary.

    Raises Trouble of kind "geometry" for a contact between parts that do not touch.
    """
    found, facets, corners, measures = [], [], [], []
    for contact in case.contacts:
        sides = [np.flatnonzero(mesh.boundary_part == part) for part in contact.parts]
        one, other = (mesh.nodes[mesh.boundary[side, :3]] for side in sides)
        gap = contact.gap if contact.gap is not None else default_gap(one, other)
        pieces = overlap(one, other, gap)
        if not len(pieces.area):
            names = " and ".join(f"'{case.parts[part].name}'" for part in contact.parts)
            raise Trouble(
                "geometry",
                f"{names} are named as a contact and no faces of theirs lie within {1e3 * gap:.3g} mm of each other.",
                "Move the parts together, or widen the contact's gap.",
                points=[triangles.mean(axis=(0, 1)).tolist() for triangles in (one, other)],
            )
        first, second = sides[0][pieces.first], sides[1][pieces.second]
        found.append(_joint(mesh, contact, first, second, pieces))
        facets += [first, second]
        corners += [pieces.first_barycentric, pieces.second_barycentric]
        measures += [pieces.area, pieces.area]
    if not found:
        return [], Covered(np.zeros(0, int), np.zeros((0, 3, 3)), np.zeros(0))
    return found, Covered(np.concatenate(facets), np.concatenate(corners), np.concatenate(measures))


def _joint(mesh: Mesh, contact: Contact, first: np.ndarray, second: np.ndarray, pieces: Overlap) -> Joint:
    return Joint(
        contact,
        _side(mesh, contact.parts[0], first, pieces.first_barycentric, pieces.area, outward=1.0),
        _side(mesh, contact.parts[1], second, pieces.second_barycentric, pieces.area, outward=-1.0),
    )


def _side(mesh: Mesh, part: int, facet: np.ndarray, corners: np.ndarray, area: np.ndarray, outward: float) -> Side:
    points = piece_points(mesh, facet, corners, area)
    normal = area_vectors(mesh.nodes[mesh.boundary[points.facet, :3]])
    return Side(part, points, outward * normal / np.linalg.norm(normal, axis=1, keepdims=True))


def piece_points(mesh: Mesh, facet: np.ndarray, corners: np.ndarray, area: np.ndarray) -> SurfacePoints:
    """Quadrature on pieces (K,) of boundary triangles, given by the barycentric coordinates of their corners."""
    rule, weights = quadrature(2, 2 * mesh.order)
    barycentric = np.einsum("qc,kcb->kqb", rule, corners).reshape(-1, 3)
    weight = np.outer(area, weights).ravel()
    return points_at(mesh.boundary, np.repeat(facet, len(rule)), barycentric, weight, len(mesh.nodes))


def wholly_covered(mesh: Mesh, covered: Covered) -> np.ndarray:
    """(B,) whether a boundary triangle lies in contact all over."""
    area = areas(mesh.nodes[mesh.boundary[:, :3]])
    return covered_area(covered.facet, covered.area, len(area)) > WHOLLY * area


@dataclass(frozen=True)
class Conductance:
    """A joint that heat crosses in proportion to the jump of temperature; conductance: W/(m2 K)."""

    joint: Joint
    conductance: float

    def residual_and_tangent(self, temperature: np.ndarray) -> tuple[np.ndarray, csr_array]:
        """(N,) W and (N, N) W/K, the integral of h [T][v]; temperature (N,) K or any rise."""
        jump = self.joint.jump
        tangent = csr_array(jump.T @ diags_array(self.joint.first.points.weight * self.conductance) @ jump)
        return tangent @ temperature, tangent

    def heat_across(self, temperature: np.ndarray) -> np.ndarray:
        """(P,) W/m2 from the first part into the second."""
        return self.conductance * (self.joint.jump @ temperature)


@dataclass(frozen=True)
class Bond:
    """Two parts joined perfectly, by Nitsche's method with weighted means.

    The heat that crosses is the weighted mean of both sides' fluxes, and their jump is penalised just enough.
    Nitsche, Abh. Math. Sem. Univ. Hamburg 36 (1971) 9; weights: Ern, Stephansen & Zunino, IMA J. Numer. Anal. 29
    (2009) 235, which keep the form sound for conductivities as unlike as insulation and metal.

    slopes: for each side and principal direction a (P, N): its share times (n . a) (a . grad), n out of the first part.
    adjoint: (P, N) the weighted normal flux at the largest conductivities. penalty: (P,) W/(m2 K).
    """

    name: str
    joint: Joint
    materials: tuple[Material, Material]
    slopes: tuple[tuple[csr_array, ...], ...]
    adjoint: csr_array
    penalty: np.ndarray

    @property
    def is_constant(self) -> bool:
        return all(is_constant(material) for material in self.materials)

    def mean_flux(self, temperature: np.ndarray) -> tuple[np.ndarray, csr_array]:
        """The weighted mean of K grad T . n, n out of the first part: (P,) W/m2 and its slope (P, N)."""
        flux, tangent = np.zeros(len(self.penalty)), csr_array(self.adjoint.shape)
        for side, material, slopes in zip(
            (self.joint.first, self.joint.second), self.materials, self.slopes, strict=True
        ):
            stepped = principal_values(material, side.points.shape @ temperature + 1j * STEP)
            for values, slope in zip(stepped, slopes, strict=True):
                gradient = slope @ temperature
                flux += values.real * gradient
                tangent = tangent + diags_array(values.real) @ slope
                tangent = tangent + diags_array(values.imag / STEP * gradient) @ side.points.shape
        return flux, csr_array(tangent)

    def residual_and_tangent(self, temperature: np.ndarray) -> tuple[np.ndarray, csr_array]:
        """(N,) W and (N, N) W/K; temperature (N,) K."""
        flux, slope = self.mean_flux(temperature)
        jump, weight = self.joint.jump, self.joint.first.points.weight
        across = jump @ temperature
        residual = jump.T @ (weight * (self.penalty * across - flux)) - self.adjoint.T @ (weight * across)
        tangent = jump.T @ (diags_array(weight * self.penalty) @ jump - diags_array(weight) @ slope)
        return residual, csr_array(tangent - self.adjoint.T @ diags_array(weight) @ jump)

    def heat_across(self, temperature: np.ndarray) -> np.ndarray:
        """(P,) W/m2 from the first part into the second."""
        return self.penalty * (self.joint.jump @ temperature) - self.mean_flux(temperature)[0]


def crossing(mesh: Mesh, shape: Geometry, joint: Joint, case: Case) -> Conductance | Bond:
    """The term by which heat crosses a joint."""
    if joint.contact.conductance is not None:
        return Conductance(joint, joint.contact.conductance)
    return _bond(mesh, shape, joint, case)


def _bond(mesh: Mesh, shape: Geometry, joint: Joint, case: Case) -> Bond:
    sides = (joint.first, joint.second)
    first, second = (case.parts[side.part] for side in sides)
    cells = boundary_cells(mesh)
    # The constant of the trace inequality for polynomials on a simplex, of one degree less for gradients:
    # Warburton & Hesthaven, Comput. Methods Appl. Mech. Eng. 192 (2003) 2765.
    trace = mesh.order * (mesh.order + 2) / 3.0
    largest = [np.array(_largest(part.material)) for part in (first, second)]
    stiff = [
        trace * _along(side.normal, part.material, values) * _area_per_volume(mesh, shape, side, cells)
        for side, part, values in zip(sides, (first, second), largest, strict=True)
    ]
    total = stiff[0] + stiff[1]
    slopes = tuple(
        tuple(
            csr_array(diags_array(share / total) @ row)
            for row in _normal_slopes(mesh, shape, side, part.material, cells)
        )
        for side, part, share in zip(sides, (first, second), reversed(stiff), strict=True)
    )
    adjoint = sum(values[axis] * slopes[side][axis] for side, values in enumerate(largest) for axis in range(3))
    return Bond(
        name=f"the bond of '{first.name}' and '{second.name}'",
        joint=joint,
        materials=(first.material, second.material),
        slopes=slopes,
        adjoint=csr_array(adjoint),
        penalty=BOND_PENALTY * stiff[0] * stiff[1] / total,
    )


def _largest(material: Material) -> list[float]:
    """W/(m K) along the three principal axes, the largest of each table."""
    values = [max(along.value) if isinstance(along, Table) else along for along in material.conductivity]
    return values * (3 // len(values))


def _along(normal: np.ndarray, material: Material, values: np.ndarray) -> np.ndarray:
    """(P,) W/(m K): n . K n."""
    return (normal @ principal_axes(material).T) ** 2 @ values


def boundary_cells(mesh: Mesh) -> np.ndarray:
    """(B,) the cell behind each boundary triangle."""
    faces = np.sort(mesh.cells[:, CELL_FACES].reshape(-1, 3), axis=1)
    wanted = np.sort(mesh.boundary[:, :3], axis=1)
    _, numbers = np.unique(np.concatenate([faces, wanted]), axis=0, return_inverse=True)
    numbers = numbers.reshape(-1)
    cell_of = np.empty(numbers.max() + 1, np.int64)
    cell_of[numbers[: len(faces)]] = np.repeat(np.arange(len(mesh.cells)), 4)
    return cell_of[numbers[len(faces) :]]


def _area_per_volume(mesh: Mesh, shape: Geometry, side: Side, cells: np.ndarray) -> np.ndarray:
    """(P,) 1/m: the boundary triangle's area over its cell's volume."""
    return areas(mesh.nodes[mesh.boundary[side.points.facet, :3]]) / shape.volume[cells[side.points.facet]]


def _normal_slopes(
    mesh: Mesh, shape: Geometry, side: Side, material: Material, cells: np.ndarray
) -> tuple[csr_array, ...]:
    """For each principal direction a of the material (P, N): (n . a) (a . grad N) at the points, in their own cells."""
    cell = cells[side.points.facet]
    position = _positions(mesh, side.points)
    origin = mesh.nodes[mesh.cells[cell, 0]]
    parent = np.einsum("ijp,pj->pi", shape.gradients[:, :, cell], position - origin)
    barycentric = np.concatenate([1.0 - parent.sum(axis=1, keepdims=True), parent], axis=1)
    gradients = np.einsum("pai,ijp->paj", shape_gradients(barycentric, mesh.order), shape.gradients[:, :, cell])
    starts = np.arange(len(cell) + 1) * mesh.cells.shape[1]
    return tuple(
        csr_array(
            (((side.normal @ axis)[:, None] * (gradients @ axis)).ravel(), mesh.cells[cell].ravel(), starts),
            (len(cell), len(mesh.nodes)),
        )
        for axis in principal_axes(material)
    )


def _positions(mesh: Mesh, points: SurfacePoints) -> np.ndarray:
    """(P, 3) m; straight-sided elements map their nodes' positions as they do temperatures."""
    return points.shape @ mesh.nodes
