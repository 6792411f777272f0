"""Mending of surfaces made to have one thing amiss: what is done, said and refused, and what comes out.

Shapes are invented; volumes and areas are exact from their dimensions.
"""

from __future__ import annotations

import json
from dataclasses import replace
from importlib.util import find_spec
from pathlib import Path

import numpy as np
import pytest
from cases import case_of, run
from fluxface.solver import pipeline
from fluxface.solver.case import Accuracy, Case, Convection, Surface, Tag, read_case, write_case
from fluxface.solver.errors import Trouble
from fluxface.solver.geometry import tetrahedra
from fluxface.solver.geometry.apart import Apart, run_apart
from fluxface.solver.geometry.carrying import tag_areas
from fluxface.solver.geometry.closing import ON_THEIR_WORD, UNASKED, Limits
from fluxface.solver.geometry.mending import Mended, mended
from fluxface.solver.geometry.surface import areas, enclosed_volume, triangle_corners, weld
from fluxface.solver.geometry.tidying import chosen
from shapes import assembly, box, centres_and_normals, cylinder, facing, merged, moved, surface_of, tagged

needs_union = pytest.mark.skipif(not find_spec("manifold3d"), reason="needs manifold3d, of the extra 'mend'")

SIZE, VOLUME, HEAD = (0.03, 0.02, 0.01), 6e-6, 6e-4
NAMES = ("head", "foot")


def with_tags(surface: Surface) -> Surface:
    return tagged(tagged(surface, 0, facing("+z")), 1, facing("-z"))


def block() -> Surface:
    return with_tags(box(SIZE, (3, 2, 1)))


def mend(surface: Surface, limits: Limits = UNASKED) -> Mended:
    return mended(weld(surface), "block", NAMES, lambda candidate: None, limits)


def volume(made: Mended) -> float:
    return enclosed_volume(triangle_corners(made.surface))


def without(surface: Surface, *faces: int) -> Surface:
    return chosen(surface, ~np.isin(surface.face, faces))


def face_at(surface: Surface, *place: float) -> int:
    """The face whose middle is nearest."""
    middles = {int(face): surface.vertices[np.unique(surface.triangles[surface.face == face])].mean(axis=0)
               for face in np.unique(surface.face)}  # fmt: skip
    return min(middles, key=lambda face: float(np.linalg.norm(middles[face] - place)))


def assert_whole(made: Mended, said: str) -> None:
    """The block again, to rounding, its tags where they were and nothing to warn of."""
    assert volume(made) == pytest.approx(VOLUME, rel=1e-9)
    assert tag_areas(made.surface, 2)[:2] == pytest.approx([HEAD, HEAD], rel=1e-9)
    assert said in " ".join(made.said) and made.warnings == ()


def flipped() -> Surface:
    whole = block()
    wrong = np.isin(whole.face, (0, 1, 5))
    return replace(whole, triangles=np.where(wrong[:, None], whole.triangles[:, ::-1], whole.triangles))


def doubled() -> Surface:
    whole = block()
    return merged(whole, chosen(whole, whole.tag == 0))


def loose() -> Surface:
    """Every triangle with vertices of its own, moved by a tenth of what welding joins."""
    whole = block()
    apart = triangle_corners(whole).reshape(-1, 3)
    shift = 3e-9 * np.random.default_rng(0).uniform(-1, 1, apart.shape)
    return replace(whole, vertices=apart + shift, triangles=np.arange(len(apart), dtype=np.int32).reshape(-1, 3))


def with_a_t_junction() -> Surface:
    """Head and sides divided unlike: corners of the one lie on edges of the other."""
    fine, coarse = box(SIZE, (6, 2, 1)), box(SIZE, (3, 2, 1))
    head = chosen(fine, np.isclose(triangle_corners(fine)[:, :, 2], 0.01).all(axis=1))
    rest = chosen(coarse, ~np.isclose(triangle_corners(coarse)[:, :, 2], 0.01).all(axis=1))
    return with_tags(merged(rest, head))


@pytest.mark.parametrize(
    ("made", "said", "share"),
    [
        (flipped, "Faces that pointed the wrong way were turned (6).", 1e-9),
        (doubled, "Doubled faces were dropped (12).", 1e-9),
        (with_a_t_junction, "Edges were split at corners that lie on them (6).", 1e-9),
    ],
)
@pytest.mark.parametrize(("scale", "shift"), [(1.0, 0.0), (1e-4, 0.0), (1000.0, 0.0), (1.0, 1e4)])
def test_bookkeeping_mends_exactly_at_every_scale_and_place(made, said: str, share: float, scale, shift) -> None:
    if shift:
        share = 1e-6  # positions there are rounded to 2e-12 m
    found = mend(moved(made(), (shift, -shift, shift), scale=scale))
    assert volume(found) == pytest.approx(VOLUME * scale**3, rel=share)
    assert tag_areas(found.surface, 2)[:2] == pytest.approx([HEAD * scale**2] * 2, rel=share)
    assert said in found.said and found.warnings == ()


