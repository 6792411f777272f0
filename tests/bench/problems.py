"""The problems that every library is given: a solid block and a sink of thin fins, meshed to a wanted count of cells.

Invented parts of aluminium: one watt per square centimetre comes in below, air takes it from all other faces.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import shapes
from fluxface.solver.case import Accuracy, Convection, Surface, Tag
from fluxface.solver.fem.mesh import Mesh
from fluxface.solver.geometry.sizing import MEAN_CELL, REGULAR
from fluxface.solver.geometry.surface import enclosed_volume, triangle_corners, weld
from fluxface.solver.geometry.tetrahedra import fill

CONDUCTIVITY, FLUX, FILM, AMBIENT = 160.0, 1e4, 12.0, 298.15  # W/(m K), W/m2, W/(m2 K), K
HEATED, COOLED = 0, 1
TAGS = [Tag("heated", heat_flux=FLUX), Tag("in air", convection=Convection(AMBIENT, FILM))]
MOST_NODES = 20_000_000
ATTEMPTS, CLOSE = 5, 0.1


def block() -> Surface:
    """60 x 50 x 40 mm, heated on a quarter of its lower face."""
    grid = np.array([0, 0.5, 1.0])
    return _tagged(shapes.blocks(0.06 * grid, 0.05 * grid, np.array([0, 0.04])), (0.03, 0.025))


def sink() -> Surface:
    """A base of 100 x 60 x 4 mm with 20 fins of 0.8 mm, 35 mm high, heated on a quarter of its lower face."""
    fins, thick, wide = 20, 0.8e-3, 0.1
    starts = np.linspace(0.0, wide - thick, fins)
    x = np.unique(np.concatenate([starts, starts + thick, [0.5 * wide]]))
    middles = 0.5 * (x[1:] + x[:-1])
    is_fin = (np.abs(middles[:, None] - starts - 0.5 * thick) < 0.5 * thick).any(axis=1)
    filled = np.ones((len(middles), 2, 2), bool)
    filled[~is_fin, :, 1] = False
    return _tagged(shapes.blocks(x, np.array([0, 0.03, 0.06]), np.array([0, 4e-3, 39e-3]), filled), (0.5 * wide, 0.03))


def _tagged(surface: Surface, corner: tuple[float, float]) -> Surface:
    cooled = shapes.tagged(surface, COOLED, shapes.every)
    below, inside = shapes.facing("-z"), shapes.within((0, 0, -1), (*corner, 1))
    return shapes.tagged(cooled, HEATED, lambda centres, normals: below(centres, normals) & inside(centres, normals))


SHAPES: dict[str, Callable[[], Surface]] = {"block": block, "sink": sink}


def size_for(surface: Surface, cells: int) -> float:
    """m: the mean edge at which a compact body takes so many."""
    return float(np.cbrt(enclosed_volume(triangle_corners(surface)) / (MEAN_CELL * REGULAR * cells)))


def meshed(surface: Surface, cells: int) -> Mesh:
    """Linear tetrahedra, as the mesher leaves them, ``cells`` of them within a tenth or as near as ATTEMPTS come."""
    size = size_for(surface, cells)
    for _ in range(ATTEMPTS):
        mesh = fill(weld(surface), "part", 0, Accuracy(1, size, max_nodes=MOST_NODES))
        if abs(len(mesh.cells) / cells - 1.0) < CLOSE:
            break
        # Between the cube law of a compact body and the square law of thin walls.
        size *= (len(mesh.cells) / cells) ** 0.4
    return mesh


def fitted(surface: Surface, cells: int) -> Mesh:
    """About so many, in one attempt."""
    return fill(weld(surface), "part", 0, Accuracy(1, size_for(surface, cells), max_nodes=MOST_NODES))


def write(mesh: Mesh, order: int, path: Path) -> None:
    """As an .npz that every library's process reads."""
    np.savez(path, order=order, **vars(mesh))


def read(path: Path) -> tuple[Mesh, int]:
    """The mesh, and the order its elements shall have."""
    with np.load(path) as arrays:
        order = int(arrays["order"])
        return Mesh(**{name: arrays[name] for name in arrays.files if name != "order"}), order
