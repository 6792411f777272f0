"""Work done piece by piece, on as many threads as allowed: the loops inside NumPy and SciPy run side by side.

Pieces do not depend on the number of threads, and so neither do results.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable
from concurrent.futures import ThreadPoolExecutor
from functools import cache
from typing import TypeVar

THREADS_VARIABLE = "FLUXFACE_THREADS"

Item = TypeVar("Item")
Made = TypeVar("Made")


@cache
def threads() -> int:
    """As many as the environment variable FLUXFACE_THREADS says, or else the processor's cores."""
    asked = os.environ.get(THREADS_VARIABLE, "")
    if asked.isdecimal() and int(asked) > 0:
        return int(asked)
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # only Linux tells which cores are ours
        return os.cpu_count() or 1


@cache
def _pool() -> ThreadPoolExecutor:
    return ThreadPoolExecutor(threads(), thread_name_prefix="fluxface")


def side_by_side(work: Callable[[Item], Made], items: Iterable[Item]) -> list[Made]:
    """``work`` of each item, in the items' order; work must not call this function itself."""
    return list(map(work, items)) if threads() == 1 else list(_pool().map(work, items))


def slices(count: int, most: int) -> list[slice]:
    """0..count in pieces of ``most``, the last one shorter."""
    return [slice(start, min(start + most, count)) for start in range(0, count, most)]
