"""Exact solutions that more than one published case needs, evaluated from their series."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq


@dataclass(frozen=True)
class FilmCooledStrip:
    """A rectangle 0 < x < half_width, 0 < y < length: y = 0 is held at a rise of 1, x = 0 lets no heat through, the
    other two sides lose heat through a film to surroundings at a rise of 0.

    By separation of variables (Carslaw & Jaeger, Conduction of Heat in Solids, 2nd ed. 1959, sec. 5.2 and 3.9):
    T = sum of A cos(p x) Y(y), with p tan(p half_width) = h/k. Lengths m, conductivity W/(m K), film W/(m2 K).
    """

    half_width: float
    length: float
    conductivity: float
    film: float
    terms: int = 4000

    def _roots(self) -> np.ndarray:
        biot = self.film * self.half_width / self.conductivity
        starts = np.pi * np.arange(self.terms)
        angle = [brentq(lambda z: z * np.sin(z) - biot * np.cos(z), start, start + np.pi / 2) for start in starts]
        return np.array(angle) / self.half_width

    def _amplitudes(self, p: np.ndarray) -> np.ndarray:
        angle = p * self.half_width
        return 2.0 * np.sin(angle) / (angle + np.sin(angle) * np.cos(angle))

    def _along(self, p: np.ndarray, y: float) -> np.ndarray:
        """Y(y) = [cosh p(l - y) + h/(kp) sinh p(l - y)] / [cosh pl + h/(kp) sinh pl], free of overflow."""
        plus, minus = 1.0 + self.film / (self.conductivity * p), 1.0 - self.film / (self.conductivity * p)
        there, whole = np.exp(-2.0 * p * (self.length - y)), np.exp(-2.0 * p * self.length)
        return np.exp(-p * y) * (plus + minus * there) / (plus + minus * whole)

    def _integral_along(self, p: np.ndarray) -> np.ndarray:
        """The integral of Y over the length."""
        plus, minus = 1.0 + self.film / (self.conductivity * p), 1.0 - self.film / (self.conductivity * p)
        tip, whole = np.exp(-p * self.length), np.exp(-2.0 * p * self.length)
        return (plus * (1.0 - tip) + minus * (tip - whole)) / (plus + minus * whole) / p

    def rise(self, x: float, y: float) -> float:
        """The temperature rise at a point."""
        p = self._roots()
        return float(np.sum(self._amplitudes(p) * np.cos(p * x) * self._along(p, y)))

    def heat_off_side(self) -> float:
        """W/m that leave through x = half_width, per metre of depth and kelvin held."""
        p = self._roots()
        mean = self._amplitudes(p) * np.cos(p * self.half_width) * self._integral_along(p)
        return float(self.film * np.sum(mean))

    def heat_off_end(self) -> float:
        """W/m that leave through y = length, per metre of depth and kelvin held."""
        p = self._roots()
        mean = self._amplitudes(p) * np.sin(p * self.half_width) / p * self._along(p, self.length)
        return float(self.film * np.sum(mean))
