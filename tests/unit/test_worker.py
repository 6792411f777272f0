"""The worker answers as ``fluxface solve`` does, and what it kept changes no number."""

from __future__ import annotations

import json
import signal
import subprocess
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from cases import case_of, metal
from fluxface.solver import pipeline
from fluxface.solver.case import Case, Convection, Radiation, Tag, write_case
from fluxface.solver.keeping import Kept
from fluxface.solver.result import read_summary
from fluxface.solver.worker import answer
from shapes import box, facing, moved, tagged

AIR = Convection(ambient=298.0, coefficient=9.0)


def lamp(width: float = 0.05) -> Case:
    """A block with 3 W under it and air above: an invented one, of enough nodes for a hierarchy."""
    surface = tagged(tagged(box((0.08, width, 0.02)), 0, facing("-z")), 1, facing("+z"))
    return case_of(surface, [Tag("pad", heat=3.0), Tag("top", convection=AIR)], size=0.006)


def with_tags(case: Case, *tags: Tag) -> Case:
    return replace(case, tags=tags)


ALL = ["mesh", "matrix", "solver"]
CHANGES: dict[str, tuple[Callable[[Case], Case], list[str]]] = {
    "nothing": (lambda case: case, ALL),
    "watts": (
        lambda case: with_tags(case, replace(case.tags[0], heat=5.0), case.tags[1]),
        ALL,
    ),
    "ambient": (
        lambda case: with_tags(case, case.tags[0], Tag("top", convection=replace(AIR, ambient=310.0))),
        ALL,
    ),
    "film": (
        lambda case: with_tags(case, case.tags[0], Tag("top", convection=replace(AIR, coefficient=20.0))),
        ["mesh", "conduction"],
    ),
    "radiation": (
        lambda case: with_tags(case, case.tags[0], replace(case.tags[1], radiation=Radiation(0.9, 298.0))),
        ["mesh", "matrix"],
    ),
    "material": (
        lambda case: replace(case, parts=(replace(case.parts[0], material=metal(20.0)),)),
        ["mesh"],
    ),
    "heat in the volume": (
        lambda case: replace(case, parts=(replace(case.parts[0], heat=1.0),)),
        ALL,
    ),
    "held": (lambda case: with_tags(case, Tag("pad", temperature=350.0), case.tags[1]), ["mesh", "matrix"]),
    "shape": (lambda case: lamp(0.06), []),
    "place": (lambda case: replace(case, surface=moved(case.surface, shift=(1.0, 0.0, 0.0))), []),
    "order": (lambda case: replace(case, accuracy=replace(case.accuracy, order=1)), []),
}


@pytest.mark.parametrize("change", CHANGES)
def test_what_was_kept_changes_no_number(change: str) -> None:
    make, expected = CHANGES[change]
    kept = Kept()
    pipeline.solve(lamp(), kept=kept)
    again, cold = pipeline.solve(make(lamp()), kept=kept), pipeline.solve(make(lamp()))
    assert again.summary["reused"] == expected
    assert cold.summary["reused"] == []
    assert again.field.temperature == pytest.approx(cold.field.temperature, rel=1e-10)
    for one, other in zip(again.summary["tags"], cold.summary["tags"], strict=True):
        assert one["heat"] == pytest.approx(other["heat"], rel=1e-10, abs=1e-10)


def test_going_back_and_forth_gives_the_first_numbers_again() -> None:
    kept = Kept()
    first = pipeline.solve(lamp(), kept=kept)
    pipeline.solve(lamp(0.06), kept=kept)
    assert np.array_equal(pipeline.solve(lamp(), kept=kept).field.temperature, first.field.temperature)


def request(case: Case, folder: Path, number: int = 1) -> str:
    write_case(case, folder)
    return json.dumps({"id": number, "do": "solve", "case": str(folder), "out": str(folder / "result")})


def test_troubles_are_answered_and_end_nothing(tmp_path: Path, capsys: pytest.CaptureFixture) -> None:
    kept = Kept()
    for line in ("", "{", "[]", "7", '{"id": 4}', '{"id": 4, "do": "dance", "case": "a", "out": "b"}'):
        assert answer(line, kept)["code"] == 2
    missing = answer(json.dumps({"id": 5, "do": "solve", "case": str(tmp_path / "no"), "out": "x"}), kept)
    assert (missing["id"], missing["code"]) == (5, 2)
    adrift = with_tags(lamp(), Tag("pad", heat=3.0), Tag("top"))
    assert answer(request(adrift, tmp_path / "adrift"), kept)["trouble"]["kind"] == "adrift"
    (tmp_path / "file").write_text("")
    line = json.loads(request(lamp(), tmp_path / "lamp"))
    unwritten = answer(json.dumps({**line, "out": str(tmp_path / "file" / "result")}), kept)
    assert "cannot be written" in unwritten["trouble"]["message"]
    assert answer(request(lamp(), tmp_path / "lamp"), kept) == {"id": 1, "code": 0}
    assert read_summary(tmp_path / "lamp" / "result")["state"] == "solved"
    capsys.readouterr()


def worker() -> subprocess.Popen:
    return subprocess.Popen(
        [sys.executable, "-m", "fluxface.solver", "work"],
        stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, start_new_session=True,
    )  # fmt: skip


def answered(process: subprocess.Popen, line: str) -> list[dict]:
    """All that the worker says to a request."""
    process.stdin.write(line + "\n")
    process.stdin.flush()
    said = []
    while not said or "code" not in said[-1]:
        said.append(json.loads(process.stdout.readline()))
    return said


def test_a_worker_stays_from_one_request_to_the_next_and_ends_with_its_stdin(tmp_path: Path) -> None:
    with worker() as process:
        said = answered(process, request(lamp(), tmp_path / "one", 7))
        assert said[-1] == {"id": 7, "code": 0}
        assert {line["stage"] for line in said[:-1]} >= {"mesh", "assemble", "solve", "write"}
        answered(process, request(lamp(), tmp_path / "two", 8))
        assert "mesh" in read_summary(tmp_path / "two" / "result")["reused"]
        process.stdin.close()
        assert process.wait(10) in (0, -signal.SIGKILL)
