"""Fluids that carry heat off a surface: their properties over temperature, at atmospheric pressure.

Every property takes temperatures in kelvin, of any shape, real or complex: a slope is had by a complex step
(Squire & Trapp, SIAM Review 40, 1998).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np

from ..errors import Trouble
from ..materials import Table


@dataclass(frozen=True)
class Fluid:
    """Properties over temperature (K), each piecewise linear between the published knots.

    density: kg/m3. heat_capacity: J/(kg K). viscosity (dynamic): Pa s. conductivity: W/(m K).
    kinematic_viscosity, diffusivity: m2/s. prandtl: 1. expansion (by volume, at constant pressure): 1/K.
    The three in the middle are derived at the knots and then interpolated, as a reader of the published table does.
    """

    name: str
    density: Table
    heat_capacity: Table
    viscosity: Table
    conductivity: Table
    kinematic_viscosity: Table
    diffusivity: Table
    prandtl: Table
    expansion: Callable[[np.ndarray], np.ndarray]

    @property
    def lowest(self) -> float:
        """The temperature at which the published table begins, K."""
        return self.conductivity.temperature[0]

    @property
    def highest(self) -> float:
        """The temperature at which the published table ends, K."""
        return self.conductivity.temperature[-1]

    def held(self, temperature: np.ndarray) -> np.ndarray:
        """``temperature`` (K, any shape), brought back to the nearer end of the table where it lies beyond."""
        raised = np.where(temperature.real < self.lowest, self.lowest, temperature)
        return np.where(raised.real > self.highest, self.highest, raised)


def fluid_named(name: str) -> Fluid:
    """Raises Trouble of kind "case" that lists the known fluids when ``name`` is none of them."""
    if name not in FLUIDS:
        known = ", ".join(FLUIDS)
        raise Trouble("case", f"The fluid '{name}' is not known; the fluids are {known}.", "Choose one of them.")
    return FLUIDS[name]


def ideal_gas_expansion(temperature: np.ndarray) -> np.ndarray:
    """1/T."""
    return 1.0 / temperature


def _fluid(name: str, rows: np.ndarray, expansion: Callable[[np.ndarray], np.ndarray] | None = None) -> Fluid:
    """A fluid from rows of T, density, heat capacity, viscosity, conductivity, and expansion if tabulated (all SI)."""
    temperature, density, heat_capacity, viscosity, conductivity, *rest = rows.T

    def table(values: np.ndarray) -> Table:
        return Table(tuple(temperature.tolist()), tuple(values.tolist()))

    return Fluid(
        name=name,
        density=table(density),
        heat_capacity=table(heat_capacity),
        viscosity=table(viscosity),
        conductivity=table(conductivity),
        kinematic_viscosity=table(viscosity / density),
        diffusivity=table(conductivity / (density * heat_capacity)),
        prandtl=table(viscosity * heat_capacity / conductivity),
        expansion=expansion or table(*rest),
    )


# Incropera & DeWitt, Table A.4 (from memory): K, kg/m3, kJ/(kg K), 1e-7 Pa s, 1e-3 W/(m K). The table's densities are
# those of 100 kPa; at 101.325 kPa a film coefficient of natural convection comes out 0.7 % higher.
AIR = np.array([
    [250, 1.3947, 1.006, 159.6, 22.3],
    [300, 1.1614, 1.007, 184.6, 26.3],
    [350, 0.9950, 1.009, 208.2, 30.0],
    [400, 0.8711, 1.014, 230.1, 33.8],
    [450, 0.7740, 1.021, 250.7, 37.3],
    [500, 0.6964, 1.030, 270.1, 40.7],
    [550, 0.6329, 1.040, 288.4, 43.9],
    [600, 0.5804, 1.051, 305.8, 46.9],
    [650, 0.5356, 1.063, 322.5, 49.7],
    [700, 0.4975, 1.075, 338.8, 52.4],
    [750, 0.4643, 1.087, 354.6, 54.9],
    [800, 0.4354, 1.099, 369.8, 57.3],
    [850, 0.4097, 1.110, 384.3, 59.6],
    [900, 0.3868, 1.121, 398.1, 62.0],
    [950, 0.3666, 1.131, 411.3, 64.3],
    [1000, 0.3482, 1.141, 424.4, 66.7],
]) * [1, 1, 1e3, 1e-7, 1e-3]  # fmt: skip

# Incropera & DeWitt, Table A.6, saturated liquid (from memory): K, m3/kg (inverted below), kJ/(kg K), 1e-6 Pa s,
# 1e-3 W/(m K), 1e-6 1/K.
WATER = np.array([
    [280, 1.000e-3, 4.198, 1422, 582, 46.04],
    [290, 1.001e-3, 4.184, 1080, 598, 174.0],
    [300, 1.003e-3, 4.179, 855, 613, 276.1],
    [310, 1.007e-3, 4.178, 695, 628, 361.9],
    [320, 1.011e-3, 4.180, 577, 640, 436.7],
    [330, 1.016e-3, 4.184, 489, 650, 504.0],
    [340, 1.021e-3, 4.188, 420, 660, 566.0],
    [350, 1.027e-3, 4.195, 365, 668, 624.2],
    [370, 1.041e-3, 4.214, 289, 679, 728.7],
]) * [1, 1, 1e3, 1e-6, 1e-3, 1e-6]  # fmt: skip
WATER[:, 1] = 1.0 / WATER[:, 1]

# Incropera & DeWitt, Table A.5, unused oil (from memory): K, kg/m3, kJ/(kg K), 1e-2 Pa s, 1e-3 W/(m K), 1e-3 1/K.
ENGINE_OIL = np.array([
    [300, 884.1, 1.909, 48.6, 145, 0.70],
    [310, 877.9, 1.951, 25.3, 145, 0.70],
    [320, 871.8, 1.993, 14.1, 143, 0.70],
    [330, 865.8, 2.035, 8.36, 141, 0.70],
    [340, 859.9, 2.076, 5.31, 139, 0.70],
    [350, 853.9, 2.118, 3.56, 138, 0.70],
    [360, 847.8, 2.161, 2.52, 138, 0.70],
    [370, 841.8, 2.206, 1.86, 137, 0.70],
    [380, 836.0, 2.250, 1.41, 136, 0.70],
    [390, 830.6, 2.294, 1.10, 135, 0.70],
    [400, 825.1, 2.337, 0.874, 134, 0.70],
]) * [1, 1, 1e3, 1e-2, 1e-3, 1e-3]  # fmt: skip

FLUIDS: Mapping[str, Fluid] = MappingProxyType(
    {
        "air": _fluid("air", AIR, ideal_gas_expansion),
        "water": _fluid("water", WATER),
        "engine oil": _fluid("engine oil", ENGINE_OIL),
    }
)
