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

from .case import read_arrays
from .errors import Trouble

FORMAT = "fluxface.result/1"
SUMMARY_FILE = "summary.json"
FIELD_FILE = "field.npz"

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
    except (OSError, ValueError) as error:
        raise Trouble("case", f"There is no readable result in {folder}.", "Run again.") from error
    if not isinstance(summary, dict) or summary.get("format") != FORMAT:
        raise Trouble("case", f"The result in {folder} is not of the format '{FORMAT}'.", "Run again.")
    return summary


def read_field(folder: Path) -> Field:
    """Raises Trouble of kind "case" when there is no sound field in ``folder``."""
    return Field(**read_arrays(folder / FIELD_FILE, Field.__dataclass_fields__))
