"""Filling a surface with tetrahedra: what is modelled is what is solved.

Areas and volumes are those of the facets themselves, so the mesh must have them to rounding.
"""

from __future__ import annotations

import os
import stat
import sys
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from cases import mesh_of
from fluxface.solver.case import Accuracy, Surface, Tag
from fluxface.solver.errors import Trouble
from fluxface.solver.fem.mesh import CELL_EDGES, Mesh
from fluxface.solver.fem.volume import geometry
from fluxface.solver.geometry import apart, tetrahedra
from fluxface.solver.geometry.edges import edges_of
from fluxface.solver.geometry.sizing import sizes_at
from fluxface.solver.geometry.splitting import split_to_size
from fluxface.solver.geometry.surface import area_vectors, areas, distances, enclosed_volume, triangle_corners, weld
from fluxface.solver.geometry.tetrahedra import fill
from shapes import (
    blocks,
    box,
    centres_and_normals,
    facing,
    hollow_sphere,
    inside_out,
    irregular_solid,
    merged,
    moved,
    prism,
    rotation,
    sphere,
    tagged,
    tube,
)


def with_tags(surface: Surface) -> Surface:
    """Tags -1, 0, 1, 2 in turn over the faces."""
    return replace(surface, tag=(surface.face % 4 - 1).astype(np.int32))


def finned() -> Surface:
    filled = np.ones((7, 1, 2), bool)
    filled[1::2, :, 1] = False
    return blocks(np.linspace(0, 0.07, 8), np.array([0, 0.03]), np.array([0, 0.008, 0.04]), filled)


def nested() -> Surface:
    """A ball within the cavity of a hollow one: two bodies, one part."""
    return merged(hollow_sphere(0.02, 0.03, 1), sphere(0.01, 1))


UNIT_BOX = box((0.01, 0.01, 0.01))

SHAPES = {
    "box": box((0.02, 0.05, 0.01), (2, 3, 1)),
    "irregular": irregular_solid(),
    "finned": finned(),
    "tube": tube(0.01, 0.02, 0.03, 16),
    "hollow ball": hollow_sphere(0.01, 0.02, 2),
    "nested balls": nested(),
    "thin plate": box((0.05, 0.05, 0.0005)),
    "edge to edge": merged(UNIT_BOX, moved(UNIT_BOX, (0.01, 0.01, 0))),
    "corner to corner": merged(UNIT_BOX, moved(UNIT_BOX, (0.01, 0.01, 0.01))),
    "apart": merged(UNIT_BOX, moved(UNIT_BOX, (0.03, 0, 0))),
    "1 mm part": moved(irregular_solid(), scale=0.01),
    "1 micrometre part": moved(irregular_solid(), scale=1e-5),
    "10 km from the origin": moved(irregular_solid(), shift=(7000.0, -6000.0, 4000.0)),
    "100 m part": moved(irregular_solid(), scale=1e3, turn=rotation((1, 2, 3), 40)),
}
every_shape = pytest.mark.parametrize("name", SHAPES)


def boundary_corners(mesh: Mesh) -> np.ndarray:
    return mesh.nodes[mesh.boundary[:, :3]]


def filled(surface: Surface) -> Mesh:
    """Coarse: about a tenth of the part's extent."""
    return mesh_of(surface, 1, 0.1 * float(np.ptp(surface.vertices, axis=0).max()))


def placed_to(surface: Surface) -> float:
    """What rounding of the positions alone may change an area or a volume by, as a share."""
    return 1e-12 + 50 * np.finfo(float).eps * float(
        np.abs(surface.vertices).max() / np.ptp(surface.vertices, axis=0).min()
    )


@cache
def filled_shape(name: str) -> Mesh:
    return filled(with_tags(SHAPES[name]))


