"""The result: what is said of a solved case, and the solved field; written whole or not at all."""

from __future__ import annotations

import json
import os
import shutil
import tempfile
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from .archives import read_arrays, shaped
from .errors import Trouble

FORMAT = "fluxface.result/1"
SUMMARY_FILE = "summary.json"
FIELD_FILE = "field.npz"
SKIN_FILE = "skin.npz"
RESPONSES_FILE = "responses.npz"

# A 6-node triangle (mid-sides 01 12 20) as four, so that a temperature quadratic over it is seen as such.
QUARTERS = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2], [3, 4, 5]])

# summary.json, as the contract lists it; kept as plain JSON so that a newer summary still reads.
Summary = dict[str, Any]


@dataclass(frozen=True)
class Field:
    """The solved field on its mesh, as ``field.npz`` holds it.

    nodes: (N, 3) m. cells: (M, 4 or 10), mid-edge nodes in the order 01 12 02 03 13 23. cell_part: (M,).
    temperature: (N,) K. boundary: (B, 3 or 6), outward, mid-sides 01 12 20. boundary_tag, boundary_part,
    boundary_face: (B,), tag -1 = untagged. heat_flux: (N, 3), cell_heat_flux: (M, 3) W/m2.
    """

    nodes: np.ndarray
    cells: np.ndarray
    cell_part: np.ndarray
    temperature: np.ndarray
    boundary: np.ndarray
    boundary_tag: np.ndarray
    boundary_part: np.ndarray
    boundary_face: np.ndarray
    heat_flux: np.ndarray
    cell_heat_flux: np.ndarray


@dataclass(frozen=True)
class HotSkin:
    """What is seen of a field: the surfaces of all parts in plain triangles, small enough to be kept of every run.

    places: (P, 3) m. triangles: (T, 3), outward. part: (T,). temperature: (P,) K, linear over each triangle.
    """

    places: np.ndarray
    triangles: np.ndarray
    part: np.ndarray
    temperature: np.ndarray


def hot_skin(field: Field) -> HotSkin:
    """The boundary of a field; a place where two parts meet is there once for each of them."""
    nodes, triangles, part = skin_nodes(field)
    return HotSkin(field.nodes[nodes], triangles, part, field.temperature[nodes])


