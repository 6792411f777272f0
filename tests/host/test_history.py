"""Runs are kept beside the file, follow it, and are told when they are lost."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import bpy
import numpy as np
import pytest
from fluxface.addon import history, study, view
from fluxface.solver.case import read_case
from fluxface.solver.result import read_field, read_skin, read_summary
from modelled import lamp


def outcome():
    return bpy.data.objects["lamp"].fluxface.outcome


@pytest.fixture
def saved(scene, tmp_path: Path) -> Path:
    """A file with a lamp that was run once; its path."""
    lamp(scene)
    file = tmp_path / "bench lamp.blend"
    bpy.ops.wm.save_as_mainfile(filepath=str(file))
    bpy.ops.fluxface.run()
    return file


def test_every_run_is_kept_with_its_case_and_its_skin(saved: Path) -> None:
    first = outcome().runs[0].hottest
    bpy.context.scene.fluxface.tags["pad"].heat = 24.0
    bpy.ops.fluxface.run()
    rows = outcome().runs
    assert [row.heat for row in rows] == pytest.approx([24.0, 12.0])
    assert rows[1].hottest == first < rows[0].hottest
    older = Path(rows[1].folder)
    assert older.parent == saved.with_name("bench lamp.fluxface") / "lamp" / "runs"
    assert read_case(older).tags[0].heat == pytest.approx(12.0)
    assert read_summary(older)["balance"]["in"] == pytest.approx(12.0)
    skin, field = read_skin(Path(rows[0].folder)), read_field(older.parent.parent / "result")
    assert skin.temperature.max() == field.temperature[field.boundary].max()
    assert np.array_equal(skin.places[skin.triangles], field.nodes[field.boundary])


def test_the_oldest_runs_make_room(saved: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(history, "KEPT", 2)
    first = outcome().runs[0].folder
    for _ in range(2):
        bpy.ops.fluxface.run()
    assert len(outcome().runs) == 2
    assert not Path(first).exists()


def test_notes_and_runs_come_back_with_the_file(saved: Path) -> None:
    outcome().runs[0].note = "ribs 2 mm taller"
    bpy.ops.wm.save_mainfile()
    bpy.ops.wm.open_mainfile(filepath=str(saved))
    assert [row.note for row in outcome().runs] == ["ribs 2 mm taller"]
    assert view.has_result(bpy.data.objects["lamp"])
    assert study.summary(outcome())["balance"]["in"] == pytest.approx(12.0)


def test_results_follow_the_file_where_it_is_saved(saved: Path, tmp_path: Path) -> None:
    other = tmp_path / "elsewhere" / "rev B.blend"
    other.parent.mkdir()
    bpy.ops.wm.save_as_mainfile(filepath=str(other))
    assert Path(outcome().folder) == other.with_name("rev B.fluxface") / "lamp" / "result"
    assert read_field(Path(outcome().folder)).temperature.size
    assert saved.with_name("bench lamp.fluxface").is_dir()


def test_a_run_of_an_unsaved_file_is_brought_along_when_it_is_saved(scene, tmp_path: Path) -> None:
    lamp(scene)
    bpy.ops.fluxface.run()
    assert Path(outcome().folder).is_relative_to(bpy.app.tempdir)
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "new.blend"))
    assert Path(outcome().folder) == tmp_path / "new.fluxface" / "lamp" / "result"
    assert Path(outcome().runs[0].folder).is_dir()


def test_a_moved_folder_is_found_and_a_lost_one_is_told_until_it_is_back(saved: Path, tmp_path: Path) -> None:
    bpy.ops.wm.save_mainfile()
    moved, folder = tmp_path / "moved" / saved.name, saved.with_name("bench lamp.fluxface")
    moved.parent.mkdir()
    shutil.move(saved, moved)
    shutil.move(folder, moved.with_name(folder.name))
    bpy.ops.wm.open_mainfile(filepath=str(moved))
    assert not outcome().lost
    assert Path(outcome().runs[0].folder).is_relative_to(moved.parent)

    shutil.move(moved.with_name(folder.name), tmp_path / "astray")
    bpy.ops.wm.open_mainfile(filepath=str(moved))
    assert outcome().lost
    assert view.has_result(bpy.data.objects["lamp"])
    shutil.move(tmp_path / "astray", moved.with_name(folder.name))
    bpy.ops.wm.open_mainfile(filepath=str(moved))
    assert not outcome().lost


def test_a_run_that_cannot_be_kept_is_shown_all_the_same(saved: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_paths: Path) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(history.shutil, "copyfile", full)
    bpy.context.scene.fluxface.tags["pad"].heat = 24.0
    with pytest.raises(RuntimeError, match="could not be kept"):
        bpy.ops.fluxface.run()
    assert study.summary(outcome())["balance"]["in"] == pytest.approx(24.0)
    assert "No space left" in outcome().message
    assert len(list((saved.with_name("bench lamp.fluxface") / "lamp" / "runs").iterdir())) == 1
    assert not bpy.context.window_manager.fluxface.running


def test_a_deleted_run_leaves_the_list(saved: Path) -> None:
    folder = Path(outcome().runs[0].folder)
    bpy.ops.fluxface.run_forget()
    assert not folder.exists()
    assert len(outcome().runs) == 0
    assert not bpy.ops.fluxface.run_forget.poll()


def test_a_runs_log_tells_what_was_done_and_opens_as_a_text(scene):
    part = lamp(scene)
    bpy.ops.fluxface.run()
    assert bpy.ops.fluxface.run_log() == {"FINISHED"}
    (log,) = bpy.data.texts
    told, summary = log.as_string(), json.loads(study.outcome(scene, [part]).summary)
    assert f"{summary['mesh']['nodes']:,} nodes" in told and f"mesh: {summary['seconds']['mesh']:.2f} s" in told
    assert "heat in 12 W, out 12 W" in told and "Where the heat goes" in told
