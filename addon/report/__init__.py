"""The report: one page that says what was solved and what came of it, complete in one file."""

from __future__ import annotations

import base64
from collections.abc import Sequence
from datetime import datetime
from importlib.resources import files
from pathlib import Path
from string import Template

import bpy

from ...solver.case import read_case
from ...solver.errors import Trouble
from ...solver.result import read_summary
from .. import study, view
from . import rows

PICTURE, REPORT = "picture.png", "report.html"


def report_of(scene: bpy.types.Scene, members: Sequence[bpy.types.Object], path: Path) -> Path:
    """Write the page of the run that is shown to ``path``, its picture rendered when there is none yet.

    Raises Trouble when the run is not kept, or what is made cannot be written.
    """
    runs = study.outcome(scene, members).runs
    if not runs:
        raise Trouble("case", "The run that is shown is not kept any more.", "Run again.")
    run = Path(runs[0].folder)
    if not (run / PICTURE).is_file():
        view.render_picture(scene, members, run / PICTURE)
    return write_report(scene, run, run / PICTURE, runs[0].note, path)


def write_report(scene: bpy.types.Scene, run: Path, picture: Path, note: str, path: Path) -> Path:
    """Write the page of a kept run, with its picture in it, to ``path`` (HTML), and return the path.

    Raises Trouble when the run is not there any more or the page cannot be written.
    """
    text = page(scene, run, picture, note)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, "utf-8")
    except OSError as error:
        raise Trouble(
            "case", f"The report cannot be written to {path}: {error.strerror}.", "Choose another place for it."
        ) from error
    return path


def page(scene: bpy.types.Scene, run: Path, picture: Path, note: str) -> str:
    """The page as text; it stands alone, and prints to one A4.

    Raises Trouble when the run or its picture is not there any more.
    """
    case, summary = read_case(run), read_summary(run)
    try:
        image = base64.b64encode(picture.read_bytes()).decode("ascii")
    except OSError as error:
        raise Trouble("case", f"The picture {picture} cannot be read: {error.strerror}.", "Render it again.") from error
    template = Template((files(__package__) / "page.html").read_text("utf-8"))
    return template.substitute(
        rows.written(scene, case, summary),
        title=rows.text(case.title),
        date=f"{datetime.now():%d %B %Y}".lstrip("0"),
        file=rows.text(Path(bpy.data.filepath).name or "not saved"),
        run=rows.text(run.name),
        note=rows.paragraph(note, "note"),
        image=image,
    )
