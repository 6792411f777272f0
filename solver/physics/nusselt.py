"""Published correlations for the mean Nusselt number of isothermal surfaces.

Each takes the Rayleigh (or Reynolds) and Prandtl numbers, arrays of one shape, real or complex with a positive real
part (so that slopes can be had by a complex step), and gives the Nusselt number in that shape. All numbers are formed
with one characteristic length, named in each docstring, and with fluid properties at the film temperature. The
equations are numbered as in Incropera & DeWitt, Fundamentals of Heat and Mass Transfer, 6th ed. (from memory).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Formula:
    """A correlation and the range it was published for.

    number: "Rayleigh" or "Reynolds", whichever ``nusselt`` takes first; limits and prandtl: (lowest, highest).
    """

    title: str
    nusselt: Callable[[np.ndarray, np.ndarray], np.ndarray]
    number: str
    limits: tuple[float, float]
    prandtl: tuple[float, float] = (0.0, np.inf)


def larger(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """The greater of the two, point by point, by their real parts."""
    return np.where(first.real >= second.real, first, second)


# Natural convection --------------------------------------------------------------------------------------------------


def vertical_plate(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Plate of height L: Churchill & Chu, Int. J. Heat Mass Transfer 18 (1975) 1323, over all Ra (9.26).

    0.1 < Ra < 1e12, any Pr.
    """
    return (0.825 + 0.387 * rayleigh ** (1 / 6) / (1 + (0.492 / prandtl) ** (9 / 16)) ** (8 / 27)) ** 2


