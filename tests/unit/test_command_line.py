"""The command line: exit codes, what is said on failure, progress, and a result folder that is whole or not there.

Exit codes and keys are this project's own contract: 2 case, 3 geometry, 4 adrift, 6 limits.
"""

from __future__ import annotations

import json
import subprocess
import sys
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from cases import Ran, case_of, metal, run
from fluxface.solver.case import Accuracy, Case, Convection, Surface, Tag, write_case
from fluxface.solver.command_line import main
from fluxface.solver.errors import EXIT_CODES
from fluxface.solver.result import read_field, read_summary
from shapes import assembly, box, centres_and_normals, facing, inside_out, merged, moved, tagged

SIZE = (0.03, 0.02, 0.01)
PAD, AIR = Tag("pad", heat=5.0), Tag("air", convection=Convection(298.15, 40.0))
STAGES = ["mesh", "assemble", "solve", "write"]


def block() -> Surface:
    """A box with tag 0 on its head and tag 1 on its foot."""
    return tagged(tagged(box(SIZE), 0, facing("+z")), 1, facing("-z"))


def block_case(surface: Surface | None = None, **others: Any) -> Case:
    return case_of(block() if surface is None else surface, [PAD, AIR], **{"size": 0.01, **others})


def without(surface: Surface, gone: np.ndarray) -> Surface:
    kept = {name: array[~gone] for name, array in vars(surface).items() if name != "vertices"}
    return Surface(surface.vertices, **kept)


def corners(surface: Surface, face: int) -> np.ndarray:
    """The vertices of a face."""
    return np.unique(surface.triangles[surface.face == face])


def outcome(arguments: list[object], capsys: pytest.CaptureFixture[str]) -> Ran:
    """A run in this process, which is quick."""
    code = main([str(argument) for argument in arguments])
    streams = capsys.readouterr()
    return Ran(code, streams.out, streams.err)


def refusal(case: Case, folder: Path, capsys: pytest.CaptureFixture[str], kind: str) -> dict[str, Any]:
    """What both commands say of a case that must be refused: a kind, a sentence, a place, and what to do."""
    write_case(case, folder)
    solved = outcome(["solve", folder, "--progress", "none"], capsys)
    assert solved.code == EXIT_CODES[kind] and solved.out == ""
    trouble = solved.trouble
    assert set(trouble) == {"kind", "message", "where", "mend"} and set(trouble["where"]) == {"faces", "points"}
    assert trouble["kind"] == kind
    assert trouble["message"].endswith(".") and trouble["mend"].endswith(".")
    assert not (folder / "result").exists()
    return trouble


# A sound case ---------------------------------------------------------------------------------------------------------


