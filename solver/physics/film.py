"""Film coefficients from correlations: how the fluid around a surface carries heat off it.

A correlation speaks of a whole surface at one temperature; here it is applied at each point with the temperature of
that point, as if the whole surface had it. Properties are taken at the film temperature, halfway between the surface
and the ambient fluid, and held constant beyond the ends of their tables. Surface temperatures may be complex, which is
how slopes are had.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..case import Convection
from ..errors import Trouble
from . import nusselt
from .fluids import Fluid, fluid_named
from .patch import Patch, area_over_rim, cylinder_diameter, height, longer_side, plate_run, sphere_diameter
from .regimes import Facing, Forced, Inclined, Natural, Regime, Sloped, film_at, outside

# K. Points closer to the ambient temperature than this exchange too little heat to remark on.
WORTH_A_REMARK = 1.0

# Faces that lean from the vertical by more than 60° are measured as level ones; a hair more, so that the triangles of a
# plate at just that angle stay together.
LEVEL = np.sqrt(0.75) + 1e-6


@dataclass(frozen=True)
class FilmLaw:
    """The film coefficient of a tag over its surface temperature. The heat into the part is h (ambient - T)."""

    fluid: Fluid
    ambient: float
    regime: Regime

    def coefficient(self, temperature: np.ndarray, facet: np.ndarray) -> np.ndarray:
        """(P,) W/(m2 K) at points with surface ``temperature`` (P,) K, real or complex, on triangles ``facet`` (P,)."""
        return self.regime.coefficient(film_at(self.fluid, self.ambient, temperature), facet)

    def remarks(self, temperature: np.ndarray, facet: np.ndarray) -> list[str]:
        """A sentence for each number outside a formula's or a table's range at the points given, as above."""
        telling = np.abs(temperature - self.ambient) > WORTH_A_REMARK
        film = film_at(self.fluid, self.ambient, temperature[telling])
        mean = (temperature + self.ambient) / 2
        table = (self.fluid.lowest, self.fluid.highest)
        return [
            *outside("film temperature in kelvin", mean, table, f"the properties of {self.fluid.name}"),
            *self.regime.remarks(film, facet[telling]),
        ]


def film_law(convection: Convection, patch: Patch) -> FilmLaw:
    """The law of a tag whose convection names a correlation.

    Raises Trouble of kind "case" when the fluid is unknown, or when a length that is not given cannot be measured.
    """
    regime = REGIMES[convection.correlation or ""](convection, patch)
    return FilmLaw(fluid_named(convection.fluid or "air"), convection.ambient, regime)


# From the case's convection and the tag's faces to a regime ----------------------------------------------------------


def _vertical_plate(convection: Convection, faces: Patch) -> Regime:
    """Length: the plate's height, by default the tag's extent along gravity."""
    length = _given_or_measured(convection, "length", height, faces, "they are level")
    return Natural(nusselt.VERTICAL_PLATE, _everywhere(length, faces), _everywhere(1.0, faces))


def _inclined_plate(convection: Convection, faces: Patch) -> Regime:
    """Length: the plate's run, by default the tag's extent along gravity over the mean cosine of its lean."""
    length = _given_or_measured(convection, "length", plate_run, faces, "they are level")
    return Inclined(Natural(nusselt.INCLINED_PLATE, _everywhere(length, faces), faces.along))


def _horizontal_plate(convection: Convection, faces: Patch) -> Regime:
    """Length: area over perimeter, by default measured on the whole tag."""
    length = _given_or_measured(convection, "length", area_over_rim, faces, "they close on themselves")
    return _level(_everywhere(length, faces), _everywhere(1.0, faces), faces)


def _level(length: np.ndarray, share: np.ndarray, faces: Patch) -> Facing:
    return Facing(
        upward=faces.upward,
        free=Natural(nusselt.LEVEL_PLATE_FREE, length, share),
        trapped=Natural(nusselt.LEVEL_PLATE_TRAPPED, length, share),
    )


def _horizontal_cylinder(convection: Convection, faces: Patch) -> Regime:
    diameter = _given_or_measured(convection, "diameter", cylinder_diameter, faces, "they are flat")
    return Natural(nusselt.HORIZONTAL_CYLINDER, _everywhere(diameter, faces), _everywhere(1.0, faces))


def _sphere(convection: Convection, faces: Patch) -> Regime:
    diameter = _given_or_measured(convection, "diameter", sphere_diameter, faces, "they are flat")
    return Natural(nusselt.SPHERE, _everywhere(diameter, faces), _everywhere(1.0, faces))


def _fin_channel(convection: Convection, faces: Patch) -> Regime:
    """Length: the channel's height, by default the tag's extent along gravity."""
    length = _given_or_measured(convection, "length", height, faces, "they are level")
    gap = _given(convection, "gap")
    return Natural(nusselt.FIN_CHANNEL, _everywhere(gap, faces), _everywhere(gap / length, faces))


def _flat_plate_flow(convection: Convection, faces: Patch) -> Regime:
    """Length: the run along the flow, by default the tag's longer side, which errs towards a warmer part."""
    length = _given_or_measured(convection, "length", longer_side, faces, "they have no size")
    return Forced(nusselt.FLAT_PLATE_FLOW, length, _given(convection, "speed"))


