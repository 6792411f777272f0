"""Texts in the scene's units."""

from __future__ import annotations

import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import units  # noqa: E402


@pytest.mark.parametrize(
    ("system", "unit", "text"),
    [
        ("METRIC", "KELVIN", "298.1 K"),
        ("METRIC", "CELSIUS", "25.0 °C"),
        ("IMPERIAL", "FAHRENHEIT", "77.0 °F"),
        ("NONE", "ADAPTIVE", "298.1 K"),
    ],
)
def test_temperatures(scene, system, unit, text):
    scene.unit_settings.system = system
    scene.unit_settings.temperature_unit = unit
    assert units.temperature_text(scene, 298.15 - 1e-9) == text


def test_chosen_temperatures_have_no_needless_decimals(scene):
    assert units.short_temperature_text(scene, units.as_typed(298.1499938964844)) == "25 °C"
    assert units.span_text(scene, 300.15, 310.65) == "27.0 to 37.5 °C"


@pytest.mark.parametrize(
    ("square_metres", "text"),
    [(1.234, "1.23 m²"), (0.1, "0.1 m²"), (0.0321, "321 cm²"), (0.00183, "18.3 cm²"), (2.5e-5, "25 mm²"), (0, "0 mm²")],
)
def test_areas(scene, square_metres, text):
    assert units.area_text(scene, square_metres) == text


def test_imperial_areas_are_the_hosts(scene):
    scene.unit_settings.system = "IMPERIAL"
    assert units.area_text(scene, 0.00183) == "2.837 sq in"


@pytest.mark.parametrize(
    ("watts", "text"), [(12.0, "12 W"), (-0.35, "−350 mW"), (1234.5, "1,234 W"), (0.0, "0 W"), (14.04, "14 W")]
)
def test_powers(watts, text):
    assert units.power_text(watts) == text


def test_single_precision_does_not_show():
    assert units.as_typed(298.1499938964844) == 298.15
    assert units.as_typed(0.10000000149011612) == 0.1


def test_the_unit_scale_counts_with_a_unit_system_only(scene):
    scene.unit_settings.scale_length = 0.001
    assert units.metres_per_unit(scene) == pytest.approx(0.001)
    scene.unit_settings.system = "NONE"
    assert units.metres_per_unit(scene) == 1.0