def test_result_folder_of_a_sound_case(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_case(block_case(), tmp_path)
    assert outcome(["solve", tmp_path, "--progress", "none"], capsys) == Ran(0, "", "")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["case.json", "result", "surface.npz"]
    assert {"field.npz", "summary.json"} <= {path.name for path in (tmp_path / "result").iterdir()}
    summary, field = read_summary(tmp_path / "result"), read_field(tmp_path / "result")
    assert summary["format"] == "fluxface.result/1" and summary["state"] == "solved"
    assert [tag["name"] for tag in summary["tags"]] == ["pad", "air", "untagged"]
    assert set(summary["seconds"]) >= {"mesh", "assemble", "solve", "total"}
    assert summary["mesh"]["nodes"] == len(field.nodes) == len(field.temperature)
    assert summary["mesh"]["cells"] == len(field.cells) and field.cells.shape[1] == 10
    assert field.boundary.shape[1] == 6 and len(field.boundary) == len(field.boundary_tag)
    assert summary["hottest"]["temperature"] == field.temperature.max()
    at = np.linalg.norm(field.nodes - summary["hottest"]["at"], axis=1).argmin()
    assert field.temperature[at] == summary["hottest"]["temperature"]
    assert summary["parts"][0]["volume"] == pytest.approx(6e-6, rel=1e-9)
    assert summary["parts"][0]["mass"] == pytest.approx(2000.0 * 6e-6, rel=1e-9)
    assert 0 < summary["mesh"]["smallest_dihedral_degrees"] < 70.6


def test_summary_is_strict_json(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """No NaN and no Infinity, which other readers refuse."""
    write_case(block_case(), tmp_path)
    outcome(["solve", tmp_path], capsys)

    def refuse(constant: str) -> None:
        pytest.fail(f"{constant} in the summary")

    json.loads((tmp_path / "result" / "summary.json").read_text("utf-8"), parse_constant=refuse)


def test_result_goes_where_it_is_told_and_replaces_an_older_one(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "deep" / "there"
    write_case(block_case(), tmp_path / "case")
    outcome(["solve", tmp_path / "case", "--out", out, "--progress", "none"], capsys)
    first = read_summary(out)["hottest"]["temperature"]
    (out / "stray").write_text("of an older result")
    hotter = replace(block_case(), tags=(replace(PAD, heat=10.0), AIR))
    write_case(hotter, tmp_path / "case")
    outcome(["solve", tmp_path / "case", "--out", out, "--progress", "none"], capsys)
    assert read_summary(out)["hottest"]["temperature"] - 298.15 == pytest.approx(2 * (first - 298.15), rel=1e-9)
    assert not (out / "stray").exists()
    assert [path.name for path in out.parent.iterdir()] == ["there"]
    assert not (tmp_path / "case" / "result").exists()


def test_a_failed_run_leaves_the_older_result(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_case(block_case(), tmp_path)
    outcome(["solve", tmp_path], capsys)
    before = (tmp_path / "result" / "summary.json").read_bytes()
    write_case(replace(block_case(), tags=(PAD, Tag("air"))), tmp_path)
    assert outcome(["solve", tmp_path], capsys).code == 4
    assert (tmp_path / "result" / "summary.json").read_bytes() == before


def test_a_place_that_cannot_be_written(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A file where a folder would have to be."""
    write_case(block_case(), tmp_path / "case")
    (tmp_path / "taken").write_text("a file")
    ran = outcome(["solve", tmp_path / "case", "--out", tmp_path / "taken" / "out", "--progress", "none"], capsys)
    assert ran.code == 6 and ran.trouble["kind"] == "limits" and "taken" in ran.trouble["message"]
    assert (tmp_path / "taken").read_text() == "a file"


def test_progress_as_json_is_one_object_a_line_and_nothing_else(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    write_case(block_case(), tmp_path)
    ran = outcome(["solve", tmp_path, "--progress", "json"], capsys)
    steps = [json.loads(line) for line in ran.out.splitlines()]
    assert all(set(step) == {"stage", "fraction", "text"} for step in steps)
    assert all(0.0 <= step["fraction"] <= 1.0 and isinstance(step["text"], str) for step in steps)
    stages = [step["stage"] for step in steps]
    assert list(dict.fromkeys(stages)) == STAGES
    assert stages == sorted(stages, key=STAGES.index)
    assert steps[-1]["stage"] == "write" and steps[-1]["fraction"] == 1.0


def test_progress_as_a_bar_ends_with_the_result_in_words(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_case(block_case(), tmp_path)
    out = outcome(["solve", tmp_path], capsys).out
    summary = read_summary(tmp_path / "result")
    assert all(stage in out for stage in STAGES)
    assert f"{summary['hottest']['temperature'] - 273.15:.2f} °C" in out
    assert all(tag["name"] in out for tag in summary["tags"])
    assert "5.0000 W" in out


def test_inside_out_cavity_is_a_cavity(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A shell that looks inwards within another is no fault: it is how a cavity is modelled."""
    cavity = inside_out(box((0.01, 0.01, 0.004), at=(0.01, 0.005, 0.003)))
    write_case(block_case(merged(block(), cavity)), tmp_path)
    assert outcome(["solve", tmp_path, "--progress", "none"], capsys).code == 0
    summary = read_summary(tmp_path / "result")
    assert summary["parts"][0]["volume"] == pytest.approx(6e-6 - 4e-7, rel=1e-9)
    assert summary["tags"][2]["area"] == pytest.approx(1e-3 + 3.6e-4, rel=1e-9)


# ``fluxface check`` ---------------------------------------------------------------------------------------------------


def test_check_tells_the_measures_as_json(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_case(block_case(), tmp_path)
    ran = outcome(["check", tmp_path, "--json"], capsys)
    assert ran.code == 0 and ran.err == ""
    told = json.loads(ran.out)
    assert told["state"] == "sound"
    (part,) = told["parts"]
    assert part["name"] == "part 0"
    assert part["volume"] == pytest.approx(6e-6, rel=1e-12) and part["area"] == pytest.approx(2.2e-3, rel=1e-12)
    assert part["size"] == pytest.approx(SIZE)
    areas = {tag["name"]: tag["area"] for tag in told["tags"]}
    assert areas == pytest.approx({"pad": 6e-4, "air": 6e-4, "untagged": 1e-3}, rel=1e-12)
    assert not (tmp_path / "result").exists()


def test_check_tells_the_measures_in_words(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_case(block_case(), tmp_path)
    ran = outcome(["check", tmp_path], capsys)
    assert ran.code == 0 and ran.err == ""
    for words in ("part 0", "30 x 20 x 10 mm", "6 cm3", "22 cm2", "pad", "air", "The case is sound."):
        assert words in ran.out


def test_check_tells_which_parts_touch(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    surface = assembly(block(), tagged(box(SIZE, at=(0, 0, 0.01)), 1, facing("+x")))
    write_case(block_case(surface), tmp_path)
    (pair,) = json.loads(outcome(["check", tmp_path, "--json"], capsys).out)["touching"]
    assert sorted(pair["parts"]) == ["part 0", "part 1"] and pair["area"] == pytest.approx(6e-4, rel=1e-9)


# Cases refused --------------------------------------------------------------------------------------------------------


def test_open_surface_names_its_faces_and_places(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    lidless = without(block(), facing("+x")(*centres_and_normals(block())))
    trouble = refusal(block_case(lidless), tmp_path, capsys, "geometry")
    assert "'part 0'" in trouble["message"] and "open" in trouble["message"]
    # The four sides around the hole, and places on its rim.
    rim = {int(face) for face in lidless.face if np.ptp(lidless.vertices[corners(lidless, face)][:, 0]) > 0}
    assert set(trouble["where"]["faces"]) == rim
    assert np.array(trouble["where"]["points"])[:, 0] == pytest.approx(0.03)
    assert outcome(["check", tmp_path], capsys).code == 3


@pytest.mark.parametrize("which", ["one face", "all of it"])
def test_faces_that_point_inwards_never_give_a_wrong_result(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], which: str
) -> None:
    """Either refused with the place, or turned, said so, and solved as the same block."""
    solid = block()
    turned = solid.face == 2 if which == "one face" else np.ones(len(solid.face), bool)
    triangles = np.where(turned[:, None], solid.triangles[:, ::-1], solid.triangles)
    write_case(block_case(replace(solid, triangles=triangles)), tmp_path)
    ran = outcome(["solve", tmp_path, "--progress", "none"], capsys)
    if ran.code == 0:
        summary = read_summary(tmp_path / "result")
        assert summary["parts"][0]["volume"] == pytest.approx(6e-6, rel=1e-9)
        assert any("'part 0'" in sentence for sentence in summary["mending"])
    else:
        assert ran.code == 3 and "'part 0'" in ran.trouble["message"]
        assert which == "all of it" or ran.trouble["where"]["faces"]


FLAT = replace(block(), vertices=block().vertices * (1.0, 1.0, 0.0))
POINT = replace(block(), vertices=block().vertices * 0.0)
SHEET = replace(without(block(), ~facing("+z")(*centres_and_normals(block()))), tag=np.array([0, 1], np.int32))
EMPTY_PART = replace(block(), part=np.ones(12, np.int32))


@pytest.mark.parametrize("surface", [FLAT, POINT, SHEET], ids=["scaled to zero", "a point", "a sheet"])
def test_no_volume(tmp_path: Path, capsys: pytest.CaptureFixture[str], surface: Surface) -> None:
    assert "'part 0'" in refusal(block_case(surface), tmp_path, capsys, "geometry")["message"]


def test_a_part_without_faces(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert "'part 0'" in refusal(block_case(EMPTY_PART), tmp_path, capsys, "geometry")["message"]


def test_parts_that_run_through_each_other(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    surface = assembly(block(), moved(block(), (0.012, 0.007, 0.004)))
    trouble = refusal(block_case(surface), tmp_path, capsys, "geometry")
    assert "'part 0'" in trouble["message"] and "'part 1'" in trouble["message"]
    points = np.array(trouble["where"]["points"])
    assert len(points) and (points >= (0.012, 0.007, 0.004)).all() and (points <= SIZE).all()


def test_nothing_to_carry_the_heat_off(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    case = replace(block_case(), tags=(PAD, Tag("air")))
    trouble = refusal(case, tmp_path, capsys, "adrift")
    assert "'part 0'" in trouble["message"]
    assert outcome(["check", tmp_path], capsys).code == 4


@pytest.mark.parametrize("terms", [{"convection": Convection(298.15, 0.0)}, {"heat": -5.0}, {"heat_flux": -100.0}])
def test_what_does_not_fix_a_temperature_leaves_a_part_adrift(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], terms: dict[str, Any]
) -> None:
    refusal(replace(block_case(), tags=(PAD, Tag("air", **terms))), tmp_path, capsys, "adrift")


def test_one_of_two_bodies_of_a_part_adrift(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Two shells of one part, only one of them cooled: the other is found, with a place in it."""
    other = tagged(box(SIZE, at=(0.1, 0, 0)), 0, facing("+z"))
    trouble = refusal(block_case(merged(block(), other)), tmp_path, capsys, "adrift")
    assert "'part 0'" in trouble["message"]
    assert np.array(trouble["where"]["points"])[:, 0].min() >= 0.1


def test_the_part_that_is_adrift_is_named(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    other = tagged(box(SIZE, at=(0.1, 0, 0)), 0, facing("+z"))
    assert "'part 1'" in refusal(block_case(assembly(block(), other)), tmp_path, capsys, "adrift")["message"]


@pytest.mark.parametrize("accuracy", [Accuracy(2, 1e-5), Accuracy(2, 0.002, 500), Accuracy(1, None, 100)])
def test_limits(tmp_path: Path, capsys: pytest.CaptureFixture[str], accuracy: Accuracy) -> None:
    trouble = refusal(replace(block_case(), accuracy=accuracy), tmp_path, capsys, "limits")
    assert str(accuracy.max_nodes) in trouble["message"]


def test_a_tag_without_faces(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    case = replace(block_case(), tags=(PAD, AIR, Tag("lid", heat=1.0)))
    assert "'lid'" in refusal(case, tmp_path, capsys, "case")["message"]


def test_an_unused_tag_without_terms_is_no_fault(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write_case(replace(block_case(), tags=(PAD, AIR, Tag("spare"))), tmp_path)
    assert outcome(["solve", tmp_path], capsys).code == 0
    row = read_summary(tmp_path / "result")["tags"][2]
    assert row["area"] == 0 and row["mean"] is None and row["heat"] == 0


def test_negative_conductivity(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    trouble = refusal(block_case(material=metal(-5.0)), tmp_path, capsys, "case")
    assert "parts[0].material.conductivity" in trouble["message"]


# In a process of its own ----------------------------------------------------------------------------------------------


def test_solve_in_a_process_of_its_own(tmp_path: Path) -> None:
    write_case(block_case(), tmp_path / "case")
    (tmp_path / "elsewhere").mkdir()
    ran = run("solve", "../case", "--progress", "json", cwd=tmp_path / "elsewhere")
    assert ran.code == 0 and ran.err == ""
    assert [json.loads(line)["stage"] for line in ran.out.splitlines()][-1] == "write"
    assert read_summary(tmp_path / "case" / "result")["state"] == "solved"
    assert list((tmp_path / "elsewhere").iterdir()) == []


@pytest.mark.parametrize(
    ("case", "code"),
    [
        (block_case(material=metal(-5.0)), 2),
        (block_case(SHEET), 3),
        (replace(block_case(), tags=(PAD, Tag("air"))), 4),
        (replace(block_case(), accuracy=Accuracy(2, 1e-5)), 6),
    ],
    ids=["case", "geometry", "adrift", "limits"],
)
def test_exit_codes_of_the_process(tmp_path: Path, case: Case, code: int) -> None:
    write_case(case, tmp_path)
    ran = run("solve", tmp_path, "--progress", "json")
    assert ran.code == code and EXIT_CODES[ran.trouble["kind"]] == code
    assert "Traceback" not in ran.err
    for line in ran.out.splitlines():
        json.loads(line)


def test_a_wrong_command_is_refused_with_its_usage(tmp_path: Path) -> None:
    ran = run("melt", tmp_path)
    assert ran.code == 2 and "usage" in ran.err


def test_a_solver_killed_in_mid_run_leaves_no_result_and_no_litter(tmp_path: Path) -> None:
    write_case(replace(block_case(), accuracy=Accuracy(2, 0.0012)), tmp_path)
    command = [sys.executable, "-m", "fluxface.solver", "solve", str(tmp_path), "--progress", "json"]
    with subprocess.Popen(command, stdout=subprocess.PIPE, encoding="utf-8") as solver:
        assert solver.stdout is not None
        for line in solver.stdout:
            if json.loads(line)["stage"] == "solve":
                solver.kill()
                break
    assert solver.wait(30) != 0
    assert sorted(path.name for path in tmp_path.iterdir()) == ["case.json", "surface.npz"]
