"""The extension in a real window on a virtual screen: installed, tagged, run, cancelled, edited, run again.

Needs a windowed host: FLUXFACE_WINDOW_HOST is its executable, or a root folder as provide.sh makes (then run as root).
The screens that a person would see are left in tests/window/out.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
from pathlib import Path
from typing import Any

import pytest
from fluxface.solver.packing import pack

HERE = Path(__file__).resolve().parent
OUT = HERE / "out"
SECONDS = 240
SCREEN = "1600x1000"

pytestmark = pytest.mark.slow


@pytest.fixture(scope="module")
def seen(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """What the script in the window wrote down."""
    host = os.environ.get("FLUXFACE_WINDOW_HOST")
    if not host:
        pytest.skip("no windowed host: set FLUXFACE_WINDOW_HOST (tests/window/provide.sh makes one)")
    shutil.rmtree(OUT, ignore_errors=True)
    OUT.mkdir()
    root = Path(host) if Path(host).is_dir() else Path("/")
    folder = Path("tmp", tmp_path_factory.mktemp("window").name)
    (root / folder).mkdir(parents=True)
    try:
        archive = pack(["linux-x64"], root / folder)[0]
        shutil.copy(HERE / "in_window.py", root / folder)
        _in_window(host, root, folder, archive.name)
        for picture in (root / folder).glob("*.png"):
            shutil.copy(picture, OUT)
        return json.loads((root / folder / "seen.json").read_text("utf-8"))
    finally:
        shutil.rmtree(root / folder)


def _in_window(host: str, root: Path, folder: Path, archive: str) -> None:
    """A screen and the suite on it, with a home of its own, ended after SECONDS at the latest."""
    inside = Path("/", folder)
    suite = "blender" if root != Path("/") else host
    command = [
        "timeout", str(SECONDS), "xvfb-run", "--auto-servernum", f"--server-args=-screen 0 {SCREEN}x24",
        suite, "--enable-event-simulate", "--window-geometry", "0", "0", *SCREEN.split("x"),
        "--python", str(inside / "in_window.py"), "--", str(inside / archive), str(inside),
    ]  # fmt: skip
    enter = ["chroot", str(root)] if root != Path("/") else []
    environment = {
        "HOME": str(inside),
        "LIBGL_ALWAYS_SOFTWARE": "1",
        "PATH": "/usr/local/bin:/usr/sbin:/usr/bin:/sbin:/bin",
    }
    subprocess.run([*enter, *command], env=environment, capture_output=True, timeout=SECONDS + 20, check=False)


def test_the_story_is_told_to_its_end(seen: dict[str, Any]) -> None:
    assert "error" not in seen
    assert seen["told to the end"]
    assert seen["enabled"]


def test_faces_are_tagged_by_keys_and_clicks(seen: dict[str, Any]) -> None:
    assert seen["mode"] == "EDIT_MESH"
    assert seen["faces"] == {"skin": 5, "pad": 1}


def test_the_window_lives_while_the_solver_runs(seen: dict[str, Any]) -> None:
    assert seen["looks while running"] >= 2


def test_results_follow_runs_and_edits(seen: dict[str, Any]) -> None:
    """A cancelled run leaves the older result; a taller part has more skin and runs cooler."""
    first, cancelled, edited = seen["first"], seen["after cancel"], seen["after edit"]
    assert first["hottest"] > 300.0
    assert first["children"] == 1
    assert cancelled == first
    assert edited["hottest"] < first["hottest"]
    assert edited["children"] == 1


def test_a_picture_is_rendered_beside_the_screen(seen: dict[str, Any]) -> None:
    assert seen["rendered"]


def test_removing_leaves_no_trace(seen: dict[str, Any]) -> None:
    assert seen["after removal"] == []


def test_disabling_leaves_nothing_and_enabling_again_works(seen: dict[str, Any]) -> None:
    assert seen["left behind"] == []
    assert seen["enabled again"]
