"""The scale: which temperatures the colours span, and how temperatures are written."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from .colours import NO_VALUE, ColourMap, colours_at

# A part of one temperature still gets a scale: half a kelvin to either side.
LEAST_SPAN = 1e-3
SPAN_OF_ONE_TEMPERATURE = 1.0

# More isotherms than these run into each other.
MOST_LEVELS = 100


@dataclass(frozen=True)
class Unit:
    """symbol: as written after a number. kelvin_per_degree: K. zero: kelvin at zero degrees, 0 of a difference.

    signed: whether a plus is written, as before differences.
    """

    symbol: str
    kelvin_per_degree: float
    zero: float
    signed: bool = False

    def degrees(self, kelvin: float) -> float:
        return (kelvin - self.zero) / self.kelvin_per_degree

    def kelvin(self, degrees: float) -> float:
        return degrees * self.kelvin_per_degree + self.zero

    def text(self, kelvin: float) -> str:
        """As in ``61.3 °C``."""
        return f"{self.number(self.degrees(kelvin), 1)} {self.symbol}"

    def number(self, degrees: float, decimals: int) -> str:
        text = number(degrees, decimals)
        return f"+{text}" if self.signed and float(f"{degrees:.{decimals}f}") > 0 else text


def number(value: float, decimals: int) -> str:
    """With a true minus sign, and never minus zero."""
    text = f"{value:.{decimals}f}"
    return f"{0:.{decimals}f}" if float(text) == 0 else text.replace("-", "−")


@dataclass(frozen=True)
class Tick:
    """fraction: place along the scale, 0..1. label: the number in the scale's unit."""

    fraction: float
    label: str
    temperature: float


@dataclass(frozen=True)
class Scale:
    """low, high: kelvin, where the colours begin and end. unit: of what is written."""

    low: float
    high: float
    unit: Unit
    colour_map: ColourMap

    def fractions(self, temperature: np.ndarray) -> np.ndarray:
        """Where temperatures (K, any shape) lie on the scale; 0 is low and 1 is high."""
        return (temperature - self.low) / (self.high - self.low)

    def colours(self, temperature: np.ndarray) -> np.ndarray:
        """Linear-light colours (N, 3) of temperatures (N,) in kelvin, NaN where nothing is known."""
        known = ~np.isnan(temperature)[:, None]
        return np.where(known, colours_at(self.colour_map, self.fractions(temperature)), NO_VALUE)

    def ticks(self, most: int = 8) -> tuple[Tick, ...]:
        """Round numbers of the unit within the scale, two at least and about ``most`` at most."""
        first, last = self.unit.degrees(self.low), self.unit.degrees(self.high)
        step = round_step((last - first) / most)
        decimals = max(0, -math.floor(math.log10(step) + 1e-9))
        numbers = np.arange(math.ceil(first / step - 1e-9), math.floor(last / step + 1e-9) + 1) * step
        return tuple(
            Tick((value - first) / (last - first), self.unit.number(value, decimals), self.unit.kelvin(value))
            for value in numbers.tolist()
        )

    def levels(self, step: float) -> tuple[float, ...]:
        """Temperatures (K) of the isotherms: multiples of ``step`` (K) in the unit, or the ticks where that is 0.

        A step that would draw more than MOST_LEVELS is widened to the next that does not.
        """
        if step <= 0:
            return tuple(tick.temperature for tick in self.ticks())
        least = (self.high - self.low) / MOST_LEVELS
        step = step * math.ceil(least / step - 1e-9) if step < least else step
        first, last = math.ceil((self.low - self.unit.zero) / step), math.floor((self.high - self.unit.zero) / step)
        return tuple(self.unit.zero + step * number for number in range(first, last + 1))


def spanning(coldest: float, hottest: float, unit: Unit, colour_map: ColourMap) -> Scale:
    """The scale from ``coldest`` to ``hottest`` (K), widened about its middle where the two are as good as one."""
    if hottest - coldest < LEAST_SPAN:
        middle, half = 0.5 * (coldest + hottest), 0.5 * SPAN_OF_ONE_TEMPERATURE
        return Scale(middle - half, middle + half, unit, colour_map)
    return Scale(coldest, hottest, unit, colour_map)


def inked(scale: Scale) -> Scale:
    """The scale of lines drawn over its colours: dark ones lightened and light ones darkened, so that all are seen."""
    stops = scale.colour_map.stops
    luminance = stops @ (0.2126, 0.7152, 0.0722)
    lighter, darker = stops + 0.25 * (1 - stops), 0.32 * stops
    return replace(
        scale, colour_map=replace(scale.colour_map, stops=np.where(luminance[:, None] < 0.10, lighter, darker))
    )


def round_step(least: float) -> float:
    """The smallest of 1, 2 or 5 times a power of ten that is no less than ``least``.

    P. S. Heckbert, Nice numbers for graph labels, Graphics Gems (1990), from memory.
    """
    power = 10.0 ** math.floor(math.log10(least))
    return next(nice * power for nice in (1.0, 2.0, 5.0, 10.0) if nice * power >= least * (1 - 1e-9))