@every_shape
def test_volume_and_the_area_of_every_face_and_tag_are_exact(name: str) -> None:
    surface, mesh = with_tags(SHAPES[name]), filled_shape(name)
    tolerance = placed_to(surface)
    shape = geometry(mesh)
    assert shape.volume.min() > 0
    assert shape.volume.sum() == pytest.approx(enclosed_volume(triangle_corners(surface)), rel=tolerance)
    meshed, modelled = areas(boundary_corners(mesh)), areas(triangle_corners(surface))
    for of_mesh, of_model in ((mesh.boundary_tag, surface.tag), (mesh.boundary_face, surface.face)):
        low = of_model.min()
        np.testing.assert_allclose(
            np.bincount(of_mesh - low, meshed), np.bincount(of_model - low, modelled), rtol=tolerance
        )


@every_shape
def test_boundary_is_closed_and_looks_outward(name: str) -> None:
    mesh = filled_shape(name)
    ends = np.stack([mesh.boundary, np.roll(mesh.boundary, -1, axis=1)], axis=2).reshape(-1, 2).astype(np.int64)
    forth, back = ends @ [len(mesh.nodes), 1], ends @ [1, len(mesh.nodes)]
    np.testing.assert_array_equal(np.sort(forth), np.sort(back))
    assert enclosed_volume(boundary_corners(mesh)) == pytest.approx(geometry(mesh).volume.sum(), rel=1e-9)


@every_shape
def test_every_boundary_triangle_lies_on_the_face_it_names(name: str) -> None:
    surface, mesh = SHAPES[name], filled_shape(name)
    first = np.zeros(surface.face.max() + 1, int)
    first[surface.face] = np.arange(len(surface.face))
    modelled = triangle_corners(surface)[first[mesh.boundary_face]]
    normal = area_vectors(modelled)
    normal /= np.linalg.norm(normal, axis=1, keepdims=True)
    height = np.einsum("bci,bi->bc", boundary_corners(mesh) - modelled[:, :1], normal)
    extent = np.ptp(surface.vertices, axis=0).max()
    assert np.abs(height).max() <= 1e-9 * extent
    looks = area_vectors(boundary_corners(mesh))
    assert (np.einsum("bi,bi->b", looks, normal) > 0.999 * np.linalg.norm(looks, axis=1)).all()


def test_cavities_stay_empty() -> None:
    """No cell's centre lies in a cavity, and the ball in it is filled."""
    mesh = filled(nested())
    distance = np.linalg.norm(mesh.nodes[mesh.cells].mean(axis=1), axis=1)
    in_cavity = (distance > 0.01) & (distance < 0.02 * 0.9)
    assert not in_cavity.any()
    assert (distance < 0.01).any() and (distance > 0.02 * 0.9).any()


def test_a_cavity_within_a_cavity() -> None:
    """Four shells in turn solid and hollow."""
    surface = merged(hollow_sphere(0.03, 0.04, 1), hollow_sphere(0.01, 0.02, 1))
    assert geometry(filled(surface)).volume.sum() == pytest.approx(
        enclosed_volume(triangle_corners(surface)), rel=1e-12
    )


def mean_edge(mesh: Mesh) -> float:
    ends = np.unique(np.sort(mesh.cells[:, CELL_EDGES].reshape(-1, 2), axis=1), axis=0)
    return float(np.linalg.norm(mesh.nodes[ends[:, 1]] - mesh.nodes[ends[:, 0]], axis=1).mean())


@pytest.mark.parametrize("size", [0.012, 0.006, 0.004])
@pytest.mark.parametrize(
    "surface", [box((0.1, 0.06, 0.05)), irregular_solid(), sphere(0.04, 2)], ids=["box", "irregular", "ball"]
)
def test_size_asked_for_is_the_mean_edge(surface: Surface, size: float) -> None:
    assert mean_edge(mesh_of(surface, 1, size)) == pytest.approx(size, rel=0.1)


# Sizes that differ from place to place --------------------------------------------------------------------------------

PATCH = box((0.05, 0.05, 0.015), (5, 5, 1))


def patched() -> Surface:
    """A block with tag 0 on 1 cm2 in the middle of its top."""
    return tagged(
        PATCH, 0, lambda centres, normals: (np.abs(centres - 0.025)[:, :2] < 0.005).all(1) & (normals[:, 2] > 0)
    )


