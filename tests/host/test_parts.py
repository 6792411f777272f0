"""The evaluated geometry as the solver gets it: metres, world axes, outward, modifiers applied."""

from __future__ import annotations

import math

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import cases, parts, tags  # noqa: E402
from fluxface.solver.case import read_case, write_case  # noqa: E402
from fluxface.solver.errors import Trouble  # noqa: E402
from modelled import block, lamp, select, side, tag  # noqa: E402

VOLUME = 0.08 * 0.06 * 0.02


def case_of(scene: bpy.types.Scene, *members: bpy.types.Object):
    bpy.context.view_layer.update()
    with parts.in_sight(bpy.context, members) as depsgraph:
        return cases.build_case(scene, members, depsgraph)


def volume(case) -> float:
    """Enclosed by outward triangles, by the divergence theorem."""
    a, b, c = (case.surface.vertices[case.surface.triangles[:, corner]] for corner in range(3))
    return float(np.einsum("fi,fi->", a, np.cross(b, c)) / 6.0)


@pytest.mark.parametrize("scale", [(1, 1, 1), (2, 1, 1), (-1, 1, 1), (-1, -2, -1), (-1, -1, 1)])
def test_volume_is_positive_and_right_whatever_the_scale(scene, scale):
    part = lamp(scene)
    part.scale, part.location, part.rotation_euler = scale, (3.0, -2.0, 1.0), (0.3, -0.4, 0.5)
    assert volume(case_of(scene, part)) == pytest.approx(VOLUME * abs(math.prod(scale)), rel=1e-4)


def test_places_are_world_places(scene):
    part = lamp(scene)
    part.location = (1.0, 2.0, 3.0)
    case = case_of(scene, part)
    assert case.surface.vertices.min(axis=0) == pytest.approx([0.96, 1.97, 2.99], abs=1e-6)


def test_unit_scale_counts(scene):
    part = lamp(scene)
    part.scale = (1000.0, 1000.0, 1000.0)
    scene.unit_settings.scale_length = 0.001
    scene.fluxface.tags[0].size = 0.005
    case = case_of(scene, part)
    assert volume(case) == pytest.approx(VOLUME, rel=1e-5)
    assert case.accuracy.size == pytest.approx(0.02 * 0.001)
    assert [tag.size for tag in case.tags][:2] == [pytest.approx(0.005 * 0.001), None]


def test_modifiers_are_applied(scene):
    part = lamp(scene)
    modifier = part.modifiers.new("array", "ARRAY")
    modifier.relative_offset_displace = (2.0, 0.0, 0.0)
    assert volume(case_of(scene, part)) == pytest.approx(2 * VOLUME, rel=1e-5)


def test_a_hidden_part_is_evaluated_and_stays_hidden(scene):
    part = lamp(scene)
    part.modifiers.new("array", "ARRAY").relative_offset_displace = (2.0, 0.0, 0.0)
    part.hide_set(True)
    assert volume(case_of(scene, part)) == pytest.approx(2 * VOLUME, rel=1e-5)
    assert part.hide_get()


def test_what_is_being_edited_counts(scene):
    part = lamp(scene)
    select(part, side(part, "+z"))
    bpy.ops.transform.translate(value=(0, 0, 0.02))
    assert volume(case_of(scene, part)) == pytest.approx(2 * VOLUME, rel=1e-5)


def test_a_concave_polygon_is_triangulated_within_itself(scene):
    outline = [(0, 0), (3, 0), (3, 1), (1, 1), (1, 3), (0, 3)]
    count = len(outline)
    vertices = [(x, y, z) for z in (0, 1) for x, y in outline]
    sides = [(i, (i + 1) % count, count + (i + 1) % count, count + i) for i in range(count)]
    mesh = bpy.data.meshes.new("angle")
    mesh.from_pydata(vertices, [], [tuple(reversed(range(count))), tuple(range(count, 2 * count)), *sides])
    part = bpy.data.objects.new("angle", mesh)
    part.fluxface.material.name = "copper, pure"
    scene.collection.objects.link(part)
    scene.fluxface.untagged.use_convection = True
    case = case_of(scene, part)
    assert volume(case) == pytest.approx(5.0)
    top = case.surface.face == 1
    a, b, c = (case.surface.vertices[case.surface.triangles[top, corner]] for corner in range(3))
    assert np.linalg.norm(np.cross(b - a, c - a), axis=1).sum() / 2 == pytest.approx(5.0)


def test_the_case_reads_back_as_it_was_written(scene, tmp_path):
    part = lamp(scene)
    case = case_of(scene, part)
    write_case(case, tmp_path)
    read = read_case(tmp_path)
    assert read.tags == case.tags
    assert read.parts == case.parts
    assert np.array_equal(read.surface.tag, case.surface.tag)
    assert (case.tags[0].heat, case.tags[1].convection.coefficient, case.tags[1].convection.ambient) == (12, 8, 298.15)


# Each fault that a designer can make, and the sentence that tells of it.


def untag_everything(scene, _part):
    while scene.fluxface.tags:
        bpy.ops.fluxface.tag_delete()


def scale_to_zero(_scene, part):
    part.scale = (1.0, 0.0, 1.0)


def flatten(_scene, part):
    for vertex in part.data.vertices:
        vertex.co.z = 0.0


def empty_the_mesh(_scene, part):
    part.data.clear_geometry()


def leave_a_tag_empty(scene, _part):
    tags.new(scene, "cold end")


def hold_and_heat(scene, _part):
    scene.fluxface.tags["pad"].use_temperature = True


def negative_conductivity(_scene, part):
    part.fluxface.material.conductivity.value = -3.0


def no_material(_scene, part):
    part.fluxface.material.name = ""


def no_gravity(scene, _part):
    scene.fluxface.gravity = (0.0, 0.0, 0.0)


def unknown_tag(scene, part):
    tags.give(part.data, side(part, "+z"), 77)


def fins_without_gap(scene, _part):
    scene.fluxface.tags["skin"].film = "fin_channel"


FAULTS = {
    untag_everything: "No faces of 'lamp' are tagged.",
    scale_to_zero: "The part 'lamp' is scaled to zero along Y.",
    flatten: "The part 'lamp' is flat: it encloses no volume.",
    empty_the_mesh: "The part 'lamp' has no faces.",
    leave_a_tag_empty: "The tag 'cold end' has no faces.",
    hold_and_heat: "The tag 'pad' holds a temperature and also carries heat.",
    negative_conductivity: "The conductivity of 'lamp' is -3; it must be greater than zero.",
    no_material: "The part 'lamp' has no material.",
    no_gravity: "Gravity has no direction.",
    unknown_tag: "Some faces carry a tag that this scene does not know.",
    fins_without_gap: "The tag 'skin' lacks the gap between its fins.",
}


@pytest.mark.parametrize("fault", FAULTS, ids=lambda fault: fault.__name__)
def test_each_fault_is_told_in_one_sentence_with_what_to_do(scene, fault):
    part = lamp(scene)
    fault(scene, part)
    with pytest.raises(Trouble) as caught:
        case_of(scene, part)
    assert caught.value.message == FAULTS[fault]
    assert caught.value.mend.endswith(".")


def test_a_tag_that_lies_on_another_object_is_no_fault(scene):
    part = lamp(scene)
    other = block("other", at=(1, 0, 0))
    tag(scene, other, "elsewhere", side(other, "+x"))
    assert [each.name for each in case_of(scene, part).tags] == ["pad", "skin"]


def test_no_active_object_is_told(scene):
    with pytest.raises(RuntimeError, match="No mesh object is active"):
        bpy.ops.fluxface.run()
