"""Film laws: slopes, continuity, what is measured on a tag, and what gravity, sign and range do to a coefficient."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
from fluxface.solver.case import CORRELATIONS, Convection
from fluxface.solver.errors import Trouble
from fluxface.solver.physics import nusselt
from fluxface.solver.physics.film import REGIMES, film_law
from fluxface.solver.physics.fluids import FLUIDS, fluid_named
from fluxface.solver.physics.patch import (
    Patch,
    area_over_rim,
    cylinder_diameter,
    height,
    longer_side,
    plate_run,
    sphere_diameter,
)

AMBIENT = 298.15
DOWN = np.array([0.0, 0.0, -1.0])
# Off the knots of the air table, where a central difference would straddle two slopes.
TEMPERATURES = np.array([260.0, 285.7, 297.9, 298.4, 299.5, 311.0, 341.3, 433.1, 777.7])


def patch_of(corners: np.ndarray, gravity: np.ndarray = DOWN) -> Patch:
    """A patch of outward-oriented triangles (B, 3, 3)."""
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    doubled = np.linalg.norm(normals, axis=1)
    return Patch(corners, normals / doubled[:, None], doubled / 2, gravity)


def sheet(position, rows: int, columns: int) -> np.ndarray:
    """Triangles (B, 3, 3) of a grid bent by ``position``, from (u, v) in 0..1 to a point."""
    u, v = np.meshgrid(np.linspace(0, 1, columns + 1), np.linspace(0, 1, rows + 1))
    points = np.round(np.stack(position(u, v), axis=-1), 15)  # so that a seam closes
    a, b, c, d = points[:-1, :-1], points[:-1, 1:], points[1:, 1:], points[1:, :-1]
    corners = np.concatenate([np.stack(half, axis=-2).reshape(-1, 3, 3) for half in ((a, b, c), (a, c, d))])
    area = np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1)
    return corners[area > 1e-14]


def rectangle(width: float, length: float, lean: float, rows: int = 3, columns: int = 2) -> np.ndarray:
    """A plate that looks along +y when upright; ``lean`` in degrees turns it to look up (90: level)."""
    tilt = np.radians(lean)
    return sheet(
        lambda u, v: (-width * u, -length * v * np.sin(tilt), length * v * np.cos(tilt)),
        rows,
        columns,
    )


def tube(diameter: float, length: float, turn: float = 2 * np.pi) -> np.ndarray:
    """The outside of a cylinder along x, or a part of it."""
    return sheet(
        lambda u, v: (length * v, diameter / 2 * np.sin(-turn * u), diameter / 2 * np.cos(-turn * u)), 4, 24
    )  # fmt: skip


def ball(diameter: float, down_to: float = np.pi) -> np.ndarray:
    """A sphere from its top to the polar angle ``down_to``."""
    r = diameter / 2
    return sheet(
        lambda u, v: (
            r * np.sin(down_to * v) * np.cos(-2 * np.pi * u),
            r * np.sin(down_to * v) * np.sin(-2 * np.pi * u),
            r * np.cos(down_to * v),
        ),
        12,
        24,
    )


def law_of(correlation: str, corners: np.ndarray, gravity: np.ndarray = DOWN, ambient: float = AMBIENT, **given):
    needs = {"fin_channel": {"gap": 0.008}, "flat_plate_flow": {"speed": 3.0}, "cylinder_crossflow": {"speed": 3.0}}
    convection = Convection(ambient, correlation=correlation, **{**needs.get(correlation, {}), **given})
    return film_law(convection, patch_of(corners, gravity))


def one(correlation: str, corners: np.ndarray, temperature: float, facet: int = 0, **given) -> float:
    """The coefficient at one point."""
    return float(law_of(correlation, corners, **given).coefficient(np.array([temperature]), np.array([facet]))[0])


LEANING = rectangle(0.1, 0.2, 35.0)
SUITED = {"horizontal_cylinder": tube(0.04, 0.2), "cylinder_crossflow": tube(0.04, 0.2), "sphere": ball(0.06)}


@pytest.mark.parametrize("fluid", FLUIDS)
@pytest.mark.parametrize("correlation", CORRELATIONS)
def test_slope_by_complex_step_is_that_of_a_central_difference(correlation, fluid):
    law = law_of(correlation, SUITED.get(correlation, LEANING), fluid=fluid)
    facet = np.zeros(len(TEMPERATURES), dtype=int)
    slope = law.coefficient(TEMPERATURES + 1e-30j, facet).imag / 1e-30
    steps = np.array([1e-3, 5e-4])[:, None]
    rough, fine = (
        (law.coefficient(TEMPERATURES + step, facet) - law.coefficient(TEMPERATURES - step, facet)) / (2 * step)
        for step in steps
    )
    difference = (4 * fine - rough) / 3  # Richardson's extrapolation
    scale = np.maximum(np.abs(slope), 1e-3 * law.coefficient(TEMPERATURES, facet) / np.abs(TEMPERATURES - AMBIENT))
    assert np.max(np.abs(slope - difference) / scale) < 1e-6


@pytest.mark.parametrize("correlation", CORRELATIONS)
def test_finite_positive_and_without_complaint_everywhere(correlation):
    corners = SUITED.get(correlation, np.concatenate([rectangle(0.1, 0.2, lean) for lean in (-90, -40, 0, 40, 90)]))
    law = law_of(correlation, corners)
    temperature = np.array([0.0, 100.0, AMBIENT - 1e-9, AMBIENT, AMBIENT + 1e-9, 400.0, 3000.0])
    temperature, facet = (grid.ravel() for grid in np.meshgrid(temperature, np.arange(len(corners))))
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        value = law.coefficient(temperature, facet)
        stepped = law.coefficient(temperature + 1e-30j, facet)
    assert np.isfinite(value).all() and (value > 0).all()
    assert np.isfinite(stepped).all() and np.allclose(stepped.real, value, rtol=1e-12)


@pytest.mark.parametrize("correlation", CORRELATIONS)
def test_heat_given_off_grows_with_temperature_without_a_jump(correlation):
    """In steps of 0.01 K over 250 K to 600 K."""
    corners = SUITED.get(correlation, rectangle(0.5, 0.8, 35.0))
    law = law_of(correlation, corners)
    temperature = np.arange(250.0, 600.0, 0.01)
    heat = law.coefficient(temperature, np.zeros(len(temperature), dtype=int)) * (temperature - AMBIENT)
    steps = np.diff(heat)
    assert (steps > 0).all()
    # A coefficient that jumped by 1 % would make a step of dozens of times the usual one.
    assert steps.max() < 3 * np.median(steps)


def test_formulas_meet_where_they_change_over():
    for formula, at in (
        (nusselt.level_plate_free, 3.6**12),
        (nusselt.flat_plate_flow, nusselt.TRANSITION),
        (nusselt.inclined_plate, 3.48e8),
    ):
        number = at * np.linspace(0.9, 1.1, 2001)
        values = formula(number, np.full_like(number, 0.7))
        assert np.abs(np.diff(values)).max() < 3e-4 * values.mean(), formula.__name__


def test_laminar_flow_is_what_precedes_the_transition_and_mixed_flow_what_follows():
    """Incropera & DeWitt (7.30), (7.38), with 871 as printed."""
    assert nusselt.flat_plate_flow(np.array(1e5), np.array(0.7)) == pytest.approx(0.664 * 1e5**0.5 * 0.7 ** (1 / 3))
    mixed = (0.037 * 2e6**0.8 - 871) * 0.7 ** (1 / 3)
    assert nusselt.flat_plate_flow(np.array(2e6), np.array(0.7)) == pytest.approx(mixed, rel=2e-4)


@pytest.mark.parametrize(
    ("formula", "limit"),
    [
        (nusselt.vertical_plate, 0.825**2),
        (nusselt.inclined_plate, 0.68),
        (nusselt.horizontal_cylinder, 0.36),
        (nusselt.sphere, 2.0),
    ],
)
def test_pure_conduction_remains_when_buoyancy_vanishes(formula, limit):
    assert formula(np.array(1e-30), np.array(0.7)) == pytest.approx(limit, rel=1e-4)


def test_cylinder_in_crossflow_keeps_its_least_value():
    assert nusselt.cylinder_crossflow(np.array(1e-30), np.array(0.7)) == pytest.approx(0.3, rel=1e-9)


# What is measured on a tag --------------------------------------------------------------------------------------------


@pytest.mark.parametrize("grid", [(1, 1), (7, 5)])
def test_measures_of_a_rectangle(grid):
    upright = patch_of(rectangle(0.1, 0.3, 0.0, *grid))
    leaning = patch_of(rectangle(0.1, 0.3, 50.0, *grid))
    level = patch_of(rectangle(0.1, 0.3, 90.0, *grid))
    assert height(upright) == pytest.approx(0.3)
    assert height(leaning) == pytest.approx(0.3 * np.cos(np.radians(50)))
    assert height(level) == 0.0
    assert plate_run(leaning) == pytest.approx(0.3)
    for patch in (upright, leaning, level):
        assert longer_side(patch) == pytest.approx(0.3)
        assert area_over_rim(patch) == pytest.approx(0.03 / 0.8)
        assert cylinder_diameter(patch) == 0.0
        assert sphere_diameter(patch) == 0.0


def test_measures_of_round_tags():
    assert cylinder_diameter(patch_of(tube(0.04, 0.2))) == pytest.approx(0.04)
    assert cylinder_diameter(patch_of(tube(0.04, 0.2, turn=2.0))) == pytest.approx(0.04)
    assert sphere_diameter(patch_of(ball(0.06))) == pytest.approx(0.06)
    assert sphere_diameter(patch_of(ball(0.06, down_to=0.7))) == pytest.approx(0.06)
    assert area_over_rim(patch_of(ball(0.06))) == 0.0


def test_ends_of_a_stub_do_not_disturb_its_diameter():
    disc = sheet(
        lambda u, v: (0.0 * u, 0.02 * v * np.sin(2 * np.pi * u), 0.02 * v * np.cos(2 * np.pi * u)), 3, 24
    )  # fmt: skip
    assert cylinder_diameter(patch_of(np.concatenate([tube(0.04, 0.2), disc]))) == pytest.approx(0.04)


def turned(rng: np.random.Generator) -> np.ndarray:
    rotation, _ = np.linalg.qr(rng.normal(size=(3, 3)))
    return rotation * np.sign(np.linalg.det(rotation))


@pytest.mark.parametrize("correlation", CORRELATIONS)
def test_turning_part_and_gravity_together_changes_nothing(correlation):
    corners = SUITED.get(correlation, np.concatenate([rectangle(0.1, 0.2, lean) for lean in (-75, 20, 75)]))
    rotation = turned(np.random.default_rng(5))
    facet = np.arange(len(corners))
    temperature = np.linspace(280.0, 380.0, len(corners))
    here = law_of(correlation, corners).coefficient(temperature, facet)
    there = law_of(correlation, corners @ rotation.T + 0.3, rotation @ DOWN).coefficient(temperature, facet)
    assert there == pytest.approx(here, rel=1e-9)


def test_given_lengths_are_used_and_measured_ones_are_the_same_numbers():
    plate, level = rectangle(0.1, 0.3, 0.0), rectangle(0.1, 0.3, 90.0)
    assert one("vertical_plate", plate, 350.0) == pytest.approx(one("vertical_plate", level, 350.0, length=0.3))
    assert one("flat_plate_flow", plate, 350.0) == pytest.approx(one("flat_plate_flow", plate, 350.0, length=0.3))
    assert one("sphere", ball(0.06), 350.0) == pytest.approx(one("sphere", plate, 350.0, diameter=0.06))
    assert one("fin_channel", plate, 350.0) == pytest.approx(one("fin_channel", level, 350.0, length=0.3))


# Slope, sign, range ---------------------------------------------------------------------------------------------------


def test_leaning_plate_loses_the_part_of_gravity_across_it():
    """g cos(lean) in place of g (Churchill & Chu 1975): a plate at 60° is an upright one in half the gravity."""
    film_of = {lean: law_of("inclined_plate", rectangle(0.1, 0.2, lean)).regime.plate for lean in (0.0, 60.0)}
    assert film_of[60.0].share[0] == pytest.approx(0.5)
    assert film_of[60.0].length[0] == pytest.approx(film_of[0.0].length[0])
    upright, leaning = (one("inclined_plate", rectangle(0.1, 0.2, lean), 350.0) for lean in (0.0, 60.0))
    air = FLUIDS["air"]
    film = np.array((350.0 + AMBIENT) / 2)
    conduction = 0.68 * air.conductivity(film) / 0.2
    assert (leaning - conduction) / (upright - conduction) == pytest.approx(0.5**0.25, rel=1e-12)


def test_natural_follows_the_slope_of_each_face():
    """Upright as the inclined plate; level, looking up and down, as the level plate, warm and cold."""
    for lean, correlation in ((0.0, "inclined_plate"), (90.0, "horizontal_plate"), (-90.0, "horizontal_plate")):
        plate = rectangle(0.1, 0.2, lean)
        for temperature in (280.0, 350.0):
            assert one("natural", plate, temperature) == pytest.approx(one(correlation, plate, temperature), rel=1e-9)


def test_gravity_turned_over_exchanges_top_and_bottom():
    both = np.concatenate([rectangle(0.1, 0.2, 90.0), rectangle(0.1, 0.2, -90.0) - [0, 0, 0.05]])
    facet, temperature = np.array([0, len(both) - 1]), np.array([350.0, 350.0])
    upright = law_of("natural", both).coefficient(temperature, facet)
    over = law_of("natural", both, gravity=-DOWN).coefficient(temperature, facet)
    assert upright == pytest.approx(over[::-1])
    assert upright[0] / upright[1] == pytest.approx(0.54 / 0.27)
    cold = law_of("natural", both, ambient=350.0).coefficient(np.array([AMBIENT, AMBIENT]), facet)
    assert cold == pytest.approx(upright[::-1])


def test_natural_changes_steadily_as_a_square_plate_is_turned():
    leans = np.linspace(-90.0, 90.0, 361)
    values = np.array([one("natural", rectangle(0.1, 0.1, lean), 350.0) for lean in leans])
    assert np.abs(np.diff(values)).max() < 0.03 * values.mean()
    assert values[-1] > values[180] > values[0]


def test_natural_measures_faces_of_like_slope_together():
    """A block 0.1 wide and long and 0.04 high: sides by their height, top and bottom by area over perimeter."""
    sides = [
        sheet(lambda u, v: (0.1 * u - 0.05, 0.0 * u - 0.05, 0.04 * v), 2, 3),
        sheet(lambda u, v: (0.05 + 0.0 * u, 0.1 * u - 0.05, 0.04 * v), 2, 3),
        sheet(lambda u, v: (0.05 - 0.1 * u, 0.05 + 0.0 * u, 0.04 * v), 2, 3),
        sheet(lambda u, v: (-0.05 + 0.0 * u, 0.05 - 0.1 * u, 0.04 * v), 2, 3),
    ]
    top = sheet(lambda u, v: (0.1 * u - 0.05, 0.1 * v - 0.05, 0.04 + 0.0 * u), 3, 3)
    bottom = sheet(lambda u, v: (0.1 * v - 0.05, 0.1 * u - 0.05, 0.0 * u), 3, 3)
    block = np.concatenate([*sides, top, bottom])
    side = one("natural", block, 350.0, facet=0)
    up = one("natural", block, 350.0, facet=sum(map(len, sides)))
    down = one("natural", block, 350.0, facet=len(block) - 1)
    assert side == pytest.approx(one("inclined_plate", np.concatenate(sides), 350.0, length=0.04))
    assert up == pytest.approx(one("horizontal_plate", top, 350.0, length=0.025))
    assert down == pytest.approx(one("horizontal_plate", bottom, 350.0, length=0.025))


def remarks(correlation: str, corners: np.ndarray, *temperature: float, **given) -> list[str]:
    values = np.array(temperature)
    return law_of(correlation, corners, **given).remarks(values, np.zeros(len(values), dtype=int))


def test_nothing_is_remarked_within_the_ranges():
    assert remarks("vertical_plate", rectangle(0.1, 0.2, 0.0), 300.0, 400.0) == []
    assert remarks("natural", rectangle(0.4, 0.4, 90.0), 350.0, AMBIENT) == []
    assert remarks("sphere", ball(0.06), 320.0, 500.0) == []
    assert remarks("fin_channel", rectangle(0.1, 0.1, 0.0), 350.0) == []
    assert remarks("flat_plate_flow", rectangle(0.1, 0.1, 0.0), 350.0) == []


def test_numbers_outside_the_ranges_are_named():
    (tall,) = remarks("vertical_plate", rectangle(0.1, 30.0, 0.0), 350.0)
    assert tall.startswith("The Rayleigh number reaches 8.") and "above 1e12" in tall and "vertical plates" in tall
    (small,) = remarks("horizontal_plate", rectangle(0.01, 0.01, 90.0), 350.0)
    assert "falls to 5" in small and "below 1e4" in small
    (steep,) = remarks("inclined_plate", rectangle(0.1, 0.1, 75.0), 350.0)
    assert "lean from the vertical reaches 75, above 60" in steep
    (long,) = remarks("inclined_plate", rectangle(0.1, 2.0, 30.0), 350.0)
    assert "above 1e9" in long and "not upright" in long
    (hot,) = remarks("vertical_plate", rectangle(0.1, 0.1, 0.0), 2000.0)
    assert hot == (
        "The film temperature in kelvin reaches 1150, above 1000, where the range for the properties of air ends."
    )
    (fast,) = remarks("flat_plate_flow", rectangle(0.1, 1.0, 0.0), 350.0, speed=2000.0)
    assert "Reynolds number" in fast and "above 1e8" in fast


# Inputs ---------------------------------------------------------------------------------------------------------------


def test_every_correlation_of_the_case_has_its_regime():
    assert tuple(REGIMES) == CORRELATIONS


@pytest.mark.parametrize(
    ("correlation", "corners", "key", "reason"),
    [
        ("vertical_plate", rectangle(0.1, 0.1, 90.0), "length", "level"),
        ("inclined_plate", rectangle(0.1, 0.1, 90.0), "length", "level"),
        ("fin_channel", rectangle(0.1, 0.1, 90.0), "length", "level"),
        ("horizontal_plate", ball(0.1), "length", "close on themselves"),
        ("sphere", rectangle(0.1, 0.1, 0.0), "diameter", "flat"),
        ("horizontal_cylinder", rectangle(0.1, 0.1, 0.0), "diameter", "flat"),
        ("cylinder_crossflow", rectangle(0.1, 0.1, 0.0), "diameter", "flat"),
    ],
)
def test_what_cannot_be_measured_is_asked_for(correlation, corners, key, reason):
    with pytest.raises(Trouble) as caught:
        law_of(correlation, corners)
    assert caught.value.kind == "case"
    assert correlation in caught.value.message and key in caught.value.message and reason in caught.value.message
    assert key in caught.value.mend


def test_unknown_fluid_is_told_which_there_are():
    with pytest.raises(Trouble, match=r"mercury.*air, water"):
        fluid_named("mercury")


# Fluids ---------------------------------------------------------------------------------------------------------------

# Kinematic viscosity (1e-6 m2/s), diffusivity (1e-6 m2/s) and Prandtl number as printed beside the columns that are
# held: Incropera & DeWitt, Table A.4 (from memory).
PRINTED_AIR = {
    250: (11.44, 15.9, 0.720),
    300: (15.89, 22.5, 0.707),
    350: (20.92, 29.9, 0.700),
    400: (26.41, 38.3, 0.690),
    450: (32.39, 47.2, 0.686),
    500: (38.79, 56.7, 0.684),
    550: (45.57, 66.7, 0.683),
    600: (52.69, 76.9, 0.685),
    650: (60.21, 87.3, 0.690),
    700: (68.10, 98.0, 0.695),
    750: (76.37, 109.0, 0.702),
    800: (84.93, 120.0, 0.709),
    850: (93.80, 131.0, 0.716),
    900: (102.9, 143.0, 0.720),
    950: (112.2, 155.0, 0.723),
    1000: (121.9, 168.0, 0.726),
}
# Prandtl number as printed: Incropera & DeWitt, Table A.6 and Table A.5 (from memory).
PRINTED_WATER = {280: 10.26, 290: 7.56, 300: 5.83, 310: 4.62, 320: 3.77, 330: 3.15, 340: 2.66, 350: 2.29, 370: 1.80}
PRINTED_OIL = {
    300: 6400,
    310: 3400,
    320: 1965,
    330: 1205,
    340: 793,
    350: 546,
    360: 395,
    370: 300,
    380: 233,
    390: 187,
    400: 152,
}


def test_air_agrees_with_the_columns_derived_in_print():
    air = FLUIDS["air"]
    temperature = np.array(list(PRINTED_AIR), dtype=float)
    viscosity, diffusivity, prandtl = np.array(list(PRINTED_AIR.values())).T
    assert air.kinematic_viscosity(temperature) * 1e6 == pytest.approx(viscosity, rel=0.005)
    assert air.diffusivity(temperature) * 1e6 == pytest.approx(diffusivity, rel=0.005)
    assert air.prandtl(temperature) == pytest.approx(prandtl, rel=0.005)
    assert air.viscosity(temperature) / air.density(temperature) * 1e6 == pytest.approx(viscosity, rel=0.005)


@pytest.mark.parametrize(("name", "printed"), [("water", PRINTED_WATER), ("engine oil", PRINTED_OIL)])
def test_liquids_agree_with_the_prandtl_number_in_print(name, printed):
    prandtl = FLUIDS[name].prandtl(np.array(list(printed), dtype=float))
    assert prandtl == pytest.approx(list(printed.values()), rel=0.005)


def test_air_obeys_the_gas_law_at_the_pressure_of_its_table():
    """p = rho R T with R = 287.05 J/(kg K): 100 kPa within 0.1 % over the whole table."""
    air = FLUIDS["air"]
    knots = np.array(air.density.temperature)
    assert air.density(knots) * 287.05 * knots == pytest.approx(1e5, rel=1e-3)


def test_properties_are_held_beyond_the_table():
    air = FLUIDS["air"]
    assert air.held(np.array([100.0, 300.0, 2000.0])).tolist() == [250.0, 300.0, 1000.0]
    assert air.expansion(np.array([300.0]))[0] == 1 / 300
