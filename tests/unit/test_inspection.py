"""What inspection finds on surfaces made to have one thing amiss: kinds, faces, places, and what they enclose.

Shapes are invented; volumes and areas are exact from their dimensions.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from fluxface.solver.case import Surface
from fluxface.solver.geometry.inspection import ERROR, Finding, bounds_solid, inspected, volume
from fluxface.solver.geometry.surface import weld
from fluxface.solver.geometry.tidying import chosen
from shapes import box, inside_out, merged, moved, surface_of

SIZE = (0.03, 0.02, 0.01)


def block() -> Surface:
    return box(SIZE, (3, 2, 1))


def found(surface: Surface, size: float | None = None) -> dict[str, Finding]:
    return {finding.kind: finding for finding in inspected(weld(surface), "block", size)}


def without(surface: Surface, *faces: int) -> Surface:
    return chosen(surface, ~np.isin(surface.face, faces))


def turned(surface: Surface, *faces: int) -> Surface:
    wrong = np.isin(surface.face, faces)
    return replace(surface, triangles=np.where(wrong[:, None], surface.triangles[:, ::-1], surface.triangles))


def with_triangles(surface: Surface, *corners: np.ndarray) -> Surface:
    """The surface and further triangles (3, 3) of face numbers 1000, 1001 ..."""
    more = surface_of(np.concatenate(corners), np.arange(3 * len(corners)).reshape(-1, 3))
    whole = merged(surface, more)
    return replace(whole, face=np.concatenate([surface.face, 1000 + more.face]))


def upright(x: float, y: float, z: float) -> np.ndarray:
    """A triangle in the plane of that y, wider than it is high, its middle below the point."""
    return np.array([[x - 0.004, y, z], [x + 0.004, y, z], [x, y, z + 0.006]])


def corners_of(surface: Surface, face: int) -> np.ndarray:
    return surface.vertices[np.unique(surface.triangles[surface.face == face])]


@pytest.mark.parametrize("scale", [1.0, 20.0, 300.0])
def test_nothing_is_said_of_a_sound_block(scale: float) -> None:
    assert found(moved(block(), scale=scale)) == {}


def test_an_open_block_is_told_with_its_faces_and_the_middles_of_its_open_edges() -> None:
    whole = block()
    open_edges = found(without(whole, 4))["open edges"]
    rim = corners_of(whole, 4)
    assert open_edges.severity == ERROR and "4 edges" in open_edges.message and "'block'" in open_edges.message
    points = np.array(open_edges.points)
    assert np.allclose(sorted(map(tuple, points.round(9))), sorted(map(tuple, _middles_of_rim(rim).round(9))))
    touching = {face for face in whole.face if len(_shared(whole, face, 4)) == 2} - {4}
    assert set(open_edges.faces) == touching


def _shared(surface: Surface, one: int, other: int) -> set[tuple[float, ...]]:
    return set(map(tuple, corners_of(surface, one))) & set(map(tuple, corners_of(surface, other)))


def _middles_of_rim(rim: np.ndarray) -> np.ndarray:
    """Of a rectangle's four sides: the midpoints between corners that differ in one coordinate."""
    pairs = [(p, q) for i, p in enumerate(rim) for q in rim[i + 1 :] if np.count_nonzero(np.abs(p - q) > 1e-9) == 1]
    return np.array([(p + q) / 2 for p, q in pairs])


def test_flipped_faces_are_told_by_number() -> None:
    flipped = found(turned(block(), 2, 7))["flipped faces"]
    assert flipped.faces == (2, 7) and "2 faces" in flipped.message and flipped.severity == ERROR


def test_a_block_inside_out_is_told_as_such() -> None:
    assert set(found(inside_out(block()))) == {"inside out"}


def test_doubled_faces_are_told_by_number() -> None:
    whole = block()
    extra = chosen(whole, whole.face == 5)
    doubled = found(merged(whole, replace(extra, face=np.zeros_like(extra.face))))["doubled faces"]
    assert len(doubled.faces) == 1 and doubled.severity == ERROR  # the second of the two is the one too many


def test_faces_without_an_area_and_needles_are_told_apart() -> None:
    flat = np.array([[0.0, 0, 0.02], [0.01, 0, 0.02], [0.02, 0, 0.02]])
    needle = np.array([[0.0, 0, 0.03], [0.02, 0, 0.03], [0.01, 5e-6, 0.03]])
    told = found(with_triangles(block(), flat, needle))
    assert told["flat faces"].faces == (1000,) and told["needle faces"].faces == (1001,)
    assert told["needle faces"].points[0] == pytest.approx(needle.mean(axis=0))


