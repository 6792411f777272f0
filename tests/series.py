"""Exact solutions of film-cooled bodies, evaluated from their series.

By separation of variables; Carslaw & Jaeger, Conduction of Heat in Solids, 2nd ed. 1959, ch. 5 and 8. Lengths are in
metres, ``ratio`` is the film coefficient over the conductivity (1/m).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq

TERMS = 2000


def roots_between(function: Callable[[float], float], low: np.ndarray, high: np.ndarray) -> np.ndarray:
    """The one root that lies in each interval."""
    return np.array([brentq(function, *ends) for ends in zip(low, high, strict=True)])


def slab_wavenumbers(half_width: float, ratio: float) -> np.ndarray:
    """(TERMS,) 1/m: the roots p of p tan(p half_width) = ratio."""
    biot, low = ratio * half_width, np.pi * np.arange(TERMS)
    angle = roots_between(lambda z: z * np.sin(z) - biot * np.cos(z), low, low + 0.5 * np.pi)
    return angle / half_width


def slab_amplitudes(angle: np.ndarray) -> np.ndarray:
    """The weights with which cos(p x) make 1; angle: p half_width."""
    return 2.0 * np.sin(angle) / (angle + np.sin(angle) * np.cos(angle))


def decay(p: np.ndarray, y: float, length: float, ratio: float) -> np.ndarray:
    """Y with Y'' = p^2 Y, Y = 1 at y = 0 and Y' = -ratio Y at y = length, free of overflow."""
    plus, minus = 1.0 + ratio / p, 1.0 - ratio / p
    there, whole = np.exp(-2.0 * p * (length - y)), np.exp(-2.0 * p * length)
    return np.exp(-p * y) * (plus + minus * there) / (plus + minus * whole)


def decay_integral(p: np.ndarray, length: float, ratio: float) -> np.ndarray:
    """The integral over the length of :func:`decay`, m."""
    plus, minus = 1.0 + ratio / p, 1.0 - ratio / p
    end, whole = np.exp(-p * length), np.exp(-2.0 * p * length)
    return (plus * (1.0 - end) + minus * (end - whole)) / (plus + minus * whole) / p


@dataclass(frozen=True)
class FilmCooledStrip:
    """A rectangle 0 < x < half_width, 0 < y < length: y = 0 is held at a rise of 1 K, x = 0 lets no heat through, the
    other two sides lose heat through a film (W/(m2 K)) to surroundings at a rise of 0.
    """

    half_width: float
    length: float
    conductivity: float
    film: float

    @property
    def ratio(self) -> float:
        return self.film / self.conductivity

    def rise(self, x: float, y: float) -> float:
        """K above the surroundings."""
        p = slab_wavenumbers(self.half_width, self.ratio)
        weights = slab_amplitudes(p * self.half_width) * np.cos(p * x)
        return float(weights @ decay(p, y, self.length, self.ratio))

    def heat_off_side(self) -> float:
        """W per metre of depth that leave through x = half_width."""
        p = slab_wavenumbers(self.half_width, self.ratio)
        angle = p * self.half_width
        return float(self.film * (slab_amplitudes(angle) * np.cos(angle)) @ decay_integral(p, self.length, self.ratio))

    def heat_off_end(self) -> float:
        """W per metre of depth that leave through y = length."""
        p = slab_wavenumbers(self.half_width, self.ratio)
        angle = p * self.half_width
        weights = slab_amplitudes(angle) * np.sin(angle) / p
        return float(self.film * weights @ decay(p, self.length, self.length, self.ratio))
