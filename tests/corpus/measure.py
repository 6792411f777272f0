"""How the solver fares on a folder of surfaces: ``python tests/corpus/measure.py FOLDER [NAME ...] [--jobs N]``.

FOLDER holds ``manifest.json`` and the surfaces it lists, as .npz (vertices, triangles) or in any format that trimesh
reads. Each becomes a case, every smooth patch of it a tag, which ``fluxface solve`` solves at order 1. A silent error
is a solved case with a wrong volume, or with a tag of wrong area that no warning names.
"""

from __future__ import annotations

import argparse
import json
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from fluxface.solver.case import Accuracy, Case, Convection, Part, Surface, Tag, write_case
from fluxface.solver.geometry.edges import edges_of, groups, neighbours
from fluxface.solver.geometry.surface import area_vectors, areas, diagonal, triangle_corners, weld
from fluxface.solver.materials import Material
from fluxface.solver.result import read_summary

DIAGONAL = 0.1  # m that each surface is scaled to: the size of a product, whatever the file's unit
SMOOTH = np.cos(np.radians(30))  # faces that meet at less are one patch
SAME_VOLUME = 0.01
SAME_AREA, SAME_AREA_MENDED = 0.02, 0.06
SECONDS = 300


@dataclass(frozen=True)
class Outcome:
    """What came of one surface. state: "solved", "mended", or the kind of the trouble; errors are shares.

    area_error: the largest among the tags that no warning names; named: how many are named by one.
    """

    name: str
    expected: str
    state: str
    seconds: float
    volume_error: float
    volume_tolerance: float
    area_error: float
    named: int
    said: str

    @property
    def solved(self) -> bool:
        return self.state in ("solved", "mended")

    @property
    def silently_wrong(self) -> bool:
        if not self.solved:
            return False
        same_area = SAME_AREA if self.expected == "clean" else SAME_AREA_MENDED
        return self.volume_error > self.volume_tolerance or self.area_error > same_area

    @property
    def located(self) -> bool:
        """Whether it is solved, or refused for its geometry with a place."""
        return self.solved or (self.state == "geometry" and not self.said.startswith("nowhere"))


def read_manifest(folder: Path) -> list[dict[str, Any]]:
    return json.loads((folder / "manifest.json").read_text())["files"]


def read_surface(path: Path) -> tuple[np.ndarray, np.ndarray]:
    """Vertices (V, 3) and triangles (F, 3)."""
    if path.suffix == ".npz":
        with np.load(path) as arrays:
            return arrays["vertices"].astype(np.float64), arrays["triangles"].astype(np.int32)
    import trimesh

    mesh = trimesh.load_mesh(path, process=False)
    return np.array(mesh.vertices, np.float64), np.array(mesh.faces, np.int32)


def in_patches(vertices: np.ndarray, triangles: np.ndarray) -> Surface:
    """The surface, each patch of faces that meet at less than 30 degrees a tag of its own."""
    count = len(triangles)
    blank = np.zeros(count, np.int32)
    surface = weld(Surface(vertices, triangles, blank, blank, np.arange(count, dtype=np.int32)))
    vectors = area_vectors(triangle_corners(surface))
    normal = vectors / np.maximum(np.linalg.norm(vectors, axis=1, keepdims=True), np.finfo(float).tiny)
    one, other, _ = (sides // 3 for sides in neighbours(edges_of(surface.triangles)))
    smooth = np.einsum("ni,ni->n", normal[one], normal[other]) > SMOOTH
    patch = groups(one[smooth], other[smooth], len(surface.triangles))
    return Surface(surface.vertices, surface.triangles, surface.part, patch.astype(np.int32), surface.face)


def case_of(vertices: np.ndarray, triangles: np.ndarray) -> Case:
    scale = DIAGONAL / diagonal(vertices)
    surface = in_patches(vertices * scale, triangles)
    tags = [Tag(f"patch {i}", convection=Convection(298.15, 10.0)) for i in range(int(surface.tag.max()) + 1)]
    part = Part("part", Material("invented metal", (50.0,), density=2000.0, heat_capacity=500.0), heat=1.0)
    return Case(surface, (part,), tuple(tags), accuracy=Accuracy(1, None))


def measured(folder: Path, entry: dict[str, Any]) -> Outcome:
    """Solve one surface of the manifest; where that says that mending it when asked would do, mend and solve it."""
    vertices, triangles = read_surface(folder / entry["file"])
    case = case_of(vertices, triangles)
    with tempfile.TemporaryDirectory() as place:
        given, other, result = Path(place, "given"), Path(place, "mended"), Path(place, "result")
        write_case(case, given)
        began = time.perf_counter()
        try:
            done = _run("solve", given, "--out", result, "--progress", "none")
            if "have the mesh mended" in done.stderr:
                asked = _run("mend", given, "--out", other, "--json")
                if not asked.returncode:
                    done = _run("solve", other, "--out", result, "--progress", "none")
        except subprocess.TimeoutExpired:
            return Outcome(entry["file"], entry["expected_class"], "hangs", SECONDS, *[0.0] * 3, 0, "")
        seconds = time.perf_counter() - began
        if done.returncode:
            return _refused(entry, seconds, done.stderr)
        summary = read_summary(result)
        if other.exists():  # what was said when it was mended counts with what is said now
            summary["mending"] += ["(when asked)", *json.loads(asked.stdout)["parts"][0]["mending"]]
            summary["warnings"] += json.loads(asked.stdout)["warnings"]
        return _solved(entry, seconds, case, DIAGONAL / diagonal(vertices), summary)


def _run(*arguments: object) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "fluxface.solver", *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, timeout=SECONDS)


