"""The tetrahedral mesh: containers and the middle nodes of quadratic elements."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

# Local edges, in the order of the mid-side nodes (cells: VTK's quadratic tetrahedron).
CELL_EDGES = np.array([(0, 1), (1, 2), (0, 2), (0, 3), (1, 3), (2, 3)])
FACE_EDGES = np.array([(0, 1), (1, 2), (2, 0)])
# Local faces, outward when the cell's volume is positive.
CELL_FACES = np.array([(1, 2, 3), (0, 3, 2), (0, 1, 3), (0, 2, 1)])


@dataclass(frozen=True)
class Mesh:
    """Straight-sided tetrahedra and the triangles that bound them, outward.

    nodes: (N, 3) m, the corners of cells before the mid-sides. cells: (M, 4 or 10). cell_part: (M,).
    boundary: (B, 3 or 6). boundary_tag (-1 = untagged), boundary_part, boundary_face: (B,).
    """

    nodes: np.ndarray
    cells: np.ndarray
    cell_part: np.ndarray
    boundary: np.ndarray
    boundary_tag: np.ndarray
    boundary_part: np.ndarray
    boundary_face: np.ndarray

    @property
    def order(self) -> int:
        return 1 if self.cells.shape[1] == 4 else 2


def joined(meshes: list[Mesh]) -> Mesh:
    """Several parts' meshes as one, their nodes kept apart."""
    offsets = np.cumsum([0] + [len(mesh.nodes) for mesh in meshes[:-1]])
    return Mesh(
        nodes=np.concatenate([mesh.nodes for mesh in meshes]),
        cells=np.concatenate([mesh.cells + offset for mesh, offset in zip(meshes, offsets, strict=True)]),
        cell_part=np.concatenate([mesh.cell_part for mesh in meshes]),
        boundary=np.concatenate([mesh.boundary + offset for mesh, offset in zip(meshes, offsets, strict=True)]),
        boundary_tag=np.concatenate([mesh.boundary_tag for mesh in meshes]),
        boundary_part=np.concatenate([mesh.boundary_part for mesh in meshes]),
        boundary_face=np.concatenate([mesh.boundary_face for mesh in meshes]),
    )


def quadratic(mesh: Mesh) -> Mesh:
    """The same tetrahedra with a node in the middle of each edge."""
    corners = len(mesh.nodes)
    ends = np.sort(mesh.cells[:, CELL_EDGES], axis=2).astype(np.int64)
    keys, of_cell = np.unique(ends[..., 0] * corners + ends[..., 1], return_inverse=True)
    sides = np.sort(mesh.boundary[:, FACE_EDGES], axis=2).astype(np.int64)
    of_face = np.searchsorted(keys, sides[..., 0] * corners + sides[..., 1])
    middles = mesh.nodes[np.stack(np.divmod(keys, corners), axis=1)].mean(axis=1)
    return replace(
        mesh,
        nodes=np.concatenate([mesh.nodes, middles]),
        cells=np.concatenate([mesh.cells, corners + of_cell.reshape(-1, 6)], axis=1).astype(np.int32),
        boundary=np.concatenate([mesh.boundary, corners + of_face], axis=1).astype(np.int32),
    )


def face_keys(faces: np.ndarray, nodes: int) -> np.ndarray:
    """(F,) one number for each triangle (F, 3) of node numbers below ``nodes``, whatever the order of its corners."""
    a, b, c = np.sort(faces, axis=1).astype(np.int64).T
    if nodes < 2_000_000:  # the cube of it fits in 63 bits
        return (a * nodes + b) * nodes + c
    _, pair = np.unique(a * nodes + b, return_inverse=True)
    return pair * np.int64(nodes) + c


def smallest_dihedral(mesh: Mesh) -> float:
    """Degrees: the smallest angle between two faces of any tetrahedron."""
    corners = mesh.nodes[mesh.cells[:, :4]]
    face = corners[:, CELL_FACES]
    normals = np.cross(face[:, :, 1] - face[:, :, 0], face[:, :, 2] - face[:, :, 0])
    normals /= np.linalg.norm(normals, axis=2, keepdims=True)
    cosines = np.einsum("mpi,mqi->mpq", normals, normals)[:, *np.triu_indices(4, 1)]
    return float(np.degrees(np.pi - np.arccos(np.clip(cosines.min(), -1.0, 1.0))))