def edges_on(mesh: Mesh, tag: int) -> np.ndarray:
    """m, the length of each edge of the boundary's triangles of a tag."""
    corners = mesh.nodes[mesh.boundary[mesh.boundary_tag == tag]]
    return np.linalg.norm(np.roll(corners, -1, axis=1) - corners, axis=2)


def halved_to(size: float, lengths: np.ndarray) -> bool:
    """Whether the mean edge is a size as nearly as halving can: a factor of the square root of 2 from end to end."""
    return 2**-0.5 < float(lengths.mean() / size) < 2**0.5 and bool(lengths.max() < 1.5 * size)


def sized(tag: Tag, size: float | None = None) -> tuple[Mesh, Mesh]:
    """The patched block as it comes without the tag's doing, and with it."""
    surface, accuracy = weld(patched()), Accuracy(1, size)
    finest = sizes_at(surface, [tag], Tag("untagged"), size is None)
    return fill(surface, "part", 0, accuracy), fill(surface, "part", 0, accuracy, finest)


@pytest.mark.parametrize("size", [None, 0.005])
def test_size_on_a_tag_is_the_mean_edge_there_and_costs_little_elsewhere(size: float | None) -> None:
    plain, fine = sized(Tag("patch", size=0.0005), size)
    assert halved_to(0.0005, edges_on(fine, 0))
    assert edges_on(fine, -1).mean() > 2 * edges_on(fine, 0).mean()
    assert geometry(fine).volume.sum() == pytest.approx(0.05 * 0.05 * 0.015, rel=1e-12)
    # As fine throughout, the block would take 17 million cells.
    assert len(fine.cells) < len(plain.cells) + 40_000


def test_a_patch_that_brings_heat_in_is_refined_unless_a_size_is_given() -> None:
    plain, fine = sized(Tag("patch", heat=1.0))
    assert edges_on(fine, 0).max() <= 0.001 * 1.0001 < edges_on(plain, 0).max()
    assert len(fine.cells) < 1.5 * len(plain.cells)
    plain, fine = sized(Tag("patch", heat=1.0), 0.004)
    np.testing.assert_array_equal(plain.cells, fine.cells)


@pytest.mark.parametrize("thickness", [0.001, 0.0005, 0.0003])
def test_a_thin_plate_takes_as_many_nodes_as_a_block(thickness: float) -> None:
    assert len(mesh_of(box((0.2, 0.2, thickness)), 2).nodes) < 60_000


def test_size_asked_for_holds_along_a_thin_plate() -> None:
    """As far as halving and the small triangles along the rim let it: no edge is much longer, and the mean is 0.62."""
    lengths = edges_on(mesh_of(tagged(box((0.1, 0.1, 0.0005)), 0, facing("+z")), 1, 0.003), 0)
    assert lengths.max() < 1.5 * 0.003 and lengths.mean() > 0.5 * 0.003


def test_a_fine_tag_on_a_thin_wall_around_a_cavity() -> None:
    """The mesher never ends where a fine face lies close to one of two large triangles."""
    outer = tagged(blocks(*[np.array([0, 0.04, 0.06, 0.1])] * 2, np.array([0, 0.05])), 0, within_patch)
    surface = weld(merged(outer, inside_out(box((0.096, 0.096, 0.046), at=(0.002, 0.002, 0.002)))))
    mesh = fill(surface, "part", 0, Accuracy(1), sizes_at(surface, [Tag("patch", size=0.0005)], Tag("untagged"), True))
    assert len(mesh.nodes) < 30_000


def within_patch(centres: np.ndarray, normals: np.ndarray) -> np.ndarray:
    return (np.abs(centres - 0.05)[:, :2] < 0.01).all(axis=1) & (normals[:, 2] > 0.9)


def test_a_tag_too_fine_for_the_bound_on_nodes_is_refused() -> None:
    with pytest.raises(Trouble) as caught:
        sized(Tag("patch", size=1e-12))
    assert caught.value.kind == "limits"


