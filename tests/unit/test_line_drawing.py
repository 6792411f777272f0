"""Framing and the lines of the picture, on shapes whose lines are known."""

from __future__ import annotations

import numpy as np
import pytest
from fluxface.addon.view.framing import Frame, framed, looking
from fluxface.addon.view.lines import drawn_edges, edges_of, isotherms, outside, ribbons

CORNERS = np.array([(x, y, z) for x in (0.0, 1.0) for y in (0.0, 1.0) for z in (0.0, 1.0)])
QUADS = np.array([(0, 1, 3, 2), (4, 6, 7, 5), (0, 4, 5, 1), (2, 3, 7, 6), (0, 2, 6, 4), (1, 5, 7, 3)])
CUBE = np.concatenate([QUADS[:, (0, 1, 2)], QUADS[:, (0, 2, 3)]])
WINDOW = (40.0, 30.0, 440.0, 280.0)


@pytest.fixture
def frame() -> Frame:
    return framed(CORNERS, looking(np.array((0.6, -0.9, 0.5))), (500, 300), WINDOW)


def test_the_parts_fill_the_window_and_stay_in_it(frame: Frame) -> None:
    pixels = frame.pixels(CORNERS)
    low, high = pixels.min(axis=0), pixels.max(axis=0)
    np.testing.assert_allclose((low + high) / 2, (240.0, 155.0), atol=1e-9)
    assert (low >= np.array(WINDOW[:2]) - 1e-9).all()
    assert (high <= np.array(WINDOW[2:]) + 1e-9).all()
    np.testing.assert_allclose(((high - low) / (400.0, 250.0)).max(), 1.0)


def test_axes_are_upright_and_at_right_angles() -> None:
    for towards_eye in ((0.6, -0.9, 0.5), (0.0, 0.0, 1.0), (0.0, 0.0, -2.0)):
        axes = looking(np.array(towards_eye))
        np.testing.assert_allclose(axes @ axes.T, np.eye(3), atol=1e-12)
        assert np.linalg.det(axes) == pytest.approx(1.0)
        assert axes[1, 2] >= 0


def test_what_is_drawn_on_the_pane_is_seen_at_its_pixel(frame: Frame) -> None:
    pixels = np.array([(0.0, 0.0), (500.0, 300.0), (123.0, 45.0)])
    pane = frame.pane(0.3)
    places = np.column_stack([pixels, np.zeros(3), np.ones(3)]) @ pane.T
    np.testing.assert_allclose(frame.pixels(places[:, :3]), pixels, atol=1e-9)


def test_a_cube_seen_from_before_a_corner_has_six_outlines_and_three_creases(frame: Frame) -> None:
    assert len(edges_of(CUBE)[0]) == 18
    creases, outlines = drawn_edges(CORNERS, CUBE, frame.eye)
    assert len(creases) == 3
    assert len(outlines) == 6
    nearest = np.linalg.norm(CORNERS - frame.eye, axis=1).argmin()
    assert (creases == nearest).any(axis=1).all()
    np.testing.assert_allclose(np.linalg.norm(np.diff(CORNERS[creases], axis=1), axis=2), 1.0)


def test_facets_of_a_rounded_surface_are_no_creases() -> None:
    """A prism of 24 sides: its rims are creases, the edges between sides (15 degrees) are not."""
    angle = 2 * np.pi * np.arange(24) / 24
    ring = np.stack([np.cos(angle), np.sin(angle)], axis=1)
    places = np.concatenate([np.column_stack([ring, np.full(24, z)]) for z in (0.0, 1.0)] + [[(0, 0, 0), (0, 0, 1)]])
    here, there = np.arange(24), np.roll(np.arange(24), -1)
    sides = [np.stack(corner, 1) for corner in ((here, there, there + 24), (here, there + 24, here + 24))]
    lids = [np.stack([there, here, np.full(24, 48)], 1), np.stack([here + 24, there + 24, np.full(24, 49)], 1)]
    creases, outlines = drawn_edges(places, np.concatenate(sides + lids), np.array((10.0, 1.0, 5.0)))
    assert (places[creases][:, 0, 2] == places[creases][:, 1, 2]).all()
    upright = places[outlines][:, 0, 2] != places[outlines][:, 1, 2]
    assert upright.sum() == 2


def test_isotherms_of_a_linear_field_are_straight() -> None:
    """T = 300 + 10 x + 20 y + 30 z on the cube: the level 321 is a plane, and it crosses every side it should."""
    temperature = 300 + CORNERS @ (10.0, 20.0, 30.0)
    segments, level = isotherms(CORNERS, CUBE, temperature, [321.0, 500.0])
    assert (level == 321.0).all()
    np.testing.assert_allclose(300 + segments @ (10.0, 20.0, 30.0), 321.0, atol=1e-9)
    # Closed: every end is the end of two segments.
    ends = np.unique(np.round(segments.reshape(-1, 3), 9), axis=0, return_counts=True)[1]
    assert (ends == 2).all()


def test_lines_end_at_the_ring(frame: Frame) -> None:
    across = np.stack([CORNERS[0], CORNERS[7]])[None]
    centre = frame.pixels(across[0]).mean(axis=0)
    pieces, which = outside(across, frame, centre, 20.0)
    assert len(pieces) == 2
    assert (which == 0).all()
    from_centre = np.linalg.norm(frame.pixels(pieces) - centre, axis=-1)
    np.testing.assert_allclose(from_centre.min(axis=1), 20.0, atol=1e-9)
    untouched, _ = outside(across, frame, centre + 100.0, 20.0)
    np.testing.assert_array_equal(untouched, across)
    assert len(outside(across, frame, centre, 1e4)[0]) == 0


def test_ribbons_are_as_wide_as_told_and_where_the_line_is(frame: Frame) -> None:
    segments = CORNERS[[(0, 4), (0, 2), (3, 7)]]
    places, triangles = ribbons(segments, frame, 3.0)
    assert places.shape == (12, 3)
    assert triangles.shape == (6, 3)
    corners = frame.pixels(places).reshape(3, 2, 2, 2)
    np.testing.assert_allclose(np.linalg.norm(corners[:, :, 0] - corners[:, :, 1], axis=-1), 3.0, rtol=0.05)
    np.testing.assert_allclose(corners.mean(axis=2), frame.pixels(segments), atol=3.0)
    assert (np.linalg.norm(places.reshape(3, 4, 3) - frame.eye, axis=2).max(axis=1)
            < np.linalg.norm(segments - frame.eye, axis=2).max(axis=1)).all()  # fmt: skip