def test_loose_vertices_are_welded_before_anything_is_mended() -> None:
    assert volume(mend(loose())) == pytest.approx(VOLUME, rel=1e-5)
    assert mend(loose()).said == ()


def test_a_small_hole_is_closed_with_the_tag_beside_it() -> None:
    fine = with_tags(box(SIZE, (12, 8, 4)))
    made = mend(without(fine, face_at(fine, 0.015, 0.01, 0.01)))
    assert_whole(made, "Small holes were closed (1, 0.28 % of the surface).")


def test_a_hole_of_a_thousand_sides_is_closed() -> None:
    rod = cylinder(0.002, 0.06, 1000)
    made = mend(chosen(rod, ~facing("+z")(*centres_and_normals(rod))))
    assert volume(made) == pytest.approx(enclosed_volume(triangle_corners(rod)), rel=1e-9)
    assert made.said[0].startswith("Small holes were closed (1, 1.6 %")


def test_a_large_hole_is_refused_with_its_place_and_closed_when_asked_for() -> None:
    whole = block()
    gone = face_at(whole, 0.015, 0.005, 0.01)
    with pytest.raises(Trouble) as caught:
        mend(without(whole, gone))
    trouble = caught.value
    assert trouble.kind == "geometry" and "'block' is open: 4 edges" in trouble.message
    assert "have the mesh mended" in trouble.mend
    assert np.allclose(np.mean(trouble.points, axis=0), (0.015, 0.005, 0.01))
    made = mend(without(whole, gone), ON_THEIR_WORD)
    assert volume(made) == pytest.approx(VOLUME, rel=1e-9)
    # The cover has no tag: no watts are spread over what was not there.
    assert tag_areas(made.surface, 2) == pytest.approx([HEAD - 1e-4, HEAD, 1e-3 + 1e-4], rel=1e-9)
    assert len(made.warnings) == 1 and "1 cm2 (4.8 % of the surface) near (15, 5, 10) mm" in made.warnings[0]


def test_a_block_without_two_neighbouring_sides_is_refused_even_when_asked_for() -> None:
    """Its rim is not level, and a cover over it would cut off half of the block."""
    open_block = chosen(block(), ~(facing("+z")(*_middles(block())) | facing("+y")(*_middles(block()))))
    with pytest.raises(Trouble, match="is open") as caught:
        mend(open_block, ON_THEIR_WORD)
    assert "mesh mended" not in caught.value.mend


def _middles(surface: Surface) -> tuple[np.ndarray, np.ndarray]:
    corners = triangle_corners(surface)
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    return corners.mean(axis=1), normal / np.linalg.norm(normal, axis=1, keepdims=True)


def test_a_sheet_encloses_nothing_and_is_refused() -> None:
    sheet = chosen(block(), block().tag == 0)
    with pytest.raises(Trouble) as caught:
        mend(sheet, ON_THEIR_WORD)
    assert caught.value.kind == "geometry" and "'block'" in caught.value.message


def test_a_cavity_stays_when_faces_of_it_are_flipped() -> None:
    inner = box((0.01, 0.006, 0.004), (2, 1, 1), at=(0.01, 0.007, 0.003))
    wrong = np.arange(len(inner.triangles)) >= 2  # all but the first face look inwards
    inner = replace(inner, triangles=np.where(wrong[:, None], inner.triangles[:, ::-1], inner.triangles))
    made = mend(merged(block(), inner))
    assert volume(made) == pytest.approx(VOLUME - 0.24e-6, rel=1e-9)


@needs_union
@pytest.mark.parametrize(
    ("place", "added"),
    [((0.01, 0.005, 0.006), 0.6e-6), ((0.0033, 0.0021, 0.01), 1e-6), ((0.01, 0.0, 0.01), 1e-6)],
    ids=["crossing", "upon", "sharing faces"],
)
def test_shells_that_cross_or_touch_are_united(place: tuple[float, float, float], added: float) -> None:
    made = mend(merged(block(), box((0.01, 0.01, 0.01), at=place)))
    assert volume(made) == pytest.approx(VOLUME + added, rel=1e-5)
    assert any("united" in sentence for sentence in made.said)
    head, foot, _ = tag_areas(made.surface, 2).tolist()
    assert head == pytest.approx(HEAD - 1e-4, rel=1e-4) and foot == pytest.approx(HEAD, rel=1e-6)
    assert len(made.warnings) == 1 and "The tag 'head' lost 16.7 % of its area" in made.warnings[0]