@pytest.mark.parametrize("name", ["irregular", "hollow ball", "edge to edge", "thin plate"])
def test_splitting_keeps_the_shape_and_the_angles(name: str) -> None:
    surface = weld(with_tags(SHAPES[name]))
    longest = np.where(surface.tag == 0, 0.1 * np.ptp(surface.vertices), np.inf)
    split = split_to_size(surface, longest)
    corners = triangle_corners(split)
    sides = np.linalg.norm(np.roll(corners, -1, axis=1) - corners, axis=2)
    assert len(split.triangles) > len(surface.triangles)
    assert sides[split.tag == 0].max() <= longest.min() * 1.0001
    assert edges_of(split.triangles).closed
    np.testing.assert_allclose(
        np.bincount(split.face, areas(corners)), np.bincount(surface.face, areas(triangle_corners(surface))), rtol=1e-12
    )
    assert smallest_angle(split) >= 0.5 * smallest_angle(surface) * 0.9999


def smallest_angle(surface: Surface) -> float:
    corners = triangle_corners(surface)
    one, other = np.roll(corners, -1, axis=1) - corners, np.roll(corners, 1, axis=1) - corners
    return float(np.arctan2(np.linalg.norm(np.cross(one, other), axis=2), (one * other).sum(axis=2)).min())


def test_same_mesh_wherever_it_is_run_from_and_nothing_left_there(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    here = filled(finned())
    monkeypatch.chdir(tmp_path)
    there = filled(finned())
    np.testing.assert_array_equal(there.nodes, here.nodes)
    np.testing.assert_array_equal(there.cells, here.cells)
    assert list(tmp_path.iterdir()) == []


# What cannot be filled ------------------------------------------------------------------------------------------------


def crossing() -> Surface:
    return merged(
        box((0.02, 0.02, 0.02)), moved(box((0.02, 0.02, 0.02)), (0.011, 0.007, 0.005), rotation((1, 2, 3), 20))
    )


def test_faces_that_run_through_each_other(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    with pytest.raises(Trouble) as caught:
        filled(crossing())
    assert caught.value.kind == "geometry" and "'part'" in caught.value.message and caught.value.mend
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    "other",
    [moved(UNIT_BOX, (0.01, 0, 0)), box((0.01, 0.005, 0.005), at=(0.01, 0.002, 0.003))],
    ids=["all of a face", "a part of a face"],
)
def test_shells_of_one_part_face_to_face_are_filled_rightly_or_refused(other: Surface) -> None:
    surface = merged(UNIT_BOX, other)
    try:
        mesh = filled(surface)
    except Trouble as trouble:
        assert trouble.kind == "geometry" and trouble.mend
    else:
        assert geometry(mesh).volume.sum() == pytest.approx(enclosed_volume(triangle_corners(surface)), rel=1e-12)


def interpreter(folder: Path, script: str) -> str:
    """A stand-in for the interpreter that runs the mesher."""
    program = folder / "interpreter"
    program.write_text(f"#!/bin/sh\n{script}\n")
    program.chmod(program.stat().st_mode | stat.S_IEXEC)
    return str(program)


@pytest.mark.skipif(os.name != "posix", reason="kills the process by a shell")
@pytest.mark.parametrize(
    "script",
    ["kill -ABRT $$", "kill -SEGV $$", "exit 1", "exit 0", 'echo "out of luck" >&2; exit 9'],
    ids=lambda s: s[:12],
)
def test_a_mesher_that_dies_is_told_and_not_raised(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, script: str
) -> None:
    monkeypatch.setattr(sys, "executable", interpreter(tmp_path, script))
    with pytest.raises(Trouble) as caught:
        filled(UNIT_BOX)
    assert caught.value.kind == "geometry" and "'part'" in caught.value.message


@pytest.mark.skipif(os.name != "posix", reason="kills the process by a shell")
def test_a_mesher_that_the_system_kills_has_run_out_of_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "executable", interpreter(tmp_path, "kill -9 $$"))
    with pytest.raises(Trouble) as caught:
        filled(UNIT_BOX)
    assert caught.value.exit_code == 6 and "memory" in caught.value.message


