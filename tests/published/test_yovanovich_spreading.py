"""Spreading resistance: a rectangle that releases heat evenly on a plate cooled by a film at its back.

Yovanovich, Muzychka & Culham, Spreading resistance of isoflux rectangles and strips on compound flux channels,
J. Thermophysics and Heat Transfer 13 (1999) 495-500; off the centre: Muzychka, Culham & Yovanovich, Thermal spreading
resistance of eccentric heat sources on rectangular flux channels, J. Electronic Packaging 125 (2003) 178-185. The
dimensions are invented; the values are those of the papers' double series, evaluated here once more.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pytest
from fluxface.solver.case import Accuracy, Case, Contact, Convection, Part, Tag
from fluxface.solver.materials import Material
from probe import ZERO_CELSIUS, Solved, solved
from shapes import assembly, blocks, box, tagged, within

PLATE, SOURCE = (0.100, 0.080), (0.020, 0.010)  # m
HEAT, FILM, AMBIENT = 40.0, 150.0, ZERO_CELSIUS + 25.0  # W, W/(m2 K), K
SINGLE = ((0.008, 180.0),)  # thickness (m) and conductivity (W/(m K)) of each layer, from the source downwards
DOUBLE = ((0.001, 390.0), (0.007, 180.0))
CENTRE = (0.05, 0.04)


def spreading_series(
    layers: Sequence[tuple[float, float]],
    centre: tuple[float, float],
    conductance: float = np.inf,
    at: tuple[float, float] | None = None,
    terms: int = 2000,
) -> float:
    """K above the ambient: the mean over the source, or the value at a point of the face.

    Of each cosine mode of the plate the flux is 1 where the source is; the temperature it makes is that flux times an
    impedance, carried from the film upwards through the layers (and a contact between them) by the hyperbolic tangent.
    """
    m, n = np.arange(terms)[:, None], np.arange(terms)[None, :]
    wave = [np.pi * index / length for index, length in zip((m, n), PLATE, strict=True)]
    shape = [
        np.cos(p * middle) * np.sinc(p * width / (2.0 * np.pi))
        for p, middle, width in zip(wave, centre, SOURCE, strict=True)
    ]
    decay = np.hypot(*wave)
    decay[0, 0] = 1.0
    impedance = np.full(decay.shape, 1.0 / FILM)
    for index, (thickness, conductivity) in enumerate(reversed(layers)):
        own, through = 1.0 / (conductivity * decay), np.tanh(decay * thickness)
        uniform = impedance[0, 0] + thickness / conductivity
        impedance = own * (impedance + own * through) / (own + impedance * through)
        impedance[0, 0] = uniform
        if index + 1 < len(layers):
            impedance += 1.0 / conductance
    weight = np.where(m == 0, 1.0, 2.0) * np.where(n == 0, 1.0, 2.0) * shape[0] * shape[1] * impedance
    seen = shape if at is None else [np.cos(p * place) for p, place in zip(wave, at, strict=True)]
    return float(HEAT / (PLATE[0] * PLATE[1]) * np.sum(weight * seen[0] * seen[1]))


def heated_plate(
    layers: Sequence[tuple[float, float]],
    centre: tuple[float, float],
    contact: Contact | None,
    size: float,
    folder: Path,
) -> Solved:
    """The plate in its layers, the top one bearing the source, at whose edge the flux jumps: it is finer there."""
    heights = np.cumsum([0.0] + [thickness for thickness, _ in reversed(layers)])
    lines = []
    for length, width, middle in zip(PLATE, SOURCE, centre, strict=True):
        edges = middle - width / 2, middle + width / 2
        near = [edge + step for edge in edges for step in (-0.0025, 0.0, 0.0025)]
        lines.append(np.array([0.0, *near, length]))
    top = blocks(*lines, heights[-2:])
    low = centre[0] - SOURCE[0] / 2, centre[1] - SOURCE[1] / 2, heights[-1] - 1e-6
    top = tagged(top, 0, within(low, (low[0] + SOURCE[0], low[1] + SOURCE[1], np.inf)))
    lower = zip(layers[:0:-1], heights, strict=False)
    slabs = [box((*PLATE, thickness), at=(0, 0, base)) for (thickness, _), base in lower]
    plate = assembly(*slabs, top)
    bottom = tagged(plate, 1, lambda centres, normals: (normals[:, 2] < -0.5) & (centres[:, 2] < 1e-6))
    parts = tuple(Part(f"layer {i}", Material(f"layer {i}", (k,))) for i, (_, k) in enumerate(reversed(layers)))
    tags = Tag("source", heat=HEAT), Tag("sink", convection=Convection(AMBIENT, coefficient=FILM))
    contacts = () if contact is None else (contact,)
    return solved(Case(bottom, parts, tags, contacts=contacts, accuracy=Accuracy(size=size)), folder)


def test_source_in_the_middle(tmp_path: Path) -> None:
    """Means, the hottest point, and the parts of the resistance."""
    plate = heated_plate(SINGLE, CENTRE, None, 0.003, tmp_path)
    mean, hottest = spreading_series(SINGLE, CENTRE), spreading_series(SINGLE, CENTRE, at=CENTRE)
    assert (mean, hottest) == pytest.approx((41.4291, 42.9493), rel=1e-5)
    rise = plate.tag("source")["mean"] - AMBIENT
    assert rise == pytest.approx(mean, rel=1e-3)
    assert plate.kelvin([(*CENTRE, 0.008)]) - AMBIENT == pytest.approx(hottest, rel=1e-3)
    assert plate.summary["hottest"]["temperature"] - AMBIENT == pytest.approx(hottest, rel=1e-3)
    assert rise / HEAT == pytest.approx(1.03573, rel=1e-3)

    # The mean of the whole upper face rises as if the heat were spread evenly over it, on any mesh.
    area = PLATE[0] * PLATE[1]
    flat = 0.008 / (180.0 * area) + 1.0 / (FILM * area)
    assert flat == pytest.approx(0.838889, abs=1e-6)
    field = plate.field
    upper = field.boundary[(field.nodes[field.boundary, 2] > 0.008 - 1e-9).all(axis=1)]
    corners = field.nodes[upper[:, :3]]
    areas = 0.5 * np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1)
    # On a 6-node triangle the mid-sides alone weigh, each by a third.
    whole_mean = areas @ field.temperature[upper[:, 3:]].mean(axis=1) / areas.sum()
    assert (whole_mean - AMBIENT) / HEAT == pytest.approx(flat, abs=1e-6)
    assert (rise - (whole_mean - AMBIENT)) / HEAT == pytest.approx(0.196839, rel=5e-3)


def test_source_off_the_middle(tmp_path: Path) -> None:
    plate = heated_plate(SINGLE, (0.030, 0.025), None, 0.003, tmp_path)
    exact = spreading_series(SINGLE, (0.030, 0.025))
    assert exact == pytest.approx(43.6224, rel=1e-5)
    assert plate.tag("source")["mean"] - AMBIENT == pytest.approx(exact, rel=1e-3)


@pytest.mark.slow
@pytest.mark.parametrize(("conductance", "published"), [(None, 39.8197), (1e4, 44.2126)], ids=["bonded", "in contact"])
def test_source_on_two_layers(tmp_path: Path, conductance: float | None, published: float) -> None:
    """A millimetre of copper's conductivity upon seven of aluminium's: a compound flux channel."""
    plate = heated_plate(DOUBLE, CENTRE, Contact((0, 1), conductance), 0.004, tmp_path)
    exact = spreading_series(DOUBLE, CENTRE, conductance or np.inf)
    assert exact == pytest.approx(published, rel=1e-5)
    assert plate.tag("source")["mean"] - AMBIENT == pytest.approx(exact, rel=2e-3)
