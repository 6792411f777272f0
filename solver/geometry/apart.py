"""Running a C++ library on a surface in a process of its own, with a bound on its time and memory."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np

PROGRAM = Path(__file__).with_name("libraries_process.py")
# The program's exit codes when the tool's library is not installed, and when memory ran out.
MISSING, MEMORY = 4, 5
KILLED = -9  # nobody but a system that is out of memory kills it so
SHARE_OF_MEMORY = 0.6
MEMORY_WHERE_UNKNOWN = 8 << 30


@dataclass
class Apart(Exception):
    """A tool that did not do. kind: "refused", "crashed", "time", "memory" or "missing"; text: what it said."""

    kind: str
    text: str = ""

    def __post_init__(self) -> None:
        super().__init__(self.text)


def run_apart(tool: str, arrays: dict[str, np.ndarray], argument: str, seconds: float) -> dict[str, np.ndarray]:
    """What ``tool`` of libraries_process.py makes of the arrays.

    Raises Apart. TetGen leaves files in the current folder, so that is a temporary one.
    """
    with tempfile.TemporaryDirectory(prefix="fluxface-") as folder:
        source, target = Path(folder, "in.npz"), Path(folder, "out.npz")
        np.savez(source, **arrays)
        processor_time = int(seconds * (os.cpu_count() or 1)) + 1
        command = [sys.executable, PROGRAM, tool, source, target, _most_memory(), processor_time, argument]
        try:
            done = subprocess.run(
                list(map(str, command)),
                cwd=folder,
                env={**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path))},
                stdin=subprocess.DEVNULL,
                stdout=subprocess.DEVNULL,
                stderr=subprocess.PIPE,
                text=True,
                errors="replace",
                timeout=seconds,
            )
        except subprocess.TimeoutExpired as error:
            raise Apart("time", f"took longer than {seconds:g} s") from error
        said = (done.stderr.strip().splitlines() or [""])[-1]
        if done.returncode == MISSING:
            raise Apart("missing", said)
        if done.returncode in (MEMORY, KILLED):
            raise Apart("memory", said)
        if done.returncode != 0 or not target.exists():
            raise Apart("refused" if done.returncode > 0 else "crashed", said)
        try:
            with np.load(target) as made:
                return dict(made)
        except (OSError, ValueError) as error:
            raise Apart("crashed", str(error)) from error


def _most_memory() -> int:
    """Bytes that a tool may take: a share of the machine's memory."""
    try:
        return int(SHARE_OF_MEMORY * os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES"))
    except (AttributeError, OSError, ValueError):
        return MEMORY_WHERE_UNKNOWN
