"""The tetrahedral mesh: containers and the middle nodes of quadratic elements."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import reduce

import numpy as np
from scipy.sparse import csr_array

# Local edges, in the order of the mid-side nodes (cells: VTK's quadratic tetrahedron).
CELL_EDGES = np.array([(0, 1), (1, 2), (0, 2), (0, 3), (1, 3), (2, 3)])
FACE_EDGES = np.array([(0, 1), (1, 2), (2, 0)])
# Local faces, outward when the cell's volume is positive.
CELL_FACES = np.array([(1, 2, 3), (0, 3, 2), (0, 1, 3), (0, 2, 1)])


# Spread the bits of a number of 21 bits three places apart: shift by so many, keep these.
SPREADING = (
    (32, 0x001F00000000FFFF),
    (16, 0x001F0000FF0000FF),
    (8, 0x100F00F00F00F00F),
    (4, 0x10C30C30C30C30C3),
    (2, 0x1249249249249249),
)


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


def ordered(mesh: Mesh) -> Mesh:
    """The same 4-node tetrahedra, numbered so that what is near in space is near in memory.

    Nodes follow a space-filling curve, cells and boundary triangles the first of their nodes.
    Morton, A Computer Oriented Geodetic Data Base (IBM, 1966).
    """
    along = np.argsort(_morton_codes(mesh.nodes), kind="stable")
    number = np.empty(len(along), np.int32)
    number[along] = np.arange(len(along), dtype=np.int32)
    cells, boundary = number.take(mesh.cells), number.take(mesh.boundary)
    by_cell, by_face = (_counted(reduce(np.minimum, part.T), len(along)) for part in (cells, boundary))
    return Mesh(
        nodes=mesh.nodes.take(along, axis=0),
        cells=cells.take(by_cell, axis=0),
        cell_part=mesh.cell_part[by_cell],
        boundary=boundary.take(by_face, axis=0),
        boundary_tag=mesh.boundary_tag[by_face],
        boundary_part=mesh.boundary_part[by_face],
        boundary_face=mesh.boundary_face[by_face],
    )


def _morton_codes(points: np.ndarray) -> np.ndarray:
    """(N,) the bits of three coordinates of 21 bits each, interleaved."""
    low = points.min(axis=0)
    extent = float((points.max(axis=0) - low).max())
    steps = ((points - low) * ((2**21 - 1) / extent)).astype(np.uint64).T
    for shift, mask in SPREADING:
        steps = (steps | steps << np.uint64(shift)) & np.uint64(mask)
    return steps[0] | steps[1] << np.uint64(1) | steps[2] << np.uint64(2)


def quadratic(mesh: Mesh) -> Mesh:
    """The same tetrahedra with a node in the middle of each edge."""
    corners = len(mesh.nodes)
    of_cells, of_faces = mesh.cells[:, CELL_EDGES].reshape(-1, 2), mesh.boundary[:, FACE_EDGES].reshape(-1, 2)
    edges, number = numbered_edges(np.concatenate([of_cells, of_faces]), corners)
    number += np.int32(corners)
    in_cells, in_faces = np.split(number, [len(of_cells)])
    return replace(
        mesh,
        nodes=np.concatenate([mesh.nodes, 0.5 * (mesh.nodes[edges[0]] + mesh.nodes[edges[1]])]),
        cells=np.concatenate([mesh.cells, in_cells.reshape(-1, 6)], axis=1, dtype=np.int32),
        boundary=np.concatenate([mesh.boundary, in_faces.reshape(-1, 3)], axis=1, dtype=np.int32),
    )


def numbered_edges(ends: np.ndarray, size: int) -> tuple[np.ndarray, np.ndarray]:
    """The different edges (2, E) among pairs of nodes (K, 2) below ``size``, in rising order, and each pair's (K,)."""
    low, high = np.minimum(*ends.T), np.maximum(*ends.T)
    by_high = _counted(high, size)
    order = by_high.take(_counted(low.take(by_high), size))
    low, high = low.take(order), high.take(order)
    first = np.concatenate([[True], (low[1:] != low[:-1]) | (high[1:] != high[:-1])])
    number = np.empty(len(order), np.int32)
    number[order] = np.cumsum(first, dtype=np.int32) - np.int32(1)
    return np.stack([low[first], high[first]]), number


def _counted(keys: np.ndarray, size: int) -> np.ndarray:
    """(K,) the places of keys (K,) below ``size`` in rising order: a counting sort, as a sparse transposition is."""
    places = np.arange(len(keys) + 1, dtype=np.int32)
    return csr_array((places[:-1], keys, places), shape=(len(keys), size)).tocsc().data


def face_keys(faces: np.ndarray, nodes: int) -> np.ndarray:
    """(F,) one number for each triangle (F, 3) of node numbers below ``nodes``, whatever the order of its corners."""
    a, b, c = np.sort(faces, axis=1).astype(np.int64).T
    if nodes < 2_000_000:  # the cube of it fits in 63 bits
        return (a * nodes + b) * nodes + c
    _, pair = np.unique(a * nodes + b, return_inverse=True)
    return pair * np.int64(nodes) + c