def _refused(entry: dict[str, Any], seconds: float, stderr: str) -> Outcome:
    try:
        trouble = json.loads(stderr.splitlines()[-1])
    except (IndexError, ValueError):
        trouble = {"kind": "crashed", "message": stderr[-200:], "where": {"points": []}}
    place = "" if trouble["where"]["points"] else "nowhere: "
    return Outcome(
        entry["file"], entry["expected_class"], trouble["kind"], seconds, *[0.0] * 3, 0, place + trouble["message"]
    )


def _solved(entry: dict[str, Any], seconds: float, case: Case, scale: float, summary: Any) -> Outcome:
    wanted = np.bincount(case.surface.tag, areas(triangle_corners(case.surface)), len(case.tags))
    found = np.array([tag["area"] for tag in summary["tags"][: len(case.tags)]])
    warnings = " ".join(summary["warnings"])
    named = np.array([f"'{tag.name}'" in warnings for tag in case.tags])
    error = np.abs(found - wanted) / np.maximum(wanted, np.finfo(float).tiny)
    volume = entry["volume"] * scale**3
    return Outcome(
        entry["file"],
        entry["expected_class"],
        "mended" if summary["mending"] else "solved",
        seconds,
        0.0 if entry["volume_undefined"] else abs(summary["parts"][0]["volume"] / volume - 1),
        max(SAME_VOLUME, entry["volume_rel_tol"]),
        float(error[~named].max(initial=0.0)),
        int(named.sum()),
        " ".join(summary["mending"]),
    )


def table(outcomes: Sequence[Outcome]) -> Iterator[str]:
    yield f"{'surface':26} {'class':10} {'state':9} {'s':>6} {'volume':>8} {'areas':>8} {'named':>5}  said"
    for one in outcomes:
        wrong = "  SILENTLY WRONG" if one.silently_wrong else ""
        shown = f"{one.volume_error:8.2%} {one.area_error:8.2%} {one.named:5}" if one.solved else " " * 23
        yield f"{one.name:26} {one.expected:10} {one.state:9} {one.seconds:6.1f} {shown}  {one.said[:160]}{wrong}"
    for expected in sorted({one.expected for one in outcomes}):
        some = [one for one in outcomes if one.expected == expected]
        solved = [one for one in some if one.solved]
        quick = sum(one.seconds <= 5 for one in solved)
        middle = float(np.median([one.seconds for one in some]))
        yield (
            f"{expected}: {len(solved)} of {len(some)} solved, {quick} within 5 s, median {middle:.1f} s, "
            f"{sum(one.silently_wrong for one in some)} silently wrong, "
            f"{sum(not one.located for one in some)} refused without a place"
        )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("folder", type=Path, metavar="FOLDER")
    parser.add_argument("names", nargs="*", metavar="NAME", help="only surfaces whose file name contains one of these")
    parser.add_argument("--jobs", type=int, default=1, help="how many at a time (default: 1)")
    options = parser.parse_args()
    entries = [
        entry
        for entry in read_manifest(options.folder)
        if not options.names or any(name in entry["file"] for name in options.names)
    ]
    entries.sort(key=lambda entry: entry["file"])
    with ThreadPoolExecutor(options.jobs) as pool:
        outcomes = list(pool.map(lambda entry: measured(options.folder, entry), entries))
    print("\n".join(table(outcomes)))


if __name__ == "__main__":
    main()
