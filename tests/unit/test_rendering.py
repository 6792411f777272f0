"""``fluxface render`` finds a suite to run in, or says how to get one."""

from __future__ import annotations

import json
import os
from pathlib import Path

import pytest
from fluxface.solver import rendering
from fluxface.solver.command_line import main


def test_the_program_is_named_or_looked_for(tmp_path: Path, capfd: pytest.CaptureFixture) -> None:
    """A stand-in that tells what it was called with."""
    program = tmp_path / "suite"
    program.write_text('#!/bin/sh\necho "$@"\nexit 5\n')
    program.chmod(0o755)
    if os.name == "nt":
        pytest.skip("The stand-in is a shell script.")
    assert main(["render", "lamp.blend", "--blender", str(program), "--report"]) == 5
    assert capfd.readouterr().out.split() == ["--background", "--command", "fluxface", "lamp.blend", "--report"]


def test_without_one_the_message_says_what_to_do(
    tmp_path: Path, capfd: pytest.CaptureFixture, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("PATH", str(tmp_path))
    monkeypatch.setattr(rendering.importlib.util, "find_spec", lambda name: None)
    assert main(["render", "lamp.blend"]) == 6
    said = json.loads(capfd.readouterr().err.splitlines()[-1])
    assert said["message"] == "There is no Blender here to render with."
    assert "--blender PATH" in said["mend"]
    assert main(["render", "lamp.blend", "--blender", "/not/there"]) == 6
    assert "no Blender at /not/there" in json.loads(capfd.readouterr().err.splitlines()[-1])["message"]
