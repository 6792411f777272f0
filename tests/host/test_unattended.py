"""A file is solved, rendered and reported on from the command line, with nobody there."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import bpy
import pytest
from fluxface import solver
from fluxface.addon import unattended
from modelled import lamp


def rendered(*arguments: str) -> subprocess.CompletedProcess:
    path = os.pathsep.join([str(Path(solver.__path__[0]).parent.parent), *filter(None, [os.environ.get("PYTHONPATH")])])
    return subprocess.run(
        [sys.executable, "-m", solver.__name__, "render", *arguments],
        capture_output=True, text=True, timeout=300, env={**os.environ, "PYTHONPATH": path},
    )  # fmt: skip


@pytest.mark.slow
def test_a_file_is_run_from_end_to_end(scene, tmp_path: Path) -> None:
    lamp(scene)
    file, out = tmp_path / "lamp.blend", tmp_path / "out"
    bpy.ops.wm.save_as_mainfile(filepath=str(file))
    done = rendered(str(file), "--out", str(out), "--report", "--save")
    assert done.returncode == 0, done.stderr
    assert done.stdout.split() == [str(out / "picture.png"), str(out / "report.html"), str(file)]
    assert (out / "picture.png").read_bytes().startswith(b"\x89PNG")
    bpy.ops.wm.open_mainfile(filepath=str(file))
    assert json.loads(bpy.data.objects["lamp"].fluxface.outcome.summary)["balance"]["in"] == pytest.approx(12.0)
    # What is current is not solved again.
    more = ("--engine", "workbench", "--views", "front", "top", "--turntable", "3")
    assert rendered(str(file), "--out", str(out), *more).returncode == 0
    assert {path.name for path in out.glob("view *.png")} == {"view front.png", "view top.png"}
    assert len(list((out / "turntable").glob("turn 00[123].png"))) == 3
    assert len(list((tmp_path / "lamp.fluxface" / "lamp" / "runs").iterdir())) == 1


def test_trouble_is_told_as_the_solver_tells_it(scene, tmp_path: Path, capfd: pytest.CaptureFixture) -> None:
    assert unattended.main([str(tmp_path / "none.blend")]) == 2
    assert "none.blend cannot be opened" in json.loads(capfd.readouterr().err.splitlines()[-1])["message"]
    bpy.ops.wm.read_factory_settings(use_empty=True)
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "empty.blend"))
    assert unattended.main([str(tmp_path / "empty.blend")]) == 2
    assert json.loads(capfd.readouterr().err.splitlines()[-1])["message"] == "No mesh object is active."
