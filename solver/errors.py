"""What can go wrong, in words a designer understands; each kind has its exit code."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

EXIT_CODES = {"case": 2, "geometry": 3, "adrift": 4, "unconverged": 5, "limits": 6}

# Enough to find the place, few enough to stay one line.
MOST_PLACES = 50


@dataclass
class Trouble(Exception):
    """A failure told in one plain sentence: what is wrong, where, and what to do about it.

    kind: a key of EXIT_CODES. faces: the modeller's polygon numbers. points: world positions in metres.
    """

    kind: str
    message: str
    mend: str = ""
    faces: Sequence[int] = field(default=())
    points: Sequence[Sequence[float]] = field(default=())

    def __post_init__(self) -> None:
        super().__init__(self.message)

    @property
    def exit_code(self) -> int:
        return EXIT_CODES[self.kind]

    def as_json(self) -> str:
        """One line of JSON, as the contract gives it for the last line of stderr."""
        where = {
            "faces": [int(face) for face in self.faces[:MOST_PLACES]],
            "points": np.asarray(self.points[:MOST_PLACES], dtype=float).reshape(-1, 3).tolist(),
        }
        return json.dumps({"kind": self.kind, "message": self.message, "where": where, "mend": self.mend})