def _cylinder_crossflow(convection: Convection, faces: Patch) -> Regime:
    diameter = _given_or_measured(convection, "diameter", cylinder_diameter, faces, "they are flat")
    return Forced(nusselt.CYLINDER_CROSSFLOW, diameter, _given(convection, "speed"))


def _natural(convection: Convection, faces: Patch) -> Regime:
    """Each face by its own slope; lengths measured on the faces of like slope together, or as given for all.

    Every face is judged as if it stood free: air that chokes between close fins is what the fin channel is for.
    """
    if convection.length is None:
        run, breadth = _lengths_by_slope(faces)
    else:
        run = breadth = _everywhere(convection.length, faces)
    plate = Natural(nusselt.INCLINED_PLATE, run, faces.along)
    return Sloped(plate, _level(breadth, np.abs(faces.upward), faces))


def _lengths_by_slope(faces: Patch) -> tuple[np.ndarray, np.ndarray]:
    """(B,) the run of a plate and the area over perimeter, in m, that each face is to be judged by.

    Measured on three groups: faces within 60° of upright, faces looking up, and faces looking down. Of upright faces
    the run is measured; of level ones the area over perimeter. Where one cannot be had it follows from the other as on
    a square plate, the side of which is four times its area over perimeter.
    """
    run, breadth = np.zeros(len(faces.areas)), np.zeros(len(faces.areas))
    upright = np.abs(faces.upward) <= LEVEL
    for group in (upright, ~upright & (faces.upward > 0), ~upright & (faces.upward < 0)):
        if group.any():
            alike = faces.only(group)
            breadth[group] = area_over_rim(alike)
            run[group] = plate_run(alike) if group is upright else 4 * breadth[group]
    if not (run > 0).all():
        raise _unmeasured("natural", "length", "they have no rim")
    return run, np.where(breadth > 0, breadth, run / 4)


REGIMES: dict[str, Callable[[Convection, Patch], Regime]] = {
    "natural": _natural,
    "vertical_plate": _vertical_plate,
    "horizontal_plate": _horizontal_plate,
    "inclined_plate": _inclined_plate,
    "horizontal_cylinder": _horizontal_cylinder,
    "sphere": _sphere,
    "fin_channel": _fin_channel,
    "flat_plate_flow": _flat_plate_flow,
    "cylinder_crossflow": _cylinder_crossflow,
}


def _everywhere(value: float, faces: Patch) -> np.ndarray:
    return np.full(len(faces.areas), value)


def _given(convection: Convection, key: str) -> float:
    value = getattr(convection, key)
    if value is None:
        raise Trouble("case", f"The correlation {convection.correlation} needs a {key}.", f"Give convection.{key}.")
    return float(value)


def _given_or_measured(
    convection: Convection, key: str, measure: Callable[[Patch], float], faces: Patch, obstacle: str
) -> float:
    if getattr(convection, key) is not None:
        return _given(convection, key)
    measured = measure(faces)
    if measured > 0:
        return measured
    raise _unmeasured(convection.correlation, key, obstacle)


def _unmeasured(correlation: str | None, key: str, obstacle: str) -> Trouble:
    return Trouble(
        "case",
        f"The correlation {correlation} needs a {key}, and none can be measured on the faces: {obstacle}.",
        f"Give convection.{key}.",
    )
