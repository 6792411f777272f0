"""Reading JSON whose every complaint names the key by its path, as in ``parts[0].material.conductivity``."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any
from unicodedata import category

from .errors import Trouble

LONGEST_TEXT = 1000  # letters; control characters and halves of surrogate pairs cannot be shown anywhere
# Least and most that a value other than zero may be, by its unit. No product has more, and with these no square,
# quotient or fourth power of what is computed leaves the range of numbers.
MAGNITUDES = {
    "K": (0.0, 1e5),
    "W": (0.0, 1e12),
    "W/m2": (0.0, 1e15),
    "W/m3": (0.0, 1e18),
    "m": (1e-9, 1e6),
    "m/s": (1e-6, 1e4),
    "W/(m K)": (1e-6, 1e9),
    "W/(m2 K)": (1e-9, 1e12),
    "m2 K/W": (1e-12, 1e9),
    "kg/m3": (1e-6, 1e6),
    "J/(kg K)": (1e-6, 1e9),
}
OF_ANY_UNIT = (0.0, 1e12)


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
        if len(self.value) > LONGEST_TEXT or any(category(letter) in ("Cc", "Cs") for letter in self.value):
            raise self.trouble(f"is {shown(self.value)}; it must be one line of at most {LONGEST_TEXT} letters")
        return self.value

    def truth(self) -> bool:
        if not isinstance(self.value, bool):
            raise self.trouble(f"is {shown(self.value)}; it must be true or false")
        return self.value

    def number(self, unit: str = "", *, above: float | None = None, at_least: float | None = None,
               at_most: float | None = None) -> float:  # fmt: skip
        """A number within the bounds given and, if it is not zero, within those of its unit."""
        if isinstance(self.value, bool) or not isinstance(self.value, int | float):
            raise self.trouble(f"is {shown(self.value)}; it must be a number")
        try:
            number = float(self.value)
        except OverflowError:
            number = math.inf
        least, most = MAGNITUDES.get(unit, OF_ANY_UNIT)
        wanted = (
            (math.isfinite(number), "a finite number"),
            (above is None or number > above, f"greater than {above}"),
            (at_least is None or number >= at_least, f"at least {at_least}"),
            (at_most is None or number <= at_most, f"at most {at_most}"),
            (number == 0 or least <= abs(number), f"zero or at least {least:g}"),
            (abs(number) <= most, f"at most {most:g}"),
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
