"""Reading JSON whose every complaint names the key by its path, as in ``parts[0].material.conductivity``."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from .errors import Trouble


@dataclass(frozen=True)
class Entry:
    """One value of a JSON document and the path that leads to it."""

    value: Any
    path: str = ""

    def trouble(self, complaint: str, mend: str = "") -> Trouble:
        """The error that says ``complaint`` of this entry."""
        return Trouble("case", f"{self.path or 'the case'} {complaint}.", mend or f"Correct {self.path} in case.json.")

    def with_keys(self, *known: str) -> Entry:
        """This entry, found to be an object with no key but the known ones."""
        if not isinstance(self.value, dict):
            raise self.trouble(f"is {shown(self.value)}; it must be an object")
        for key in self.value:
            if key not in known:
                raise self[key].trouble("is not a known key", f"Remove it; the keys here are {', '.join(known)}.")
        return self

    def __contains__(self, key: str) -> bool:
        return isinstance(self.value, dict) and self.value.get(key) is not None

    def __getitem__(self, key: str | int) -> Entry:
        if isinstance(key, int):
            return Entry(self.value[key], f"{self.path}[{key}]")
        inner = f"{self.path}.{key}" if self.path else key
        if key not in self.value:
            raise Entry(None, inner).trouble("is missing", f"Give {inner}.")
        return Entry(self.value[key], inner)

    def each(self, count: int | None = None) -> Iterator[Entry]:
        """The entries of a list, which must have ``count`` of them if that is given."""
        if not isinstance(self.value, list):
            raise self.trouble(f"is {shown(self.value)}; it must be a list")
        if count is not None and len(self.value) != count:
            raise self.trouble(f"has {len(self.value)} entries; it must have {count}")
        return (self[index] for index in range(len(self.value)))

    def text(self) -> str:
        if not isinstance(self.value, str):
            raise self.trouble(f"is {shown(self.value)}; it must be text")
        return self.value

    def truth(self) -> bool:
        if not isinstance(self.value, bool):
            raise self.trouble(f"is {shown(self.value)}; it must be true or false")
        return self.value

    def number(self, unit: str = "", *, above: float | None = None, at_least: float | None = None,
               at_most: float | None = None) -> float:  # fmt: skip
        """A finite number within the bounds given."""
        if isinstance(self.value, bool) or not isinstance(self.value, int | float):
            raise self.trouble(f"is {shown(self.value)}; it must be a number")
        try:
            number = float(self.value)
        except OverflowError:
            number = math.inf
        wanted = (
            (math.isfinite(number), "a finite number"),
            (above is None or number > above, f"greater than {above}"),
            (at_least is None or number >= at_least, f"at least {at_least}"),
            (at_most is None or number <= at_most, f"at most {at_most}"),
        )
        for holds, rule in wanted:
            if not holds:
                raise self.trouble(f"is {shown(self.value)}; it must be {f'{rule} {unit}'.rstrip()}")
        return number

    def whole(self, *, at_least: int, at_most: int | None = None) -> int:
        number = self.number(at_least=at_least, at_most=at_most)
        if number != int(number):
            raise self.trouble(f"is {shown(self.value)}; it must be a whole number")
        return int(number)


def shown(value: Any) -> str:
    """A value as a message shows it: short, whatever it is."""
    text = repr(value)
    return text if len(text) <= 40 else text[:37] + "..."
