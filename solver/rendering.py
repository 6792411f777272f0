"""``fluxface render``: a file of the 3D suite run from end to end, by the add-on, in a process of the suite."""

from __future__ import annotations

import importlib.util
import shutil
import subprocess
import sys
from collections.abc import Sequence

from .errors import Trouble

NAMED = "--blender"


def render(arguments: Sequence[str]) -> int:
    """The exit code of the add-on's own command, whose options these are; it tells its troubles itself.

    Raises Trouble of kind "limits" when there is no suite to run it in.
    """
    program, options = _named(list(arguments))
    module = f"{__package__.rpartition('.')[0]}.addon"
    if program is None and importlib.util.find_spec("bpy"):
        return subprocess.run([sys.executable, "-m", module, *options]).returncode
    found = shutil.which(program or "blender")
    if found is None:
        raise Trouble(
            "limits",
            f"There is no Blender at {program}." if program else "There is no Blender here to render with.",
            f"Install its module (pip install 'fluxface[host]'), or name the program: {NAMED} PATH.",
        )
    return subprocess.run([found, "--background", "--command", "fluxface", *options]).returncode


def _named(arguments: list[str]) -> tuple[str | None, list[str]]:
    """The program that ``--blender PATH`` names, and the arguments without it."""
    if NAMED not in arguments[:-1]:
        return None, arguments
    place = arguments.index(NAMED)
    return arguments[place + 1], arguments[:place] + arguments[place + 2 :]
