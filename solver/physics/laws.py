"""Surface laws: the heat flux into the part as a function of the surface temperature.

Every law takes complex temperatures, so that its slope is had to rounding by a complex step
(Squire & Trapp, SIAM Review 40 (1998) 110); see :func:`flux_and_slope`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from .film import FilmLaw

STEFAN_BOLTZMANN = 5.670374419e-8  # W/(m2 K4), exact in the SI of 2019 to these digits: CODATA 2018
STEP = 1e-30


class Law(Protocol):
    @property
    def sheds(self) -> bool:
        """Whether the flux falls as the surface warms, so that the law fixes a temperature."""
        ...

    def flux(self, temperature: np.ndarray, facet: np.ndarray) -> np.ndarray:
        """(P,) W/m2 into the part at points of temperature (P,) K on boundary triangles facet (P,)."""
        ...


@dataclass(frozen=True)
class Linear:
    """A given flux (W/m2) and a film of constant coefficient (W/(m2 K)) to an ambient (K)."""

    source: float = 0.0
    coefficient: float = 0.0
    ambient: float = 0.0

    @property
    def sheds(self) -> bool:
        return self.coefficient > 0

    def flux(self, temperature: np.ndarray, facet: np.ndarray) -> np.ndarray:
        return self.source + self.coefficient * (self.ambient - temperature)


@dataclass(frozen=True)
class Radiating:
    """Grey exchange with wide surroundings at ``ambient`` (K)."""

    emissivity: float
    ambient: float

    @property
    def sheds(self) -> bool:
        return self.emissivity > 0

    def flux(self, temperature: np.ndarray, facet: np.ndarray) -> np.ndarray:
        # Odd below zero, where only an iterate can stray: the law then still falls as the surface warms.
        fourth = np.where(temperature.real < 0, -(temperature**4), temperature**4)
        return self.emissivity * STEFAN_BOLTZMANN * (self.ambient**4 - fourth)


@dataclass(frozen=True)
class Correlated:
    """A film whose coefficient follows from a correlation; place: (B,) each boundary triangle's place in the film's."""

    film: FilmLaw
    place: np.ndarray

    @property
    def sheds(self) -> bool:
        return True

    def coefficient(self, temperature: np.ndarray, facet: np.ndarray) -> np.ndarray:
        """(P,) W/(m2 K)."""
        return self.film.coefficient(temperature, self.place[facet])

    def flux(self, temperature: np.ndarray, facet: np.ndarray) -> np.ndarray:
        return self.coefficient(temperature, facet) * (self.film.ambient - temperature)

    def remarks(self, temperature: np.ndarray, facet: np.ndarray) -> list[str]:
        """A sentence for each number outside the correlation's range."""
        return self.film.remarks(temperature, self.place[facet])


def flux_and_slope(law: Law, temperature: np.ndarray, facet: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(P,) W/m2 and its derivative by the surface temperature, W/(m2 K)."""
    stepped = law.flux(temperature + 1j * STEP, facet)
    return stepped.real, stepped.imag / STEP