@needs_union
def test_a_fin_without_thickness_adds_nothing_to_the_volume() -> None:
    corners = np.array([[0.005, 0.01, 0.005], [0.025, 0.01, 0.005], [0.025, 0.01, 0.02], [0.005, 0.01, 0.02]])
    fin = surface_of(corners, np.array([[0, 1, 2], [0, 2, 3]]))
    with pytest.raises(Trouble, match="is open: 4 edges") as caught:
        mend(merged(block(), fin))
    assert caught.value.faces == [22, 23]
    made = mend(merged(block(), fin), ON_THEIR_WORD)
    assert volume(made) == pytest.approx(VOLUME, rel=1e-6)
    assert tag_areas(made.surface, 2)[1] == pytest.approx(HEAD, rel=1e-6) and "a sheet" in made.warnings[0]


TAGS = [Tag("head", heat=2.0), Tag("foot", convection=Convection(298.15, 40.0))]


@pytest.mark.slow
def test_the_command_writes_a_case_that_solves_and_leaves_sound_parts_alone(tmp_path: Path) -> None:
    other = moved(block(), (0.1, 0, 0))
    given = case_of(assembly(without(block(), face_at(block(), 0.015, 0.005, 0.01)), other), TAGS, order=1)
    write_case(given, tmp_path / "given")
    assert run("solve", tmp_path / "given", "--progress", "none").trouble["kind"] == "geometry"
    ran = run("mend", tmp_path / "given", "--out", tmp_path / "mended", "--json")
    told = json.loads(ran.out)
    assert ran.code == 0 and told["state"] == "mended" and len(told["warnings"]) == 1
    assert told["parts"][0]["mending"] and told["parts"][1]["mending"] == []
    made = read_case(tmp_path / "mended")
    was, now = (case.surface.vertices[case.surface.triangles[case.surface.part == 1]] for case in (given, made))
    assert np.array_equal(was, now) and made.tags == given.tags
    assert set(made.surface.face[made.surface.part == 0]) == set(given.surface.face[given.surface.part == 0])
    assert run("solve", tmp_path / "mended", "--progress", "none").code == 0


def test_the_command_refuses_what_is_beyond_mending_and_writes_nothing(tmp_path: Path) -> None:
    write_case(case_of(chosen(block(), block().tag != 1), TAGS[:1], order=1), tmp_path / "given")
    ran = run("mend", tmp_path / "given", "--out", tmp_path / "mended", "--json")
    assert ran.code == 3 and ran.trouble["where"]["points"] and not (tmp_path / "mended").exists()
    assert json.loads(ran.out)["parts"][0]["findings"][0]["kind"] == "open edges"


def within_a_block(inner: Tag) -> Case:
    """A block with a small box of faces turned outwards in its middle, which bounds nothing, and its tag."""
    box_within = replace(box((0.004, 0.004, 0.004), at=(0.012, 0.008, 0.003)), tag=np.full(12, 2, np.int32))
    return case_of(merged(block(), box_within), [*TAGS, inner], order=1)


def test_a_tag_that_brings_heat_and_would_lose_every_face_keeps_the_run_from_starting() -> None:
    case = within_a_block(Tag("inner", heat=1.0))
    with pytest.raises(Trouble, match="'inner' brings heat") as caught:
        pipeline.solve(case)
    assert caught.value.faces == np.unique(case.surface.face[case.surface.tag == 2]).tolist()


def test_a_tag_that_mending_leaves_no_face_carries_nothing_and_is_told() -> None:
    case, (body,) = pipeline.mend(within_a_block(Tag("inner", convection=Convection(298.15, 5.0))))
    assert case.tags == (*TAGS, Tag("inner"))
    assert body.mended is not None and any("'inner' lost 100 %" in warning for warning in body.mended.warnings)
    summary = pipeline.solve(case).summary
    assert summary["tags"][2]["area"] == 0 and summary["balance"]["in"] == pytest.approx(2.0)


def test_facets_that_cannot_be_split_are_kept(monkeypatch: pytest.MonkeyPatch) -> None:
    asked = []

    def refusing(tool: str, surface: dict[str, np.ndarray], switches: str, seconds: float) -> dict[str, np.ndarray]:
        asked.append(switches)
        if "Y" not in switches:
            raise Apart("refused", "Internal TetGen error")
        return run_apart(tool, surface, switches, seconds)

    monkeypatch.setattr(tetrahedra, "run_apart", refusing)
    mesh = tetrahedra.fill(weld(block()), "block", 0, Accuracy(1, 1e-3))
    sides = mesh.nodes[mesh.boundary] - np.roll(mesh.nodes[mesh.boundary], 1, axis=1)
    assert len(asked) == len(tetrahedra.ATTEMPTS) + 1
    assert np.linalg.norm(sides, axis=2).max() <= tetrahedra.KEPT * 1e-3
    assert np.bincount(mesh.boundary_tag + 1, areas(mesh.nodes[mesh.boundary]))[1] == pytest.approx(HEAD, rel=1e-9)
