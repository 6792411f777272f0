"""From a scene's name to its file, its picture and its table, through the add-on as a designer uses it."""

from __future__ import annotations

import importlib
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import bpy
import designer
import table
from fluxface import addon
from fluxface.addon import study
from fluxface.addon.unattended import hushed
from fluxface.solver.case import CASE_FILE
from fluxface.solver.result import SUMMARY_FILE

Seconds = dict[str, float]


@contextmanager
def timed(seconds: Seconds, what: str) -> Iterator[None]:
    """Put into ``seconds`` how long the block takes."""
    start = time.perf_counter()
    yield
    seconds[what] = time.perf_counter() - start


def produce(scene: str, out: Path) -> int:
    """Leave ``<scene>.blend`` and ``<scene>.png`` in ``out`` and print the table; the exit code."""
    out.mkdir(parents=True, exist_ok=True)
    file, picture = out / f"{scene}.blend", out / f"{scene}.png"
    seconds: Seconds = {}
    addon.register()
    try:
        with hushed():
            part = prepared(scene, file, seconds)
            run(seconds)
            with timed(seconds, "picture"):
                bpy.ops.fluxface.render_picture(filepath=str(picture))
            bpy.ops.wm.save_mainfile()
        summary = study.summary(study.outcome(bpy.context.scene, [part]))
        print(table.of_result(bpy.context.scene, part, summary, seconds))
        print(f"\n{file}\n{picture}")
        return 0
    except RuntimeError as error:
        print(str(error).strip(), file=sys.stderr)
        return 1
    finally:
        addon.unregister()


def prepared(scene: str, file: Path, seconds: Seconds) -> bpy.types.Object:
    """The part of a scene in a new file, saved so that its case is kept beside it."""
    with timed(seconds, "build"):
        part = importlib.import_module(scene).prepare()
    designer.look_at(part)
    bpy.context.preferences.filepaths.save_version = 0
    bpy.ops.wm.save_as_mainfile(filepath=str(file))
    return part


def run(seconds: Seconds) -> None:
    """Press Run, and tell its steps apart by when the case and the result were written.

    Raises RuntimeError with the add-on's sentence when there is no result.
    """
    pressed = time.time()
    bpy.ops.fluxface.run()
    shown = time.time()
    folder = study.folder(bpy.context.scene, study.parts(bpy.context))
    exported = (folder / CASE_FILE).stat().st_mtime
    solved = (folder / "result" / SUMMARY_FILE).stat().st_mtime
    seconds |= {"export": exported - pressed, "solver": solved - exported, "colours": shown - solved}
