"""Reference properties at 300 K: Incropera & DeWitt, Fundamentals of Heat and Mass Transfer, Tables A.1 to A.6 (from
memory), and where said below typical data sheet values.

Metals and the other solids of the book within 1 %; plastics, circuit boards and gap fillers are ranges, within 20 %.
"""

from __future__ import annotations

import numpy as np
import pytest
from fluxface.solver.materials import Property, Table, library
from fluxface.solver.physics.fluids import FLUIDS

# Name in the library: W/(m K), kg/m3, J/(kg K).
BOOK = {
    # Table A.1
    "aluminium, pure": (237, 2702, 903),
    "aluminium, pure, over temperature": (237, 2702, 903),
    "aluminium 2024-T6": (177, 2770, 875),
    "copper, pure": (401, 8933, 385),
    "copper, pure, over temperature": (401, 8933, 385),
    "brass, cartridge 70/30": (110, 8530, 380),
    "iron, pure": (80.2, 7870, 447),
    "steel, plain carbon": (60.5, 7854, 434),
    "steel, plain carbon, over temperature": (60.5, 7854, 434),
    "steel AISI 1010": (63.9, 7832, 434),
    "stainless steel AISI 302": (15.1, 8055, 480),
    "stainless steel AISI 304": (14.9, 7900, 477),
    "stainless steel AISI 304, over temperature": (14.9, 7900, 477),
    "stainless steel AISI 316": (13.4, 8238, 468),
    "titanium, pure": (21.9, 4500, 522),
    "magnesium, pure": (156, 1740, 1024),
    "zinc": (116, 7140, 389),
    "tin": (66.6, 7310, 227),
    "silver": (429, 10500, 235),
    "gold": (317, 19300, 129),
    "tungsten": (174, 19300, 132),
    "nickel": (90.7, 8900, 444),
    "silicon": (148, 2330, 712),
    "silicon, over temperature": (148, 2330, 712),
    # ASM Metals Handbook and MIL-HDBK-5, typical values (from memory)
    "aluminium 6061-T6": (167, 2700, 896),
    "titanium Ti-6Al-4V": (6.7, 4430, 526),
    # Table A.2
    "alumina, polycrystalline": (36.0, 3970, 765),
    "alumina, polycrystalline, over temperature": (36.0, 3970, 765),
    "silicon carbide": (490, 3160, 675),
    "fused silica": (1.38, 2220, 745),
    # Table A.3
    "borosilicate glass": (1.4, 2225, 835),
    "soda-lime glass": (1.4, 2500, 750),
    "concrete, stone mix": (1.4, 2300, 880),
    "brick, common": (0.72, 1920, 835),
    "oak": (0.17, 545, 2385),
    "plywood": (0.12, 545, 1215),
    "glass fibre board, duct liner": (0.038, 32, 835),
    "polystyrene foam, extruded": (0.027, 55, 1210),
    "polyurethane foam": (0.026, 70, 1045),
    "rubber, soft": (0.13, 1100, 2010),
    "PTFE": (0.35, 2200, 1050),
}
DATA_SHEETS = {
    "ABS": (0.18, 1050, 1400),
    "PC": (0.2, 1200, 1200),
    "PA 6 / PA 66": (0.25, 1140, 1700),
    "FR4, bare": (0.3, 1850, 1100),
    "silicone grease, filled": (1.0, 2500, 1000),
}
# Table A.1: W/(m K) over K, the far ends of the tables.
OVER_TEMPERATURE = {
    "aluminium, pure, over temperature": {100: 302, 400: 240, 800: 218},
    "copper, pure, over temperature": {100: 482, 400: 393, 1000: 352},
    "stainless steel AISI 304, over temperature": {100: 9.2, 400: 16.6, 1000: 25.4},
    "steel, plain carbon, over temperature": {400: 56.7, 600: 48.0, 1000: 30.0},
    "silicon, over temperature": {200: 264, 400: 98.9, 1000: 31.2},
    "alumina, polycrystalline, over temperature": {400: 26.4, 600: 15.8, 1000: 7.85},
}


def at(value: Property, temperature: float) -> float:
    return float(value(np.array(temperature))) if isinstance(value, Table) else value


def properties(name: str) -> tuple[float, float, float]:
    """Conductivity (across the layers or the grain, where it differs), density and heat capacity at 300 K."""
    material = library()[name].material
    assert material.density is not None and material.heat_capacity is not None
    return at(material.conductivity[-1], 300.0), material.density, at(material.heat_capacity, 300.0)


@pytest.mark.parametrize("name", BOOK)
def test_book_values(name: str) -> None:
    assert properties(name) == pytest.approx(BOOK[name], rel=0.01)


@pytest.mark.parametrize("name", DATA_SHEETS)
def test_data_sheet_values(name: str) -> None:
    assert properties(name) == pytest.approx(DATA_SHEETS[name], rel=0.2)


def test_circuit_board_along_its_layers() -> None:
    """Typical data sheets: 0.8 to 0.9 W/(m K) in the plane."""
    assert library()["FR4, bare"].material.conductivity[:2] == pytest.approx((0.8, 0.8), rel=0.2)


@pytest.mark.parametrize("name", OVER_TEMPERATURE)
def test_conductivity_over_temperature(name: str) -> None:
    table = library()[name].material.conductivity[0]
    for temperature, conductivity in OVER_TEMPERATURE[name].items():
        assert at(table, temperature) == pytest.approx(conductivity, rel=0.01)


# Diffusivity as printed in Table A.1 (from memory), m2/s: not held in the library, so a check on all three columns.
@pytest.mark.parametrize(
    ("name", "diffusivity"),
    [
        ("copper, pure", 117e-6),
        ("aluminium, pure", 97.1e-6),
        ("stainless steel AISI 304", 3.95e-6),
        ("steel, plain carbon", 17.7e-6),
        ("silver", 174e-6),
        ("gold", 127e-6),
        ("nickel", 23.0e-6),
        ("titanium, pure", 9.32e-6),
        ("silicon", 89.2e-6),
    ],
)
def test_diffusivity_in_print(name: str, diffusivity: float) -> None:
    conductivity, density, heat_capacity = properties(name)
    assert conductivity / (density * heat_capacity) == pytest.approx(diffusivity, rel=0.005)


@pytest.mark.parametrize(("name", "expected"), [("air", (0.0263, 1.1614, 1007)), ("water", (0.613, 997, 4179))])
def test_fluids(name: str, expected: tuple[float, float, float]) -> None:
    """Tables A.4 and A.6 at 300 K."""
    fluid, warm = FLUIDS[name], np.array(300.0)
    values = fluid.conductivity(warm), fluid.density(warm), fluid.heat_capacity(warm)
    assert [float(value) for value in values] == pytest.approx(expected, rel=0.001)