def skin_nodes(field: Field) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The places of the hot skin by their nodes (P,), its triangles (T, 3), and the part of each (T,)."""
    faces, part = field.boundary, field.boundary_part
    if faces.shape[1] == 6:
        faces, part = faces[:, QUARTERS].reshape(-1, 3), np.repeat(part, 4)
    corners = np.stack([np.broadcast_to(part[:, None], faces.shape), faces], axis=-1).reshape(-1, 2)
    keys, triangles = np.unique(corners @ (len(field.nodes), 1), return_inverse=True)
    return keys % len(field.nodes), triangles.reshape(-1, 3), part


def write_skin(skin: HotSkin, folder: Path) -> None:
    np.savez_compressed(folder / SKIN_FILE, **vars(skin))


def read_skin(folder: Path) -> HotSkin:
    """Raises Trouble of kind "case" when there is no sound skin in ``folder``."""
    skin = HotSkin(**read_arrays(folder / SKIN_FILE, HotSkin.__dataclass_fields__))
    points = _sound(folder / SKIN_FILE, skin.places, (None, 3), "f")
    triangles = _sound(folder / SKIN_FILE, skin.triangles, (None, 3), "iu", points)
    _sound(folder / SKIN_FILE, skin.part, (triangles,), "iu")
    _sound(folder / SKIN_FILE, skin.temperature, (points,), "f")
    return skin


@dataclass(frozen=True)
class Responses:
    """How a linear steady case answers to each of its L loads: temperatures and heats are sums of value times response.

    loads: the bytes of a JSON list of {"owner": "tag" | "part" | "untagged", "name", "key"}. values: (L,), as solved.
    temperature: (L, N) at the nodes. tag_mean, tag_heat: (L, K), of the summary's tags. part_mean, part_heat: (L, P).
    Units are those of the result, over those of the load.
    """

    loads: np.ndarray
    values: np.ndarray
    temperature: np.ndarray
    tag_mean: np.ndarray
    tag_heat: np.ndarray
    part_mean: np.ndarray
    part_heat: np.ndarray


def write_responses(responses: Responses, folder: Path) -> None:
    """Raises OSError when the place cannot be written; nothing is left behind then."""
    beside = folder / f".{RESPONSES_FILE}"
    try:
        np.savez(beside, **vars(responses))
        os.replace(beside, folder / RESPONSES_FILE)
    finally:
        beside.unlink(missing_ok=True)


def read_responses(folder: Path) -> Responses:
    """Raises Trouble of kind "case" when there are no sound responses in ``folder``."""
    return Responses(**read_arrays(folder / RESPONSES_FILE, Responses.__dataclass_fields__))


def write_result(summary: Summary, field: Field, folder: Path) -> None:
    """Write the result folder beside its place and rename it there, replacing an older result.

    Raises OSError when the place cannot be written; nothing is left behind then.
    """
    folder.parent.mkdir(parents=True, exist_ok=True)
    beside = Path(tempfile.mkdtemp(prefix=f".{folder.name}-", dir=folder.parent))
    try:
        fresh, stale = beside / "fresh", beside / "stale"
        fresh.mkdir()
        np.savez(fresh / FIELD_FILE, **vars(field))
        (fresh / SUMMARY_FILE).write_text(json.dumps(summary, indent=1), "utf-8")
        if folder.exists():
            os.replace(folder, stale)
        os.replace(fresh, folder)
    finally:
        shutil.rmtree(beside, ignore_errors=True)


def read_summary(folder: Path) -> Summary:
    """Raises Trouble of kind "case" when there is no sound summary of this version in ``folder``."""
    try:
        summary = json.loads((folder / SUMMARY_FILE).read_text("utf-8"))
    except (OSError, ValueError, RecursionError) as error:
        raise Trouble("case", f"There is no readable result in {folder}.", "Run again.") from error
    if not isinstance(summary, dict) or summary.get("format") != FORMAT:
        raise Trouble("case", f"The result in {folder} is not of the format '{FORMAT}'.", "Run again.")
    return summary


def read_field(folder: Path) -> Field:
    """Raises Trouble of kind "case" when there is no sound field in ``folder``."""
    path = folder / FIELD_FILE
    field = Field(**read_arrays(path, Field.__dataclass_fields__))
    nodes = _sound(path, field.nodes, (None, 3), "f")
    order = 2 if field.cells.shape[1:] == (10,) else 1
    cells = _sound(path, field.cells, (None, {1: 4, 2: 10}[order]), "iu", nodes)
    faces = _sound(path, field.boundary, (None, {1: 3, 2: 6}[order]), "iu", nodes)
    _sound(path, field.cell_part, (cells,), "iu")
    _sound(path, field.temperature, (nodes,), "f")
    for numbers in (field.boundary_tag, field.boundary_part, field.boundary_face):
        _sound(path, numbers, (faces,), "iu")
    _sound(path, field.heat_flux, (nodes, 3), "f")
    _sound(path, field.cell_heat_flux, (cells, 3), "f")
    return field


def _sound(path: Path, array: np.ndarray, shape: tuple[int | None, ...], kinds: str, below: int | None = None) -> int:
    """The length of an array that is found to have that shape and kind, finite, and with numbers of 0..``below``."""
    fits = shaped(array, shape, kinds) and np.isfinite(array).all()
    if not fits or (below is not None and array.size and (array.min() < 0 or array.max() >= below)):
        raise Trouble("case", f"{path.name} in {path.parent} does not hold a result.", "Run again.")
    return len(array)
