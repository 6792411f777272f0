"""Time by stage, wall and processor, and what a library answers with."""

from __future__ import annotations

import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field

import numpy as np

# What the residual is to come down to, as a share of the load; and what iterations may have to be asked for to reach
# it where they measure it in another norm.
TRUE_RESIDUAL = 1e-8
ASKED = (1e-8, 3e-9, 1e-9, 3e-10, 1e-10, 1e-11, 1e-12)


@dataclass(frozen=True)
class Answer:
    """rise: (N,) K above the air at the mesh's corners, in its own order. residual: of the load, in 2-norms.

    unknowns: how many the system has. moved: bytes that the iterations read and wrote at least, where it is known.
    """

    rise: np.ndarray
    residual: float
    iterations: int
    unknowns: int
    moved: float | None = None


@dataclass(frozen=True)
class Clock:
    """Seconds of each stage: wall, and of the processor over all threads."""

    wall: dict[str, float] = field(default_factory=dict)
    processor: dict[str, float] = field(default_factory=dict)

    @contextmanager
    def stage(self, name: str) -> Iterator[None]:
        """A stage entered again replaces what it took before: only the iterations that sufficed count."""
        wall, processor = time.perf_counter(), time.process_time()
        yield
        self.wall[name] = time.perf_counter() - wall
        self.processor[name] = time.process_time() - processor
