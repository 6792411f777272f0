"""The legend: what it says, the same in the viewport and in the picture."""

from __future__ import annotations

from dataclasses import dataclass

from .scale import Scale, Tick

TITLE = "Surface temperature"
CAUTION = (
    "An estimate for design. Surfaces that people touch, batteries and mains parts "
    "are decided by measurement, local codes and licensed practice."
)


@dataclass(frozen=True)
class Legend:
    """scale: what the bar shows. ticks: along it. coldest, hottest: surfaces, kelvin.

    in_view: the hottest surface in the picture, kelvin; None where none is marked.
    """

    scale: Scale
    ticks: tuple[Tick, ...]
    coldest: float
    hottest: float
    in_view: float | None = None

    @property
    def heading(self) -> str:
        return f"{TITLE}, {self.scale.unit.symbol}"

    @property
    def ends_open(self) -> tuple[bool, bool]:
        """Whether surfaces lie beyond the bar's lower and upper end."""
        return self.coldest < self.scale.low, self.hottest > self.scale.high
