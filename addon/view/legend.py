"""The legend: what it says, the same in the viewport and in the picture."""

from __future__ import annotations

from dataclasses import dataclass

from .scale import Scale, Tick

CAUTION = (
    "An estimate for design. Surfaces that people touch, batteries and mains parts "
    "are decided by measurement, local codes and licensed practice."
)


@dataclass(frozen=True)
class Words:
    """What a legend calls what it shows, and the two ends of it."""

    title: str
    highest: str
    lowest: str
    of: str


OF_TEMPERATURE = Words("Surface temperature", "Hottest", "Coldest", "surface")


def of_difference(since: str) -> Words:
    """since: what is compared with, as in "1 Dec, 14:05"."""
    return Words(f"Change since {since}", "Highest", "Lowest", "change")


@dataclass(frozen=True)
class Legend:
    """scale: what the bar shows. ticks: along it. coldest, hottest: surfaces, kelvin.

    in_view: the hottest surface in the picture, kelvin; None where none is marked. words: what is shown.
    arrows: what the longest of them stands for.
    """

    scale: Scale
    ticks: tuple[Tick, ...]
    coldest: float
    hottest: float
    in_view: float | None = None
    words: Words = OF_TEMPERATURE
    arrows: str = ""

    @property
    def heading(self) -> str:
        return f"{self.words.title}, {self.scale.unit.symbol}"

    @property
    def ends_open(self) -> tuple[bool, bool]:
        """Whether surfaces lie beyond the bar's lower and upper end."""
        return self.coldest < self.scale.low, self.hottest > self.scale.high
