"""A file run from end to end with nobody there: solved if it must be, and its pictures and report left in a folder.

``fluxface render`` starts it under the bpy module, and ``blender --command fluxface`` in a Blender that has the add-on.
"""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import bpy

from ..solver.errors import Trouble
from . import report, running, study, view
from .report import PICTURE, REPORT

ENGINES = ("cycles", "eevee", "workbench")
COMMAND = "fluxface"

# What the host knows the registered command by.
handles: list[Any] = []


def main(arguments: Sequence[str]) -> int:
    """The exit code, as the solver's command line has it; the last line of stderr tells a trouble as JSON."""
    options = parser().parse_args(arguments)
    try:
        with hushed():
            made = list(rendered(options))
        print(*made, sep="\n")
    except Trouble as trouble:
        print(trouble.as_json(), file=sys.stderr)
        return trouble.exit_code
    return 0


def parser() -> argparse.ArgumentParser:
    made = argparse.ArgumentParser(prog="fluxface render", description="Solve a .blend file and render its result.")
    made.add_argument("file", type=Path, metavar="FILE.blend", help="the file; its active object or chosen parts count")
    made.add_argument("--out", type=Path, metavar="DIR", help="folder for what is made (default: that of the run)")
    made.add_argument("--engine", choices=ENGINES, default="cycles", help="what renders (default: cycles)")
    made.add_argument("--views", nargs="+", choices=view.VIEWS, default=[], metavar="SIDE",
                      help=f"pictures from several sides as well: {', '.join(view.VIEWS)}")  # fmt: skip
    made.add_argument("--turntable", type=int, default=0, metavar="N", help="N pictures from all around as well")
    made.add_argument("--report", action="store_true", help="write the one-page report as well")
    made.add_argument("--save", action="store_true", help="save the file with its result")
    return made


def rendered(options: argparse.Namespace) -> Iterator[Path]:
    """Solve the file if its result is not current, and give each thing made of it.

    Raises Trouble when it cannot be opened, solved, rendered or written.
    """
    open_file(options.file)
    context, members = bpy.context, study.parts(bpy.context)
    scene = context.scene
    if not study.is_current(scene, members):
        run = running.start(context)
        if trouble := running.finish(run, running.wait(run.job)):
            raise trouble
    folder = options.out or study.run_folder(scene, members)
    yield view.render_picture(scene, members, folder / PICTURE, engine=options.engine.upper())
    engine = options.engine.upper()
    yield from view.render_views(scene, members, folder, options.views, engine=engine)
    yield from view.render_turntable(scene, members, folder / "turntable", options.turntable, engine=engine)
    if options.report:
        yield report.report_of(scene, members, folder / REPORT)
    if options.save:
        bpy.ops.wm.save_mainfile()
        yield options.file


def open_file(file: Path) -> None:
    try:
        bpy.ops.wm.open_mainfile(filepath=str(file.resolve()))
    except RuntimeError as error:
        raise Trouble("case", f"The file {file} cannot be opened: {str(error).strip()}", "Check its name.") from error


@contextmanager
def hushed() -> Iterator[None]:
    """Without the host's own lines on standard output, which it writes past Python."""
    sys.stdout.flush()
    kept = os.dup(1)
    with open(os.devnull, "w") as nothing:
        os.dup2(nothing.fileno(), 1)
    try:
        yield
    finally:
        sys.stdout.flush()
        os.dup2(kept, 1)
        os.close(kept)


def register() -> None:
    handles.append(bpy.utils.register_cli_command(COMMAND, main))


def unregister() -> None:
    bpy.utils.unregister_cli_command(handles.pop())
