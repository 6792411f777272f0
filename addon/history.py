"""The runs that are kept: each a folder beside the file, a case with what came of it, named by when it was made."""

from __future__ import annotations

import shutil
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

from ..solver.case import CASE_FILE, SURFACE_FILE
from ..solver.errors import Trouble
from ..solver.result import SUMMARY_FILE, Summary, hot_skin, read_field, read_summary, write_skin
from . import run_log

if TYPE_CHECKING:
    from .properties import KeptRun, Outcome

RUNS, NOTE_FILE = "runs", "note.txt"
# Common practice, no source: a day's work. Older ones make room.
KEPT = 20
STAMP = "%Y-%m-%d_%H%M%S"


def keep(case: Path) -> Path:
    """Keep the case folder ``case`` and what came of it as a run of its own; the run's folder.

    Raises Trouble when there is no sound result, or no room for it.
    """
    result = case / "result"
    skin = hot_skin(read_field(result))
    run = _free(case / RUNS / datetime.now().strftime(STAMP))
    beside = run.with_name(f".{run.name}")
    try:
        beside.mkdir(parents=True)
        for file in (case / CASE_FILE, case / SURFACE_FILE, result / SUMMARY_FILE):
            shutil.copyfile(file, beside / file.name)
        write_skin(skin, beside)
        (beside / run_log.LOG_FILE).write_text(run_log.text(read_summary(result)), "utf-8")
        beside.rename(run)
    except OSError as error:
        shutil.rmtree(beside, ignore_errors=True)
        raise Trouble(
            "limits", f"The run could not be kept in {run.parent}: {error.strerror}.", "Free some space there."
        ) from error
    for old in folders(case)[KEPT:]:
        shutil.rmtree(old, ignore_errors=True)
    return run


def _free(run: Path) -> Path:
    """``run``, or with a number when two are made within a second."""
    number, free = 1, run
    while free.exists():
        number += 1
        free = run.with_name(f"{run.name}_{number}")
    return free


def folders(case: Path) -> list[Path]:
    """The runs kept of a case folder, the latest first."""
    try:
        found = [folder for folder in (case / RUNS).iterdir() if folder.is_dir() and folder.name[0] != "."]
    except OSError:
        return []
    return sorted(found, key=lambda folder: folder.name, reverse=True)


def refresh(left: Outcome, case: Path) -> None:
    """List the runs that are kept of a case folder; rows whose folder is gone leave with it."""
    chosen = left.runs[left.active_run].name if left.active_run < len(left.runs) else ""
    found = [(folder, summary) for folder in folders(case) if (summary := _summary(folder))]
    if [row.folder for row in left.runs] != [str(folder) for folder, _ in found]:
        left.runs.clear()
        for folder, summary in found:
            _fill(left.runs.add(), folder, summary)
        left.active_run = max(0, left.runs.find(chosen))


def _summary(folder: Path) -> Summary | None:
    try:
        return read_summary(folder)
    except Trouble:
        return None


def _fill(row: KeptRun, folder: Path, summary: Summary) -> None:
    # The note before the folder: a row without one writes no file.
    try:
        row.note = (folder / NOTE_FILE).read_text("utf-8")
    except (OSError, UnicodeDecodeError):
        row.note = ""
    row.name, row.folder = folder.name, str(folder)
    row.hottest, row.coldest = (summary[end]["temperature"] for end in ("hottest", "coldest"))
    row.heat = summary["balance"]["in"]


def write_note(run: KeptRun) -> None:
    """Keep the note with the run's folder too; where that is gone or may not be written, the file alone has it."""
    folder = Path(run.folder)
    if run.folder and folder.is_dir():
        try:
            (folder / NOTE_FILE).write_text(run.note, "utf-8")
        except OSError:
            return


def when(run: KeptRun) -> str:
    """As in "1 Dec, 14:05"."""
    try:
        made = datetime.strptime(run.name[: len("2000-01-01_000000")], STAMP)
    except ValueError:
        return run.name
    return f"{made.day} {made:%b, %H:%M}"


def follow(left: Outcome, case: Path) -> None:
    """Bring a result to where the file is now, as after Save As and after a move, and say so when it is lost.

    case: the folder where the file has it now. A result that stands elsewhere is copied there, with its runs.
    """
    if not left.summary:
        return
    wanted, stands = case / "result", Path(left.folder)
    if not wanted.is_dir() and left.folder and stands.is_dir():
        try:
            shutil.copytree(stands.parent, case, dirs_exist_ok=True)
        except (OSError, shutil.Error):
            wanted = stands
    left.lost = not wanted.is_dir()
    if not left.lost:
        left.folder = str(wanted)
        refresh(left, wanted.parent)