@pytest.mark.skipif(sys.platform != "linux", reason="the bound on memory is kept on Linux alone")
@pytest.mark.parametrize("megabytes", [200, 300])
def test_a_mesher_out_of_memory_is_told_at_once(monkeypatch: pytest.MonkeyPatch, megabytes: int) -> None:
    """The bound itself, kept by the system: the box takes more than a gigabyte."""
    monkeypatch.setattr(apart, "_most_memory", lambda: megabytes << 20)
    with pytest.raises(Trouble) as caught:
        fill(weld(box((1.0, 1.0, 1.0))), "part", 0, Accuracy(1, 0.012))
    assert caught.value.exit_code == 6 and "memory" in caught.value.message


@pytest.mark.skipif(os.name != "posix", reason="looks for the process by its number")
def test_a_mesher_that_hangs_is_ended(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    script = f"echo $$ > {tmp_path}/number; while :; do :; done"
    monkeypatch.setattr(sys, "executable", interpreter(tmp_path, script))
    monkeypatch.setattr(tetrahedra, "SECONDS", 0.5)
    with pytest.raises(Trouble) as caught:
        filled(UNIT_BOX)
    assert caught.value.exit_code == 6 and "longer than 0.5 s" in caught.value.message
    with pytest.raises(ProcessLookupError):
        os.kill(int((tmp_path / "number").read_text()), 0)


def test_a_mesh_beyond_the_bound_is_refused_before_it_is_made() -> None:
    with pytest.raises(Trouble) as caught:
        fill(weld(box((1.0, 1.0, 1.0))), "part", 0, Accuracy(2, 1e-4))
    assert caught.value.kind == "limits" and "'part'" in caught.value.message


def test_a_bound_met_while_meshing_is_told() -> None:
    """Thin, so that the volume foretells far fewer nodes than its walls need."""
    with pytest.raises(Trouble) as caught:
        fill(weld(box((0.2, 0.2, 0.0002))), "part", 0, Accuracy(1, 0.004, max_nodes=1500))
    assert caught.value.kind == "limits"


def test_shells_that_do_not_say_what_is_inside() -> None:
    """A wall of a cavity that looks the wrong way would make two solids in one place: refused, not guessed."""
    doubtful = merged(sphere(0.02, 1), sphere(0.01, 1))
    assert geometry(filled(merged(sphere(0.02, 1), inside_out(sphere(0.01, 1))))).volume.min() > 0
    with pytest.raises(Trouble) as caught:
        filled(doubtful)
    assert caught.value.kind == "geometry"


def test_facets_that_turn_by_next_to_nothing_keep_their_tags_and_faces() -> None:
    """An arched top of facets that the mesher takes for one: each boundary triangle still lies on the face it names."""
    turn = np.linspace(-4e-3, 4e-3, 41)
    arch = np.stack([10.0 * np.sin(turn), 10.0 * (np.cos(turn) - 1) + 0.01], axis=1)
    plate = prism([*arch[::-1].tolist(), (arch[0, 0], 0.0), (arch[-1, 0], 0.0)], 0.05)
    tags = np.where(centres_and_normals(plate)[0][:, 0] > 0.01, 1, 0)
    surface = weld(replace(plate, tag=tags.astype(np.int32)))
    mesh = fill(surface, "plate", 0, Accuracy(1, 0.005))
    corners, middles = triangle_corners(surface), mesh.nodes[mesh.boundary].mean(axis=1)
    wanted, found = (
        np.bincount(tag, areas(places))
        for tag, places in ((surface.tag, corners), (mesh.boundary_tag, mesh.nodes[mesh.boundary]))
    )
    assert found == pytest.approx(wanted, rel=1e-6)
    off = [
        distances(np.tile(middle, (int(mine.sum()), 1)), corners[mine]).min()
        for middle, mine in zip(middles, surface.face == mesh.boundary_face[:, None], strict=True)
    ]
    assert max(off) < 8e-5  # the arch's rise over the chord, which is all that the mesher can leave out
