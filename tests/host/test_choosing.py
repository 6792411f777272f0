"""Choosing faces and tags: patches that a selection grows to, a tag under a ray, faces moved from tag to tag."""

from __future__ import annotations

import math

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import overlay, patches, picking, tags, upkeep, words  # noqa: E402
from fluxface.addon.overlay import tag_colours  # noqa: E402
from modelled import block, select, side, tag  # noqa: E402


def rod(segments: int = 32) -> bpy.types.Object:
    """A cylinder about z, its ends of triangles."""
    bpy.ops.mesh.primitive_cylinder_add(vertices=segments, radius=0.02, depth=0.1, end_fill_type="TRIFAN")
    return bpy.context.object


def looking_up(part: bpy.types.Object) -> np.ndarray:
    """(F,) how far each face looks up, from -1 to 1."""
    normals = np.empty((len(part.data.polygons), 3), np.float32)
    part.data.polygons.foreach_get("normal", normals.ravel())
    return normals[:, 2]


def select_first(part: bpy.types.Object, faces: np.ndarray) -> None:
    """Select the first of the faces alone."""
    select(part, np.arange(len(faces)) == np.flatnonzero(faces)[0])


def test_a_flat_patch_ends_where_it_turns_and_a_smooth_one_at_sharp_edges(scene):
    part = rod()
    end, wall = looking_up(part) > 0.9, np.abs(looking_up(part)) < 0.1
    select_first(part, end)
    bpy.ops.fluxface.select_flat()
    assert np.array_equal(tags.selected(part.data), end)
    select_first(part, wall)
    bpy.ops.fluxface.select_flat()
    assert tags.selected(part.data).sum() == 1
    # A flat patch is measured from where it began, and does not creep round; its neighbours are 11.25° apart.
    bpy.ops.fluxface.select_flat(angle=math.radians(12.0))
    assert tags.selected(part.data).sum() == 3
    bpy.ops.fluxface.select_smooth()
    assert np.array_equal(tags.selected(part.data), wall)
    bpy.ops.fluxface.select_smooth(angle=math.radians(91.0))
    assert tags.selected(part.data).all()


def test_a_patch_is_seen_in_the_world(scene):
    """Flattened to a sheet, a rod's side turns by up to nearly 180° at its rim and hardly anywhere else."""
    part = rod()
    part.scale = (1.0, 0.01, 1.0)
    bpy.context.view_layer.update()
    select(part, np.argmax(np.array([polygon.normal.y for polygon in part.data.polygons])) == np.arange(96))
    bpy.ops.fluxface.select_smooth()
    chosen = tags.selected(part.data)
    assert chosen.sum() == 16
    assert all(polygon.normal.y > 0 for polygon, its in zip(part.data.polygons, chosen, strict=True) if its)


def test_a_patch_ends_at_hidden_faces_and_where_more_than_two_meet(scene):
    mesh = bpy.data.meshes.new("strip")
    # A strip of four squares along x, and a wing that stands on the edge between the third and the fourth.
    corners = [(x, y, 0) for x in range(5) for y in (0, 1)] + [(3, 0, 1), (3, 1, 1)]
    faces = [(2 * x, 2 * x + 2, 2 * x + 3, 2 * x + 1) for x in range(4)] + [(6, 10, 11, 7)]
    mesh.from_pydata(corners, [], faces)
    part = bpy.data.objects.new("strip", mesh)
    scene.collection.objects.link(part)
    seeds = np.arange(5) == 0
    assert patches.flat_patch(patches.facets_of(part), seeds, 0.1).tolist() == [True, True, True, False, False]
    mesh.polygons[1].hide = True
    assert patches.flat_patch(patches.facets_of(part), seeds, 0.1).tolist() == [True, False, False, False, False]


def test_growing_asks_for_edit_mode_and_a_selection(scene):
    part = block()
    assert not bpy.ops.fluxface.select_flat.poll()
    select(part, side(part))
    with pytest.raises(RuntimeError, match=r"No faces are selected\."):
        bpy.ops.fluxface.select_smooth()


def test_the_first_face_on_a_ray_gives_its_tag(scene):
    near, far = block("near"), block("far", at=(0.0, 0.0, -0.2))
    far.scale = (3.0, 3.0, 0.5)
    far.rotation_euler = (0.0, 0.0, 0.7)
    top = tag(scene, near, "top", side(near, "+z"))
    floor = tag(scene, far, "floor", side(far, "+z"))
    for part in (near, far):
        bpy.context.view_layer.objects.active = part
        upkeep.refresh()
    parts, down = [far, near], np.array((0.0, 0.0, -2.0))
    assert picking.tag_along(parts, np.array((0.01, 0.0, 1.0)), down) == top.uid
    assert picking.tag_along(parts, np.array((0.06, 0.0, 1.0)), down) == floor.uid
    assert picking.tag_along(parts, np.array((0.01, 0.0, -1.0)), -down) == 0
    assert picking.tag_along(parts, np.array((1.0, 1.0, 1.0)), down) is None
    assert picking.tag_along(parts, np.array((0.01, 0.0, -0.05)), -down) == 0, "what is behind is not seen"


