"""The memory of the solver's own process: how much it took at most, how much there is, and freed memory kept."""

from __future__ import annotations

import ctypes
import os
import sys
from pathlib import Path

STATUS, MEMINFO = Path("/proc/self/status"), Path("/proc/meminfo")
# glibc's mallopt: never give memory back, grow by 64 MB at a time, take none from outside the heap, one heap for all.
KEEPING = ((-1, 2**31 - 1), (-2, 1 << 26), (-4, 0), (-8, 1))


def keep_freed_memory() -> None:
    """Let arrays reuse the memory of freed ones instead of fresh pages, which cost as much as a sum over them.

    Linux with glibc alone; elsewhere nothing happens. For a process of our own, never for the host's.
    """
    mallopt = getattr(ctypes.CDLL(None), "mallopt", None) if sys.platform == "linux" else None
    if mallopt is not None:
        for option, value in KEEPING:
            mallopt(option, value)


def give_back() -> None:
    """Return what is free now to the system: the counterpart of :func:`keep_freed_memory`."""
    trim = getattr(ctypes.CDLL(None), "malloc_trim", None) if sys.platform == "linux" else None
    if trim is not None:
        trim(0)


def forget_peak() -> None:
    """Let :func:`peak` count from now on, where the system can."""
    try:
        Path("/proc/self/clear_refs").write_text("5")
    except OSError:
        return


def peak() -> int | None:
    """Bytes: the most this process has had in memory; None where that cannot be told."""
    if STATUS.exists():
        return _kilobytes(STATUS, "VmHWM")
    try:
        import resource
    except ImportError:  # Windows
        return None
    most = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    return most if sys.platform == "darwin" else 1024 * most


def available() -> int | None:
    """Bytes that a process may still take; None where that cannot be told."""
    if MEMINFO.exists():
        return _kilobytes(MEMINFO, "MemAvailable")
    try:
        return int(os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES"))
    except (AttributeError, OSError, ValueError):
        return None


def _kilobytes(path: Path, key: str) -> int | None:
    """Bytes of the entry ``key: number kB``."""
    for line in path.read_text("utf-8").splitlines():
        name, _, value = line.partition(":")
        if name == key:
            return 1024 * int(value.split()[0])
    return None
