"""Between SI numbers and what the scene's unit settings show."""

from __future__ import annotations

import bpy
import numpy as np

# symbol, kelvin per degree, kelvin at zero degrees
TEMPERATURE_UNITS = {
    "KELVIN": ("K", 1.0, 0.0),
    "CELSIUS": ("°C", 1.0, 273.15),
    "FAHRENHEIT": ("°F", 5.0 / 9.0, 273.15 - 32.0 * 5.0 / 9.0),
    # The host shows kelvin where it may choose.
    "ADAPTIVE": ("K", 1.0, 0.0),
}


def metres_per_unit(scene: bpy.types.Scene) -> float:
    """Metres in one unit of length of the scene; as in the host's fields, the scale counts only with a unit system."""
    settings = scene.unit_settings
    return 1.0 if settings.system == "NONE" else settings.scale_length


def as_typed(value: float) -> float:
    """The decimal number that a single-precision property was given: 298.15, not 298.149993896."""
    return float(str(np.float32(value)))


def temperature_unit(scene: bpy.types.Scene) -> str:
    return TEMPERATURE_UNITS[scene.unit_settings.temperature_unit][0]


def from_kelvin(scene: bpy.types.Scene, kelvin: float) -> float:
    """A temperature in the scene's unit."""
    _, per_degree, zero = TEMPERATURE_UNITS[scene.unit_settings.temperature_unit]
    return (kelvin - zero) / per_degree


def temperature_text(scene: bpy.types.Scene, kelvin: float) -> str:
    """As in "61.3 °C"."""
    return f"{from_kelvin(scene, kelvin):.1f} {temperature_unit(scene)}"


def short_temperature_text(scene: bpy.types.Scene, kelvin: float) -> str:
    """A temperature somebody chose, without needless decimals, as in "25 °C"."""
    return f"{round(from_kelvin(scene, kelvin), 2):g} {temperature_unit(scene)}"


def span_text(scene: bpy.types.Scene, low: float, high: float) -> str:
    """Two temperatures (K) with one unit, as in "48.2 to 61.3 °C"."""
    return f"{from_kelvin(scene, low):.1f} to {temperature_text(scene, high)}"


def difference_text(scene: bpy.types.Scene, kelvin: float) -> str:
    """A temperature difference, as in "3.2 °C"."""
    symbol, per_degree, _ = TEMPERATURE_UNITS[scene.unit_settings.temperature_unit]
    return f"{kelvin / per_degree:.2g} {symbol}"


def signed_difference_text(scene: bpy.types.Scene, kelvin: float) -> str:
    """How much hotter, as in "+3.2 °C" and "−0.4 °C"."""
    symbol, per_degree, _ = TEMPERATURE_UNITS[scene.unit_settings.temperature_unit]
    return f"{round(kelvin / per_degree, 1) + 0.0:+.1f} {symbol}".replace("-", "−")


def area_text(scene: bpy.types.Scene, square_metres: float) -> str:
    """An area in the scene's unit system, as in "18.3 cm²"."""
    if scene.unit_settings.system == "IMPERIAL":
        return bpy.utils.units.to_string("IMPERIAL", "AREA", square_metres, precision=4)
    for unit, size in (("m²", 1.0), ("cm²", 1e-4), ("mm²", 1e-6)):
        if square_metres >= 0.1 * size and square_metres >= size * (unit == "cm²"):
            return f"{square_metres / size:.3g} {unit}"
    return f"{square_metres / 1e-6:.3g} mm²"


def length_text(scene: bpy.types.Scene, metres: float) -> str:
    """A length in the scene's unit system, as in "80 mm"."""
    if scene.unit_settings.system == "IMPERIAL":
        return bpy.utils.units.to_string("IMPERIAL", "LENGTH", metres, precision=4)
    return f"{metres:.4g} m" if metres >= 1.0 else f"{1e3 * metres:.4g} mm"


def volume_text(scene: bpy.types.Scene, cubic_metres: float) -> str:
    """A volume in the scene's unit system, as in "84.2 cm³"."""
    if scene.unit_settings.system == "IMPERIAL":
        return bpy.utils.units.to_string("IMPERIAL", "VOLUME", cubic_metres, precision=4)
    for unit, size in (("m³", 1.0), ("cm³", 1e-6)):
        if cubic_metres >= 0.1 * size:
            return f"{cubic_metres / size:.3g} {unit}"
    return f"{cubic_metres / 1e-9:.3g} mm³"


def mass_text(scene: bpy.types.Scene, kilograms: float) -> str:
    """A mass in the scene's unit system, as in "228 g"."""
    if scene.unit_settings.system == "IMPERIAL":
        return bpy.utils.units.to_string("IMPERIAL", "MASS", kilograms, precision=4)
    return f"{kilograms:.3g} kg" if kilograms >= 1.0 else f"{1e3 * kilograms:.3g} g"


def power_text(watts: float) -> str:
    """As in "12 W" and "−350 mW"; heat into the part is positive."""
    size = abs(watts)
    # Below a microwatt is the rounding of a sum of watts.
    number, unit = (watts, "W") if size >= 1 else (watts * 1e3, "mW") if size >= 1e-6 else (0.0, "W")
    return (f"{number:.3g} {unit}" if size < 1000 else f"{number:,.0f} {unit}").replace("-", "−")