def laminar_plate(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Plate of height L, laminar: Churchill & Chu (1975), the other of their two formulas (9.27). Ra < 1e9, any Pr."""
    return 0.68 + 0.670 * rayleigh**0.25 / (1 + (0.492 / prandtl) ** (9 / 16)) ** (4 / 9)


def turbulent_plate(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Plate of height L, turbulent: Warner & Arpaci, Int. J. Heat Mass Transfer 11 (1968) 397 (9.24). Ra < 1e13."""
    return 0.10 * rayleigh ** (1 / 3)


def inclined_plate(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Plate of run L, its Ra formed with the part of gravity along the plate: Churchill & Chu (1975), §9.6.2.

    The laminar formula, and the turbulent one from where that is larger (Ra = 3.5e8 in air), so that the coefficient
    does not jump. Established for Ra < 1e9 on the underside of warm plates and the upper side of cold ones, up to 60°
    from the vertical; upright to Ra = 1e13.
    """
    return larger(laminar_plate(rayleigh, prandtl), turbulent_plate(rayleigh, prandtl))


def level_plate_free(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Level plate whose fluid can leave (warm and facing up, or cold and facing down), L = area / perimeter.

    McAdams, Heat Transmission (1954); the length by Lloyd & Moran, J. Heat Transfer 96 (1974) 443 (9.30, 9.31).
    1e4 < Ra < 1e11. Published to change over at Ra = 1e7, where the two branches differ by 6 %; here the larger one
    counts, which changes over at 4.7e6 without a jump.
    """
    return larger(0.54 * rayleigh**0.25, 0.15 * rayleigh ** (1 / 3))


def level_plate_trapped(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Level plate that holds its fluid back (warm and facing down, or cold and facing up), L = area / perimeter.

    McAdams (1954), Lloyd & Moran (1974) (9.32). 1e5 < Ra < 1e10.
    """
    return 0.27 * rayleigh**0.25


def horizontal_cylinder(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Long level cylinder, L = diameter: Churchill & Chu, Int. J. Heat Mass Transfer 18 (1975) 1049 (9.34).

    Ra < 1e12, any Pr.
    """
    return (0.60 + 0.387 * rayleigh ** (1 / 6) / (1 + (0.559 / prandtl) ** (9 / 16)) ** (8 / 27)) ** 2


def sphere(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Sphere, L = diameter: Churchill, Heat Exchanger Design Handbook (1983) (9.35). Ra < 1e11, Pr about 0.7 and more.

    Tends to 2, pure conduction, as Ra vanishes.
    """
    return 2 + 0.589 * rayleigh**0.25 / (1 + (0.469 / prandtl) ** (9 / 16)) ** (4 / 9)


def fin_channel(rayleigh: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Upright channel between two isothermal plates S apart and L high: Bar-Cohen & Rohsenow,
    J. Heat Transfer 106 (1984) 116 (9.48 with the constants of Table 9.3).

    Nusselt number over S, and temperature drop to the fluid at the inlet. ``rayleigh`` is the channel's, Ra_S S/L.
    Elenbaas's measurements, on which it rests, span 0.1 to 1e5.
    """
    return (576 / rayleigh**2 + 2.87 / rayleigh**0.5) ** -0.5


# Forced flow ---------------------------------------------------------------------------------------------------------

TRANSITION = 5e5


def laminar_flow(reynolds: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Flat plate of run L, laminar all along: Blasius (1908) and Pohlhausen (1921) (7.30). Re < 5e5, Pr > 0.6."""
    return 0.664 * reynolds**0.5 * prandtl ** (1 / 3)


def mixed_flow(reynolds: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Flat plate of run L, laminar to Re = 5e5 and turbulent beyond (7.38). 5e5 < Re < 1e8, 0.6 < Pr < 60.

    The constant, 871 as printed, is written out, so that laminar and mixed flow meet exactly.
    """
    shortfall = 0.037 * TRANSITION**0.8 - 0.664 * TRANSITION**0.5
    return (0.037 * reynolds**0.8 - shortfall) * prandtl ** (1 / 3)


def flat_plate_flow(reynolds: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Flat plate of run L: laminar up to Re = 5e5, mixed beyond. Re < 1e8, 0.6 < Pr < 60."""
    turbulent = reynolds.real > TRANSITION
    return np.where(turbulent, mixed_flow(reynolds, prandtl), laminar_flow(reynolds, prandtl))


def cylinder_crossflow(reynolds: np.ndarray, prandtl: np.ndarray) -> np.ndarray:
    """Cylinder across the flow, L = diameter: Churchill & Bernstein, J. Heat Transfer 99 (1977) 300 (7.54).

    Re Pr > 0.2, Re < 1e7. Tends to 0.3 as Re vanishes.
    """
    laminar = 0.62 * reynolds**0.5 * prandtl ** (1 / 3) / (1 + (0.4 / prandtl) ** (2 / 3)) ** 0.25
    return 0.3 + laminar * (1 + (reynolds / 282_000) ** (5 / 8)) ** 0.8


VERTICAL_PLATE = Formula("vertical plates", vertical_plate, "Rayleigh", (0.1, 1e12))
INCLINED_PLATE = Formula("inclined plates", inclined_plate, "Rayleigh", (0.0, 1e13))
LEVEL_PLATE_FREE = Formula(
    "level plates that let the fluid rise or fall away", level_plate_free, "Rayleigh", (1e4, 1e11)
)
LEVEL_PLATE_TRAPPED = Formula("level plates that hold the fluid back", level_plate_trapped, "Rayleigh", (1e5, 1e10))
HORIZONTAL_CYLINDER = Formula("horizontal cylinders", horizontal_cylinder, "Rayleigh", (0.0, 1e12))
# Published for Pr of about 0.7 and more; warm air, at 0.68 to 0.7, is meant to be covered.
SPHERE = Formula("spheres", sphere, "Rayleigh", (0.0, 1e11), (0.68, np.inf))
FIN_CHANNEL = Formula("channels between fins", fin_channel, "Rayleigh", (0.1, 1e5))
FLAT_PLATE_FLOW = Formula("flow along a flat plate", flat_plate_flow, "Reynolds", (0.0, 1e8), (0.6, 60.0))
# The lower limit is that of air; it is published as Re Pr > 0.2.
CYLINDER_CROSSFLOW = Formula("flow across a cylinder", cylinder_crossflow, "Reynolds", (0.3, 1e7))
