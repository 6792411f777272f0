"""The heat problem of a case on a mesh: which terms act where."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array, csr_array
from scipy.sparse.csgraph import connected_components

from ..case import Case, Tag
from ..errors import Trouble
from ..fem.boundary import SurfacePoints, both, face_points
from ..fem.mesh import Mesh
from ..fem.volume import volumes
from ..geometry.surface import area_vectors
from .contact import Bond, Conductance, Covered, crossing, joints, piece_points, wholly_covered
from .film import film_law
from .laws import Correlated, Law, Linear, Radiating
from .patch import Patch as Faces

# The terms of a tag, as the result splits them.
SOURCE, CONVECTION, RADIATION = "source", "convection", "radiation"


@dataclass(frozen=True)
class Patch:
    """The exposed faces of one tag: quadrature points on them and the laws that act there, by kind.

    facets: (K,) boundary triangles. held: K, or None.
    """

    name: str
    facets: np.ndarray
    points: SurfacePoints
    laws: Mapping[str, Law]
    held: float | None

    @property
    def area(self) -> float:
        return self.points.area


@dataclass(frozen=True)
class Problem:
    """volume: (M,) m3 of each cell. heat_density: (P,) W/m3 of each part.

    patches: one for each tag of the case, then the untagged faces. contacts: one for each contact of the case.
    joined: (B,) boundary triangles that lie wholly within contacts.
    """

    case: Case
    mesh: Mesh
    volume: np.ndarray
    heat_density: np.ndarray
    patches: tuple[Patch, ...]
    contacts: tuple[Conductance | Bond, ...]
    joined: np.ndarray


def put_together(case: Case, mesh: Mesh) -> Problem:
    """Raises Trouble of kind "case" for a tag that carries terms and has no faces."""
    volume = volumes(mesh)
    of_parts = np.bincount(mesh.cell_part, volume, len(case.parts))
    heat = np.array([part.heat for part in case.parts]) / of_parts + [part.heat_density for part in case.parts]
    met, covered = joints(case, mesh)
    joined = wholly_covered(mesh, covered)
    tags = [*enumerate(case.tags), (-1, case.untagged)]
    return Problem(
        case=case,
        mesh=mesh,
        volume=volume,
        heat_density=heat,
        patches=tuple(_patch(case, mesh, number, tag, covered, joined) for number, tag in tags),
        contacts=tuple(crossing(mesh, joint, case) for joint in met),
        joined=joined,
    )


def _patch(case: Case, mesh: Mesh, number: int, tag: Tag, covered: Covered, joined: np.ndarray) -> Patch:
    exposed = (mesh.boundary_tag == number) & ~joined
    facets = np.flatnonzero(exposed)
    points = face_points(mesh.nodes, mesh.boundary, facets, 2 * mesh.order)
    hidden = exposed[covered.facet]
    if hidden.any():
        # A face partly in contact: the integral over all of it, less that over the pieces in contact.
        pieces = piece_points(mesh, covered.facet[hidden], covered.corners[hidden], -covered.area[hidden])
        points = both(points, pieces)
    return Patch(tag.name, facets, points, _laws(case, mesh, tag, facets, points.area), tag.temperature)


def _laws(case: Case, mesh: Mesh, tag: Tag, facets: np.ndarray, area: float) -> dict[str, Law]:
    """The laws of a tag on its exposed boundary triangles ``facets``; a total heat spreads over their ``area`` (m2)."""
    laws: dict[str, Law] = {}
    if tag.heat and not area:
        raise Trouble(
            "case",
            f"The tag '{tag.name}' has a heat, and all its faces lie within contacts.",
            "Give the heat to the part, or tag faces that are exposed.",
        )
    source = tag.heat_flux + (tag.heat / area if tag.heat else 0.0)
    if source:
        laws[SOURCE] = Linear(source=source)
    if tag.convection and tag.convection.coefficient is not None:
        laws[CONVECTION] = Linear(coefficient=tag.convection.coefficient, ambient=tag.convection.ambient)
    elif tag.convection and len(facets):
        place = np.zeros(len(mesh.boundary), np.int64)
        place[facets] = np.arange(len(facets))
        laws[CONVECTION] = Correlated(film_law(tag.convection, faces(mesh.nodes, mesh.boundary[facets], case)), place)
    if tag.radiation and len(facets):
        laws[RADIATION] = Radiating(tag.radiation.emissivity, tag.radiation.ambient)
    return laws


def faces(nodes: np.ndarray, triangles: np.ndarray, case: Case) -> Faces:
    """What a correlation may know of triangles (K, 3 or 6) over nodes (N, 3) m."""
    corners = nodes[triangles[:, :3]]
    vectors = area_vectors(corners)
    areas = np.linalg.norm(vectors, axis=1)
    return Faces(corners, vectors / areas[:, None], areas, np.array(case.gravity))


def held_nodes(problem: Problem) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The nodes on faces of held temperature: (H,) numbers, (H,) K, and (H, T) each tag's share in them.

    Where held tags of different temperatures meet, the mean holds there.
    """
    mesh = problem.mesh
    shares = np.zeros((len(mesh.nodes), len(problem.patches)))
    for index, patch in enumerate(problem.patches):
        if patch.held is not None:
            shares[np.unique(mesh.boundary[patch.facets]), index] = 1.0
    nodes = np.flatnonzero(shares.any(axis=1))
    shares = shares[nodes] / shares[nodes].sum(axis=1, keepdims=True)
    held = np.array([patch.held or 0.0 for patch in problem.patches])
    return nodes, shares @ held, shares


def check_sheds_heat(problem: Problem) -> None:
    """Find each connected body to have a face that fixes its temperature.

    Raises Trouble of kind "adrift" that names the part otherwise.
    """
    mesh, body = problem.mesh, _bodies(problem)
    fixed = np.zeros(body.max() + 1, bool)
    for patch in problem.patches:
        if patch.held is not None or any(law.sheds for law in patch.laws.values()):
            fixed[body[mesh.boundary[patch.facets, 0]]] = True
    cold = np.flatnonzero(~fixed[body[mesh.cells[:, 0]]])
    if len(cold):
        raise adrift(problem.case.parts[mesh.cell_part[cold[0]]].name, mesh.nodes[mesh.cells[cold[0], 0]])


def _bodies(problem: Problem) -> np.ndarray:
    """(N,) the connected body of each corner node, parts in contact being one."""
    mesh = problem.mesh
    nodes, cells = len(mesh.nodes), len(mesh.cells)
    # Cells are vertices of the graph too, linked to their corners: its rows then need no sorting.
    starts = np.concatenate([np.zeros(nodes, np.int32), 4 * np.arange(cells + 1, dtype=np.int32)])
    corners = mesh.cells[:, :4].ravel()
    graph = csr_array((np.ones(len(corners)), corners, starts), shape=(nodes + cells, nodes + cells))
    for contact in problem.contacts:
        one, other = (mesh.boundary[side.points.facet, 0] for side in (contact.joint.first, contact.joint.second))
        graph = graph + coo_array((np.ones(len(one)), (one, other)), shape=graph.shape)
    _, body = connected_components(graph, directed=True, connection="weak")
    return body[:nodes]


def adrift(name: str, point: np.ndarray) -> Trouble:
    return Trouble(
        "adrift",
        f"Nothing carries heat away from '{name}', so its temperature is undetermined.",
        "Give some of its faces air (convection), radiation, or a held temperature.",
        points=[point.tolist()],
    )
