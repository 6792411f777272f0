"""What a solver that stays keeps from one case to the next, so that nothing unchanged is done again."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import numpy as np

Made = TypeVar("Made")


class Kept:
    """The last thing made of each kind, with all that it was made from.

    reused: the kinds that the present case found made. A solver that runs once starts and ends with none.
    """

    def __init__(self) -> None:
        self.reused: list[str] = []
        self._made: dict[str, tuple[tuple[Any, ...], Any]] = {}

    def made(self, kind: str, inputs: tuple[Any, ...], make: Callable[[], Made]) -> Made:
        """What ``make`` gives, or gave when the inputs were the same; arrays, never changed in place, by their values.

        Inputs that are no arrays count by their words, as they may be changed in place.
        """
        inputs = tuple(item if isinstance(item, np.ndarray) else repr(item) for item in inputs)
        known = self._made.get(kind)
        if known is not None and len(known[0]) == len(inputs) and all(map(_same, known[0], inputs)):
            self.reused.append(kind)
            return known[1]
        self._made.pop(kind, None)  # its memory is wanted for what takes its place
        value = make()
        self._made[kind] = (inputs, value)
        return value

    def inputs(self, kind: str) -> tuple[Any, ...]:
        """What the thing that is kept of a kind was made from, to stand for it among the inputs of another."""
        return self._made[kind][0]

    def forget(self) -> None:
        self._made.clear()


def _same(one: Any, other: Any) -> bool:
    if not (isinstance(one, np.ndarray) and isinstance(other, np.ndarray)):
        return type(one) is type(other) and one == other
    return one is other or (one.dtype == other.dtype and np.array_equal(one, other))