def test_faces_that_run_through_each_other_are_told_with_their_place() -> None:
    told = found(with_triangles(block(), upright(0.015, 0.013, 0.008)))["crossing faces"]
    assert 1000 in told.faces and told.severity == ERROR
    points = np.array(told.points)
    assert np.allclose(points[:, 1], 0.013) and np.allclose(points[:, 2], 0.01)  # on the head, under the triangle


def test_faces_upon_each_other_are_told() -> None:
    foot = moved(box((0.01, 0.01, 0.01)), (0.0033, 0.0021, 0.01))
    told = found(merged(block(), foot))
    assert "crossing faces" not in told and told["overlapping faces"].severity == ERROR
    assert np.allclose(np.array(told["overlapping faces"].points)[:, 2], 0.01)


def test_boxes_that_share_an_edge_bound_a_solid_and_are_told() -> None:
    pair = merged(box((0.01, 0.01, 0.01)), box((0.01, 0.01, 0.01), at=(0.01, 0.01, 0)))
    told = found(pair)
    assert bounds_solid(list(told.values())) and volume(weld(pair)) == pytest.approx(2e-6, rel=0.003)
    assert told["crowded edges"].points[0] == pytest.approx((0.01, 0.01, 0.005))


def test_boxes_that_share_a_vertex_are_two_bodies_of_a_sound_part() -> None:
    told = found(merged(box((0.01, 0.01, 0.01)), box((0.01, 0.01, 0.01), at=(0.01, 0.01, 0.01))))
    assert set(told) == {"separate shells"} and "2 separate bodies" in told["separate shells"].message


def test_a_shell_within_is_a_cavity_or_solid_by_where_it_looks() -> None:
    inner = box((0.01, 0.006, 0.004), at=(0.01, 0.007, 0.003))
    hollow, filled = found(merged(block(), inside_out(inner))), found(merged(block(), inner))
    assert set(hollow) == {"cavity"} and hollow["cavity"].severity == "note"
    assert set(filled) == {"nested solid"} and filled["nested solid"].severity == "warning"
    assert hollow["cavity"].faces == filled["nested solid"].faces == tuple(range(22, 28))
    assert volume(weld(merged(block(), inside_out(inner)))) == pytest.approx(6e-6 - 0.24e-6, rel=0.003)
    assert volume(weld(merged(block(), inner))) == pytest.approx(6e-6, rel=0.003)


def test_three_shells_in_each_other_alternate() -> None:
    """Solid, cavity, solid: the innermost stands free in the cavity and is a body of its own."""
    cavity = inside_out(box((0.02, 0.012, 0.006), at=(0.005, 0.004, 0.002)))
    core = box((0.01, 0.006, 0.002), at=(0.01, 0.007, 0.004))
    told = found(merged(block(), cavity, core))
    assert set(told) == {"cavity", "separate shells"}
    assert volume(weld(merged(block(), cavity, core))) == pytest.approx(6e-6 - 1.44e-6 + 0.12e-6, rel=0.003)


def test_thin_walls_are_told_against_the_size_that_is_chosen() -> None:
    plate = box((0.03, 0.02, 0.0004), (6, 4, 1))
    assert "thin walls" not in found(plate) and "thin walls" not in found(plate, size=0.0003)
    assert "down to 0.4 mm" in found(plate, size=0.004)["thin walls"].message


@pytest.mark.parametrize(("scale", "shown"), [(1e-4, "small"), (1000.0, "large")])
def test_an_unlikely_size_is_told_and_nothing_else(scale: float, shown: str) -> None:
    told = found(moved(block(), scale=scale))
    assert set(told) == {"unlikely size"} and shown in told["unlikely size"].message
    assert told["unlikely size"].severity == "warning"


def test_a_part_of_a_millimetre_is_not_unlikely() -> None:
    assert found(moved(block(), scale=1 / 30)) == {}


def test_ten_kilometres_from_the_origin_nothing_changes() -> None:
    """In double precision the positions there still hold 2e-12 m."""
    far = moved(without(block(), 4), (1e4, -1e4, 1e4))
    assert found(far)["open edges"].faces == found(without(block(), 4))["open edges"].faces
    assert found(moved(block(), (1e4, -1e4, 1e4))) == {}


def test_faces_bent_out_of_plane_are_sound() -> None:
    """A polygon that is not plane comes as triangles that are."""
    bent = block()
    corner = np.linalg.norm(bent.vertices - [0.03, 0.02, 0.01], axis=1) < 1e-9
    assert found(replace(bent, vertices=bent.vertices + 0.002 * corner[:, None])) == {}
