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
from ..fem.mesh import CELL_FACES, Mesh, face_keys
from ..fem.reference import quadrature, shape_gradients
from ..fem.volume import geometry
from ..geometry.overlap import Overlap, covered_area, default_gap, overlap
from ..geometry.surface import area_vectors, areas
from ..materials import Material, Property, Table
from .conduction import principal_axes
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
    if not len(covered.facet):
        return np.zeros(len(mesh.boundary), bool)
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

    ways: how the flux of both sides crosses. adjoint: (P, N) the weighted normal flux at the largest conductivities.
    penalty: (P,) W/(m2 K).
    """

    name: str
    joint: Joint
    ways: tuple[Way, ...]
    adjoint: csr_array
    penalty: np.ndarray

    @property
    def is_constant(self) -> bool:
        return not any(isinstance(way.conductivity, Table) for way in self.ways)

    def mean_flux(self, temperature: np.ndarray) -> np.ndarray:
        """(P,) W/m2: the weighted mean of K grad T . n, n out of the first part."""
        return sum((way.flux(temperature) for way in self.ways), np.zeros(len(self.penalty)))

    def residual_and_tangent(self, temperature: np.ndarray) -> tuple[np.ndarray, csr_array]:
        """(N,) W and (N, N) W/K; temperature (N,) K."""
        jump, weight = self.joint.jump, self.joint.first.points.weight
        across = jump @ temperature
        residual = jump.T @ (weight * (self.penalty * across - self.mean_flux(temperature)))
        slope = sum((way.slope(temperature) for way in self.ways), csr_array(jump.shape))
        tangent = jump.T @ (diags_array(weight * self.penalty) @ jump - diags_array(weight) @ slope)
        return (
            residual - self.adjoint.T @ (weight * across),
            csr_array(tangent - self.adjoint.T @ diags_array(weight) @ jump),
        )

    def heat_across(self, temperature: np.ndarray) -> np.ndarray:
        """(P,) W/m2 from the first part into the second."""
        return self.penalty * (self.joint.jump @ temperature) - self.mean_flux(temperature)


@dataclass(frozen=True)
class Way:
    """One side's share of a bond's flux, along one principal direction a of its material or, if isotropic, any.

    gradient: (P, N) the side's share times (n . a) (a . grad), or n . grad. shape: (P, N) of the side's points.
    """

    conductivity: Property
    gradient: csr_array
    shape: csr_array

    def flux(self, temperature: np.ndarray) -> np.ndarray:
        """(P,) W/m2; temperature (N,) K."""
        if isinstance(self.conductivity, Table):
            return self.conductivity(self.shape @ temperature) * (self.gradient @ temperature)
        return self.conductivity * (self.gradient @ temperature)

    def slope(self, temperature: np.ndarray) -> csr_array:
        """(P, N) the derivative of the flux by the nodal temperatures."""
        if isinstance(self.conductivity, Table):
            stepped = self.conductivity(self.shape @ temperature + 1j * STEP)
            drift = stepped.imag / STEP * (self.gradient @ temperature)
            return csr_array(diags_array(stepped.real) @ self.gradient + diags_array(drift) @ self.shape)
        return self.conductivity * self.gradient


def crossing(mesh: Mesh, joint: Joint, case: Case) -> Conductance | Bond:
    """The term by which heat crosses a joint."""
    if joint.contact.conductance is not None:
        return Conductance(joint, joint.contact.conductance)
    return _bond(mesh, joint, case)


def _bond(mesh: Mesh, joint: Joint, case: Case) -> Bond:
    sides = (joint.first, joint.second)
    materials = [case.parts[side.part].material for side in sides]
    cells = boundary_cells(mesh)
    # The constant of the trace inequality for polynomials on a simplex, of one degree less for gradients:
    # Warburton & Hesthaven, Comput. Methods Appl. Mech. Eng. 192 (2003) 2765.
    trace = mesh.order * (mesh.order + 2) / 3.0
    stiff = [
        trace * _across(side.normal, material) * _area_per_volume(mesh, side, cells)
        for side, material in zip(sides, materials, strict=True)
    ]
    total = stiff[0] + stiff[1]
    ways = tuple(
        Way(conductivity, csr_array(diags_array(share / total) @ gradient), side.points.shape)
        for side, material, share in zip(sides, materials, reversed(stiff), strict=True)
        for conductivity, gradient in _normal_gradients(mesh, side, material, cells)
    )
    return Bond(
        name="the bond of " + " and ".join(f"'{case.parts[side.part].name}'" for side in sides),
        joint=joint,
        ways=ways,
        adjoint=sum((_largest(way.conductivity) * way.gradient for way in ways), csr_array(joint.jump.shape)),
        penalty=BOND_PENALTY * stiff[0] * stiff[1] / total,
    )


def _largest(conductivity: Property) -> float:
    """W/(m K), the largest of a table."""
    return max(conductivity.value) if isinstance(conductivity, Table) else conductivity


def _directions(normal: np.ndarray, material: Material) -> list[np.ndarray]:
    """(P, 3) the part of each normal along each principal direction; the normals themselves if there are none."""
    if len(material.conductivity) == 1:
        return [normal]
    return [np.outer(normal @ axis, axis) for axis in principal_axes(material)]


def _across(normal: np.ndarray, material: Material) -> np.ndarray:
    """(P,) W/(m K): n . K n at the largest conductivities."""
    largest = [_largest(conductivity) for conductivity in material.conductivity]
    shares = [(along**2).sum(axis=1) for along in _directions(normal, material)]
    return np.array(largest) @ shares


def boundary_cells(mesh: Mesh) -> np.ndarray:
    """(B,) the cell behind each boundary triangle."""
    faces = mesh.cells[:, CELL_FACES].reshape(-1, 3)
    keys = face_keys(np.concatenate([faces, mesh.boundary[:, :3]]), len(mesh.nodes))
    known, wanted = keys[: len(faces)], keys[len(faces) :]
    order = np.argsort(known)
    return order[np.searchsorted(known, wanted, sorter=order)] // len(CELL_FACES)


def _area_per_volume(mesh: Mesh, side: Side, cells: np.ndarray) -> np.ndarray:
    """(P,) 1/m: the boundary triangle's area over its cell's volume."""
    return areas(mesh.nodes[mesh.boundary[side.points.facet, :3]]) / geometry(mesh, cells[side.points.facet]).volume


def _normal_gradients(
    mesh: Mesh, side: Side, material: Material, cells: np.ndarray
) -> list[tuple[Property, csr_array]]:
    """Each conductivity of the material, and (P, N) the slope along its part of the normal at the points."""
    cell = cells[side.points.facet]
    # Straight-sided elements map their nodes' positions as they do temperatures.
    offset = side.points.shape @ mesh.nodes - mesh.nodes[mesh.cells[cell, 0]]
    gradients = geometry(mesh, cell).gradients
    parent = np.einsum("ijp,pj->pi", gradients, offset)
    barycentric = np.concatenate([1.0 - parent.sum(axis=1, keepdims=True), parent], axis=1)
    slopes = shape_gradients(barycentric, mesh.order)
    nodes, starts = mesh.cells[cell].ravel(), np.arange(len(cell) + 1) * mesh.cells.shape[1]
    found = []
    for conductivity, along in zip(material.conductivity, _directions(side.normal, material), strict=True):
        towards = np.einsum("ijp,pj->pi", gradients, along)
        values = np.einsum("pai,pi->pa", slopes, towards)
        found.append((conductivity, csr_array((values.ravel(), nodes, starts), (len(cell), len(mesh.nodes)))))
    return found