def test_a_ray_meets_a_face_where_geometry_says_it_does(scene):
    part = rod()
    upkeep.refresh()
    surface = tag_colours.skins[part.name]
    rng = np.random.default_rng(1)
    for _ in range(50):
        origin, towards = rng.normal(size=3) * 0.2, rng.normal(size=3)
        towards = 0.3 * towards - origin if rng.random() < 0.7 else towards
        told = picking.first_hit(surface, origin, towards)
        hit, place, _, face = part.ray_cast(origin, towards)
        assert (told is not None) == hit
        if hit:
            assert origin + told[0] * towards == pytest.approx(np.array(place), abs=1e-6)
            assert surface.face[told[1]] == face


@pytest.mark.parametrize("mode", ["OBJECT", "EDIT"])
def test_faces_are_moved_to_another_tag(scene, mode):
    part = block()
    ends, lid = tag(scene, part, "ends", side(part, "+x", "-x")), tag(scene, part, "lid", side(part, "+z"))
    ends, lid = ends.uid, lid.uid
    scene.fluxface.active_tag = 0
    select(part, side(part, "+x", "+y"))
    bpy.ops.object.mode_set(mode=mode)
    bpy.ops.fluxface.tag_move(to="lid", only_selected=True)
    assert np.array_equal(tags.read(part.data) == lid, side(part, "+z", "+x"))
    assert np.array_equal(tags.read(part.data) == 0, side(part, "+y", "-y", "-z"))
    bpy.ops.fluxface.tag_move(to="lid")
    assert np.array_equal(tags.read(part.data) == lid, side(part, "+z", "+x", "-x"))
    assert ends not in tags.read(part.data)
    with pytest.raises(RuntimeError, match="No such faces are in 'ends'"):
        bpy.ops.fluxface.tag_move(to="lid")
    with pytest.raises(RuntimeError, match="There is no other tag 'rim'"):
        bpy.ops.fluxface.tag_move(to="rim")


def test_a_picked_tag_is_the_active_one(scene):
    part = block()
    first = tag(scene, part, "first", side(part, "+z")).uid
    tag(scene, part, "second", side(part, "-z"))
    bpy.ops.fluxface.tag_pick(uid=first)
    assert tags.active(scene).name == "first"
    with pytest.raises(RuntimeError, match="no tagged face at that place"):
        bpy.ops.fluxface.tag_pick()
    assert tags.active(scene).name == "first"


def test_what_is_set_what_is_insulated_and_what_is_neither_differ(scene):
    part = block()
    lid = tag(scene, part, "lid", side(part, "+z"))
    assert words.carries_or_not(scene, lid) == "nothing set: insulated"
    assert overlay.manner_of(lid) == overlay.UNSET
    lid.use_heat, lid.heat = True, 3.0
    assert overlay.manner_of(lid) == overlay.SET
    lid.insulated = True
    assert words.carries_or_not(scene, lid) == "insulated"
    assert overlay.manner_of(lid) == overlay.INSULATED
    assert len({overlay.SET, overlay.INSULATED, overlay.UNSET}) == 3


def test_meant_insulation_leaves_every_other_term_out(scene):
    from fluxface.addon.cases import as_tag
    from fluxface.solver.case import Tag

    part = block()
    lid = tag(scene, part, "lid", side(part, "+z"))
    lid.use_heat = lid.use_temperature = lid.insulated = True
    assert as_tag(lid, "lid", 1.0) == Tag("lid")
    assert words.clash(lid) == ""
    lid.insulated = False
    assert as_tag(lid, "lid", 1.0).heat == lid.heat


def test_an_opened_shell_of_single_triangles_is_seen_whole_but_for_its_hole(scene):
    """Each triangle has corners of its own; the name holds what stands for a value in sentences."""
    from fluxface.addon.glance import glance
    from fluxface.addon.parts import Skin

    part = rod()
    upkeep.refresh()
    surface = tag_colours.skins[part.name]
    places = surface.vertices[surface.triangles[1:]].reshape(-1, 3)
    apart = Skin(places, np.arange(len(places)).reshape(-1, 3), surface.uid[1:], surface.face[1:])
    (finding,) = glance(apart, "a {rod}")
    assert finding["message"] == "The surface of 'a {rod}' is open: 3 edges without a face on both sides."
    assert len(finding["points"]) == 3
