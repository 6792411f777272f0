"""Colour maps and scales: what published maps promise, the way from a fraction to a colour and back, round ticks."""

from __future__ import annotations

import numpy as np
import pytest
from fluxface.addon.view.colours import colour_maps, colours_at, fractions_of, linear_from_srgb, srgb_from_linear
from fluxface.addon.view.scale import Unit, round_step, spanning

CELSIUS, KELVIN, FAHRENHEIT = Unit("°C", 1.0, 273.15), Unit("K", 1.0, 0.0), Unit("°F", 5 / 9, 273.15 - 160 / 9)
SEQUENTIAL = [name for name, colour_map in colour_maps().items() if colour_map.kind == "sequential"]

# Colours as the colour-blind see them, in linear light: G. M. Machado, M. M. Oliveira and L. A. F. Fernandes, IEEE
# Trans. Vis. Comput. Graph. 15 (2009) 1291, severity 1.0, from memory.
SEEN_WITHOUT_RED = np.array(
    [(0.152286, 1.052583, -0.204868), (0.114503, 0.786281, 0.099216), (-0.003882, -0.048116, 1.051998)]
)
SEEN_WITHOUT_GREEN = np.array(
    [(0.367322, 0.860646, -0.227968), (0.280085, 0.672501, 0.047413), (-0.011820, 0.042940, 0.968881)]
)


def lab(linear: np.ndarray) -> np.ndarray:
    """CIE 1976 L*a*b* (N, 3) of linear sRGB (N, 3); white is D65."""
    to_xyz = np.array([(0.4124, 0.3576, 0.1805), (0.2126, 0.7152, 0.0722), (0.0193, 0.1192, 0.9505)])
    ratio = linear @ to_xyz.T / to_xyz.sum(axis=1)
    f = np.where(ratio > (6 / 29) ** 3, np.cbrt(ratio), ratio / (3 * (6 / 29) ** 2) + 4 / 29)
    x, y, z = f.T
    return np.stack([116 * y - 16, 500 * (x - y), 200 * (y - z)], axis=1)


def test_srgb_and_linear_light() -> None:
    """IEC 61966-2-1: mid grey 128 of 255 is 0.2158605 in linear light (its formula evaluated by hand)."""
    assert linear_from_srgb(np.array(128 / 255)) == pytest.approx(((128 / 255 + 0.055) / 1.055) ** 2.4, rel=1e-12)
    assert linear_from_srgb(np.array(128 / 255)) == pytest.approx(0.2158605, abs=1e-7)
    every = np.linspace(0, 1, 1001)
    np.testing.assert_allclose(srgb_from_linear(linear_from_srgb(every)), every, atol=1e-9)


@pytest.mark.parametrize("name", SEQUENTIAL)
def test_hotter_is_lighter_whoever_looks(name: str) -> None:
    """Lightness rises all along, also for eyes that lack red or green: Crameri, Shephard and Heron (2020)."""
    colours = colours_at(colour_maps()[name], np.linspace(0, 1, 64))
    for seen in (np.eye(3), SEEN_WITHOUT_RED, SEEN_WITHOUT_GREEN):
        assert (np.diff(lab(np.clip(colours @ seen.T, 0, 1))[:, 0]) > 0).all()


@pytest.mark.parametrize("name", colour_maps())
def test_equal_steps_look_about_equal(name: str) -> None:
    """Perceptually even: no step between neighbouring stops is more than 2.5 times the mean step, in CIE 1976."""
    steps = np.linalg.norm(np.diff(lab(colour_maps()[name].stops), axis=0), axis=1)
    assert steps.max() < 2.5 * steps.mean()
    assert steps.min() > 0.3 * steps.mean()


def test_the_diverging_map_is_lightest_in_the_middle() -> None:
    lightness = lab(colour_maps()["vik"].stops)[:, 0]
    assert lightness.argmax() in (15, 16)
    assert (np.diff(lightness[:15]) > 0).all()
    assert (np.diff(lightness[17:]) < 0).all()


@pytest.mark.parametrize("name", colour_maps())
def test_a_colour_is_read_back(name: str) -> None:
    """From 8-bit pixels to within half a per cent of the range; what is not of the map says so by its distance."""
    fraction = np.linspace(0, 1, 500)
    exact = srgb_from_linear(colours_at(colour_maps()[name], fraction))
    found, distance = fractions_of(colour_maps()[name], np.round(exact * 255) / 255)
    assert np.abs(found - fraction).max() < 0.005
    assert distance.max() < 0.005
    assert fractions_of(colour_maps()[name], np.array([(0.0, 1.0, 0.0)]))[1] > 0.2


def test_colours_beyond_the_ends_are_those_of_the_ends() -> None:
    colour_map = colour_maps()["lipari"]
    np.testing.assert_array_equal(colours_at(colour_map, np.array([-1.0, 2.0])), colour_map.stops[[0, -1]])


@pytest.mark.parametrize(
    ("low", "high", "unit", "labels"),
    [
        (298.15, 334.2, CELSIUS, ["25", "30", "35", "40", "45", "50", "55", "60"]),
        (262.1, 275.0, CELSIUS, ["−10", "−8", "−6", "−4", "−2", "0"]),
        (298.15, 298.35, CELSIUS, ["25.00", "25.05", "25.10", "25.15", "25.20"]),
        (300.0, 900.0, KELVIN, ["300", "400", "500", "600", "700", "800", "900"]),
        (290.0, 400.0, FAHRENHEIT, ["100", "150", "200", "250"]),
    ],
)
def test_ticks_are_round_numbers_of_the_unit(low: float, high: float, unit: Unit, labels: list[str]) -> None:
    scale = spanning(low, high, unit, colour_maps()["lipari"])
    assert [tick.label for tick in scale.ticks()] == labels
    for tick in scale.ticks():
        assert scale.fractions(np.array(tick.temperature)) == pytest.approx(tick.fraction, abs=1e-9)
        assert unit.degrees(tick.temperature) == pytest.approx(float(tick.label.replace("−", "-")), abs=1e-9)


def test_every_scale_has_some_ticks_and_not_too_many() -> None:
    spans = np.geomspace(0.01, 3000, 200)
    counts = [len(spanning(290.0, 290.0 + span, CELSIUS, colour_maps()["lipari"]).ticks()) for span in spans]
    assert min(counts) >= 3
    assert max(counts) <= 9


def test_one_temperature_still_has_a_scale() -> None:
    scale = spanning(300.0, 300.0, KELVIN, colour_maps()["lipari"])
    assert scale.low < 300.0 < scale.high
    assert scale.fractions(np.array(300.0)) == pytest.approx(0.5)
    assert len(scale.ticks()) > 1


def test_steps_are_one_two_or_five() -> None:
    assert [round_step(least) for least in (0.7, 1.0, 1.1, 3.0, 5.1, 40.0)] == [1.0, 1.0, 2.0, 5.0, 10.0, 50.0]


def test_temperatures_are_written_in_their_unit() -> None:
    assert CELSIUS.text(334.45) == "61.3 °C"
    assert CELSIUS.text(273.14) == "0.0 °C"
    assert FAHRENHEIT.text(273.15) == "32.0 °F"
    assert CELSIUS.text(253.15) == "−20.0 °C"
    assert FAHRENHEIT.kelvin(212.0) == pytest.approx(373.15)
