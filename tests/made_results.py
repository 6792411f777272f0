"""A made result to look at: blocks on a grid, with a temperature known everywhere. Invented, and no product."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import bpy
import numpy as np
from fluxface.solver.result import Field, write_result

# The faces of a grid cell as corner offsets, outward, and the direction each looks in.
SIDES = {
    (0, -1): ((0, 0, 0), (0, 0, 1), (0, 1, 1), (0, 1, 0)),
    (0, 1): ((1, 0, 0), (1, 1, 0), (1, 1, 1), (1, 0, 1)),
    (1, -1): ((0, 0, 0), (1, 0, 0), (1, 0, 1), (0, 0, 1)),
    (1, 1): ((0, 1, 0), (0, 1, 1), (1, 1, 1), (1, 1, 0)),
    (2, -1): ((0, 0, 0), (0, 1, 0), (1, 1, 0), (1, 0, 0)),
    (2, 1): ((0, 0, 1), (1, 0, 1), (1, 1, 1), (0, 1, 1)),
}


def grid_boundary(filled: np.ndarray, size: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The skin of the filled cells (I, J, K) of a grid, each of ``size`` (3,) m: nodes (N, 3), triangles (B, 6)."""
    padded = np.pad(filled, 1)
    cells = np.argwhere(filled)
    quads = []
    for (axis, way), corners in SIDES.items():
        beyond = cells + 1
        beyond[:, axis] += way
        quads.append(cells[~padded[tuple(beyond.T)], None, :] + np.array(corners))
    a, b, c, d = np.moveaxis(2 * np.concatenate(quads), 1, 0)
    corners = np.concatenate([np.stack([a, b, c], 1), np.stack([a, c, d], 1)])
    middles = (corners + np.roll(corners, -1, axis=1)) // 2
    half_steps, triangles = np.unique(np.concatenate([corners, middles], 1).reshape(-1, 3), axis=0, return_inverse=True)
    return half_steps * size / 2.0, triangles.reshape(-1, 6)


def finned_block() -> tuple[np.ndarray, np.ndarray]:
    """A plate of 120 x 80 mm with seven fins on it, and a notch in it."""
    filled = np.zeros((26, 16, 12), dtype=bool)
    filled[:, :, :3] = True
    filled[::4, :, 3:] = True
    filled[1::4, :, 3:] = True
    filled[11:15, 0:4, :3] = False
    return grid_boundary(filled, np.array([0.12 / 26, 0.005, 0.004]))


def write_made_result(
    folder: Path, parts: list[tuple[np.ndarray, np.ndarray]], temperature: Callable[..., Any]
) -> Field:
    """A result folder whose parts have the given nodes (m) and triangles, and ``temperature(x, y, z)`` in kelvin."""
    starts = np.cumsum([0] + [len(nodes) for nodes, _ in parts])
    nodes = np.concatenate([nodes for nodes, _ in parts])
    boundary = np.concatenate([faces + start for (_, faces), start in zip(parts, starts, strict=False)])
    part = np.repeat(np.arange(len(parts)), [len(faces) for _, faces in parts])
    none = np.full(len(boundary), -1)
    field = Field(
        nodes=nodes,
        cells=np.zeros((0, 10), dtype=np.int32),
        cell_part=np.zeros(0, dtype=np.int32),
        temperature=temperature(*nodes.T),
        boundary=boundary,
        boundary_tag=none,
        boundary_part=part,
        boundary_face=none,
        heat_flux=np.zeros_like(nodes),
        cell_heat_flux=np.zeros((0, 3)),
    )
    write_result({"format": "fluxface.result/1", "state": "solved"}, field, folder)
    return field


def warm_at_one_end(x: np.ndarray, y: np.ndarray, z: np.ndarray) -> np.ndarray:
    """From 303.15 K up to some 345 K under the near left corner of the plate."""
    return 303.15 + 42.0 * np.exp(-((x - 0.03) ** 2 + (y - 0.02) ** 2) / 0.05**2 - z / 0.05)


def stand_in(name: str, **placement: Any) -> bpy.types.Object:
    """A part in the scene, placed as told: one triangle, for a result does not ask what it lies on."""
    mesh = bpy.data.meshes.new(name)
    mesh.from_pydata([(0, 0, 0), (1, 0, 0), (0, 1, 0)], [], [(0, 1, 2)])
    part = bpy.data.objects.new(name, mesh)
    bpy.context.scene.collection.objects.link(part)
    for key, value in placement.items():
        setattr(part, key, value)
    return part
