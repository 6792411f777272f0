"""Ways in which a fluid moves along a surface, and the film coefficient that each makes of the film's state.

Everything is analytic in the surface temperature in the sense of the complex step (Squire & Trapp, SIAM Review 40,
1998): values are compared by their real parts, and no absolute value, maximum or cast is taken of them.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Protocol

import numpy as np

from .fluids import Fluid
from .nusselt import Formula, larger

# m/s2, the standard acceleration of free fall (3rd General Conference on Weights and Measures, 1901).
FREE_FALL = 9.80665

# K. The drop's absolute value is rounded off over this much, so that a coefficient keeps a finite slope, and a value
# above zero, where surface and fluid are equally warm; at a drop of 1 K it changes the coefficient by 1e-7.
ROUNDED_DROP = 1e-3


@dataclass(frozen=True)
class Film:
    """The fluid against the surface, at P points.

    conductivity: W/(m K). kinematic_viscosity: m2/s. prandtl: 1. buoyancy: 1/m3, the Rayleigh number of a length of
    one metre, positive. warm: whether the surface is warmer than the fluid.
    """

    conductivity: np.ndarray
    kinematic_viscosity: np.ndarray
    prandtl: np.ndarray
    buoyancy: np.ndarray
    warm: np.ndarray

    def at(self, chosen: np.ndarray) -> Film:
        """The film at the points for which ``chosen`` (P,) holds."""
        return Film(*(getattr(self, field.name)[chosen] for field in fields(self)))


def film_at(fluid: Fluid, ambient: float, temperature: np.ndarray) -> Film:
    """The film between a surface at ``temperature`` (P,) K, real or complex, and ``fluid`` at ``ambient`` K."""
    mean = fluid.held((temperature + ambient) / 2)
    viscosity, diffusivity = fluid.kinematic_viscosity(mean), fluid.diffusivity(mean)
    drop = temperature - ambient
    size = np.sqrt(drop**2 + ROUNDED_DROP**2)
    return Film(
        conductivity=fluid.conductivity(mean),
        kinematic_viscosity=viscosity,
        prandtl=fluid.prandtl(mean),
        buoyancy=FREE_FALL * fluid.expansion(mean) * size / (viscosity * diffusivity),
        warm=drop.real >= 0,
    )


class Regime(Protocol):
    """A way in which the fluid moves along a patch; ``facet`` (P,) says which of its triangles each point lies on."""

    def coefficient(self, film: Film, facet: np.ndarray) -> np.ndarray:
        """(P,) W/(m2 K)."""

    def remarks(self, film: Film, facet: np.ndarray) -> list[str]:
        """A sentence for each number that lies outside the range of the formula used."""


@dataclass(frozen=True)
class Natural:
    """Natural convection by one formula.

    length: (B,) m, characteristic. share: (B,) what multiplies gravity: the cosine of a lean, or the narrowness of a
    channel.
    """

    formula: Formula
    length: np.ndarray
    share: np.ndarray

    def rayleigh(self, film: Film, facet: np.ndarray) -> np.ndarray:
        return film.buoyancy * (self.share * self.length**3)[facet]

    def coefficient(self, film: Film, facet: np.ndarray) -> np.ndarray:
        number = self.formula.nusselt(self.rayleigh(film, facet), film.prandtl)
        return number * film.conductivity / self.length[facet]

    def remarks(self, film: Film, facet: np.ndarray) -> list[str]:
        return range_remarks(self.formula, self.rayleigh(film, facet), film)


@dataclass(frozen=True)
class Inclined:
    """One inclined plate, the formula of which ends at a lean of 60°, and for leaning plates at Ra = 1e9."""

    plate: Natural

    def coefficient(self, film: Film, facet: np.ndarray) -> np.ndarray:
        return self.plate.coefficient(film, facet)

    def remarks(self, film: Film, facet: np.ndarray) -> list[str]:
        lean = np.degrees(np.arccos(np.minimum(self.plate.share[facet], 1.0)))
        leaning = lean > 1.0
        rayleigh = self.plate.rayleigh(film.at(leaning), facet[leaning])
        return [
            *self.plate.remarks(film, facet),
            *outside("lean from the vertical", lean, (0.0, 60.0 + 1e-6), "inclined plates, in degrees"),
            *outside("Rayleigh number", rayleigh, (0.0, 1e9), "inclined plates that are not upright"),
        ]


@dataclass(frozen=True)
class Facing:
    """Level faces: free where warmed fluid can rise off (or chilled fluid can fall off), trapped where it cannot.

    upward: (B,), positive where a face looks up.
    """

    upward: np.ndarray
    free: Natural
    trapped: Natural

    def is_free(self, film: Film, facet: np.ndarray) -> np.ndarray:
        return (self.upward[facet] >= 0) == film.warm

    def coefficient(self, film: Film, facet: np.ndarray) -> np.ndarray:
        free, trapped = self.free.coefficient(film, facet), self.trapped.coefficient(film, facet)
        return np.where(self.is_free(film, facet), free, trapped)

    def remarks(self, film: Film, facet: np.ndarray) -> list[str]:
        free = self.is_free(film, facet)
        return self.free.remarks(film.at(free), facet[free]) + self.trapped.remarks(film.at(~free), facet[~free])


@dataclass(frozen=True)
class Sloped:
    """Faces of any slope: as a plate with the part of gravity along it, and as a level one with the part across it;
    the larger coefficient counts (Raithby & Hollands, Handbook of Heat Transfer, 3rd ed. 1998, ch. 4; from memory)."""

    plate: Natural
    level: Facing

    def coefficient(self, film: Film, facet: np.ndarray) -> np.ndarray:
        return larger(self.plate.coefficient(film, facet), self.level.coefficient(film, facet))

    def remarks(self, film: Film, facet: np.ndarray) -> list[str]:
        plate = self.plate.coefficient(film, facet).real >= self.level.coefficient(film, facet).real
        return self.plate.remarks(film.at(plate), facet[plate]) + self.level.remarks(film.at(~plate), facet[~plate])


@dataclass(frozen=True)
class Forced:
    """Forced flow by one formula. length: m, characteristic. speed: m/s, of the undisturbed fluid."""

    formula: Formula
    length: float
    speed: float

    def reynolds(self, film: Film) -> np.ndarray:
        return self.speed * self.length / film.kinematic_viscosity

    def coefficient(self, film: Film, facet: np.ndarray) -> np.ndarray:
        return self.formula.nusselt(self.reynolds(film), film.prandtl) * film.conductivity / self.length

    def remarks(self, film: Film, facet: np.ndarray) -> list[str]:
        return range_remarks(self.formula, self.reynolds(film), film)


# Remarks -------------------------------------------------------------------------------------------------------------


def range_remarks(formula: Formula, number: np.ndarray, film: Film) -> list[str]:
    return [
        *outside(f"{formula.number} number", number, formula.limits, formula.title),
        *outside("Prandtl number", film.prandtl, formula.prandtl, formula.title),
    ]


def outside(name: str, values: np.ndarray, limits: tuple[float, float], subject: str) -> list[str]:
    """What to say of ``values`` that lie outside ``limits``, the published range for ``subject``."""
    if not values.size:
        return []
    least, most = float(values.real.min()), float(values.real.max())
    begin, end = limits
    remarks = []
    if least < begin:
        remarks.append(
            f"The {name} falls to {_short(least)}, below {_short(begin)}, where the range for {subject} begins."
        )
    if most > end:
        remarks.append(f"The {name} reaches {_short(most)}, above {_short(end)}, where the range for {subject} ends.")
    return remarks


def _short(value: float) -> str:
    """Two or three digits, and powers of ten without ornament: 0.68, 1150, 3.1e9."""
    if value == 0 or 0.01 <= abs(value) < 1e4:
        return f"{float(f'{value:.3g}'):g}"
    mantissa, exponent = f"{value:.1e}".split("e")
    return f"{mantissa.removesuffix('.0')}e{int(exponent)}"
