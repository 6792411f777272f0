"""Parts as designers leave them, each measured in metres, or solved, to what it should be."""

from __future__ import annotations

from math import cos, radians, sin

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import cases, parts, study, tags  # noqa: E402
from fluxface.solver.case import Case  # noqa: E402
from fluxface.solver.errors import Trouble  # noqa: E402
from modelled import block, lamp, select, side, tag  # noqa: E402

L, W, H = 0.08, 0.06, 0.02
VOLUME, LID = L * W * H, L * W


def case_of(*members: bpy.types.Object) -> Case:
    bpy.context.view_layer.update()
    with parts.in_sight(bpy.context, members) as depsgraph:
        return cases.build_case(bpy.context.scene, members, depsgraph)


def measured(case: Case, part: int = 0) -> tuple[float, dict[str, float]]:
    """The volume that a part's outward triangles enclose, and the area of each tag on it."""
    surface = case.surface
    mine = surface.part == part
    a, b, c = (surface.vertices[surface.triangles[mine, corner]] for corner in range(3))
    middle = a.mean(axis=0)
    normal = np.cross(b - a, c - a)
    area = np.bincount(surface.tag[mine] + 1, np.linalg.norm(normal, axis=1) / 2, len(case.tags) + 1)
    names = ["untagged", *(each.name for each in case.tags)]
    return float(np.einsum("fi,fi->", a - middle, normal) / 6.0), dict(zip(names, area.tolist(), strict=True))


def lidded(scene: bpy.types.Scene, name: str = "part", size: tuple[float, float, float] = (L, W, H)):
    """A block with its lid in air."""
    part = block(name, size)
    if "lid" not in scene.fluxface.tags:
        lid = tag(scene, part, "lid", side(part, "+z"))
        lid.use_convection = True
    tags.give(part.data, side(part, "+z"), scene.fluxface.tags["lid"].uid)
    return part


@pytest.mark.parametrize("metres", [1e-4, 1e-3, 0.0254, 1000.0])
def test_a_unit_of_any_size_counts(scene, metres):
    scene.unit_settings.scale_length = metres
    part = lidded(scene, size=tuple(np.divide((L, W, H), metres)))
    volume, area = measured(case_of(part))
    assert volume == pytest.approx(VOLUME, rel=1e-5)
    assert area["lid"] == pytest.approx(LID, rel=1e-5)


@pytest.mark.parametrize("scale", [(-1.0, 1.0, 1.0), (0.5, 3.0, 2.0), (-0.1, -10.0, -1.0)])
def test_scales_that_stretch_and_mirror(scene, scale):
    part = lidded(scene)
    part.scale = scale
    volume, area = measured(case_of(part))
    assert volume == pytest.approx(VOLUME * abs(np.prod(scale)), rel=1e-5)
    assert area["lid"] == pytest.approx(LID * abs(scale[0] * scale[1]), rel=1e-5)


def test_a_stretched_parent_shears_its_turned_child(scene):
    """The child's x and y stand at 30 degrees in a parent that is stretched threefold along x."""
    parent, part = bpy.data.objects.new("parent", None), lidded(scene)
    scene.collection.objects.link(parent)
    parent.scale, parent.location = (3.0, 1.0, -2.0), (5.0, -4.0, 3.0)
    part.parent, part.rotation_euler.z = parent, radians(30)
    volume, area = measured(case_of(part))
    assert volume == pytest.approx(VOLUME * 6.0, rel=1e-5)
    edges = [(3 * cos(radians(30)), sin(radians(30))), (-3 * sin(radians(30)), cos(radians(30)))]
    assert area["lid"] == pytest.approx(LID * abs(np.linalg.det(edges)), rel=1e-5)


# Modifiers ------------------------------------------------------------------------------------------------------------


def modified(scene, kind: str, **settings) -> tuple[float, dict[str, float]]:
    part = lidded(scene)
    modifier = part.modifiers.new(kind, kind)
    for key, value in settings.items():
        setattr(modifier, key, value)
    return measured(case_of(part))


def test_bevel(scene):
    """The block less a chamfer on each edge: its core, six slabs, twelve half prisms and eight corner tetrahedra."""
    chamfer = 0.004
    volume, _ = modified(scene, "BEVEL", width=chamfer, segments=1, limit_method="NONE")
    a, b, c = (length - 2 * chamfer for length in (L, W, H))
    slabs, prisms = 2 * chamfer * (a * b + b * c + c * a), 0.5 * chamfer**2 * 4 * (a + b + c)
    assert volume == pytest.approx(a * b * c + slabs + prisms + 8 * chamfer**3 / 6, rel=1e-5)


def test_subdivision_with_creases(scene):
    """Edges creased in full stay where they are."""
    part = lidded(scene)
    crease = part.data.attributes.new("crease_edge", "FLOAT", "EDGE")
    crease.data.foreach_set("value", np.ones(len(part.data.edges), np.float32))
    corners = part.data.attributes.new("crease_vert", "FLOAT", "POINT")
    corners.data.foreach_set("value", np.ones(len(part.data.vertices), np.float32))
    part.modifiers.new("finer", "SUBSURF").levels = 2
    volume, area = measured(case_of(part))
    assert (volume, area["lid"]) == (pytest.approx(VOLUME, rel=1e-5), pytest.approx(LID, rel=1e-5))


def test_a_sheet_made_solid(scene):
    bpy.ops.mesh.primitive_plane_add(size=0.1)
    part = bpy.context.object
    part.fluxface.material.name = "copper, pure"
    tag(scene, part, "sheet", np.ones(1, bool)).use_convection = True
    part.modifiers.new("thickness", "SOLIDIFY").thickness = 0.002
    volume, area = measured(case_of(part))
    assert volume == pytest.approx(0.1 * 0.1 * 0.002, rel=1e-5)
    assert sum(area.values()) == pytest.approx(2 * 0.1 * 0.1 + 4 * 0.1 * 0.002, rel=1e-5)


def test_a_boolean(scene):
    cutter = block("cutter", (0.02, 0.02, 0.1))
    volume, area = modified(scene, "BOOLEAN", operation="DIFFERENCE", object=cutter)
    assert volume == pytest.approx(VOLUME - 0.02 * 0.02 * H, rel=1e-4)
    assert area["lid"] == pytest.approx(LID - 0.02 * 0.02, rel=1e-4)


def test_array_and_mirror(scene):
    part = lidded(scene)
    part.modifiers.new("row", "ARRAY").relative_offset_displace = (1.5, 0.0, 0.0)
    mirror = part.modifiers.new("mirror", "MIRROR")
    mirror.use_axis, mirror.mirror_object = (False, True, False), bpy.data.objects.new("plane", None)
    mirror.mirror_object.location.y = 0.1
    scene.collection.objects.link(mirror.mirror_object)
    volume, area = measured(case_of(part))
    assert (volume, area["lid"]) == (pytest.approx(4 * VOLUME, rel=1e-5), pytest.approx(4 * LID, rel=1e-5))


def geometry_nodes(part: bpy.types.Object, *, realised: bool) -> None:
    """The part's own mesh instanced on the two ends of a line, made real or not."""
    tree = bpy.data.node_groups.new("copies", "GeometryNodeTree")
    tree.interface.new_socket("Geometry", in_out="INPUT", socket_type="NodeSocketGeometry")
    tree.interface.new_socket("Geometry", in_out="OUTPUT", socket_type="NodeSocketGeometry")
    given, left = tree.nodes.new("NodeGroupInput"), tree.nodes.new("NodeGroupOutput")
    line, copies = tree.nodes.new("GeometryNodeMeshLine"), tree.nodes.new("GeometryNodeInstanceOnPoints")
    line.inputs["Count"].default_value = 2
    line.inputs["Offset"].default_value = (0.0, 0.0, 0.1)
    tree.links.new(given.outputs[0], copies.inputs["Instance"])
    tree.links.new(line.outputs[0], copies.inputs["Points"])
    end = copies.outputs[0]
    if realised:
        real = tree.nodes.new("GeometryNodeRealizeInstances")
        tree.links.new(end, real.inputs[0])
        end = real.outputs[0]
    tree.links.new(end, left.inputs[0])
    part.modifiers.new("copies", "NODES").node_group = tree


def test_geometry_nodes_with_instances_made_real(scene):
    part = lidded(scene)
    geometry_nodes(part, realised=True)
    volume, area = measured(case_of(part))
    assert (volume, area["lid"]) == (pytest.approx(2 * VOLUME, rel=1e-5), pytest.approx(2 * LID, rel=1e-5))


# Instances and shared meshes ------------------------------------------------------------------------------------------


def test_instances_by_geometry_nodes_are_told_and_not_left_out(scene):
    part = lidded(scene)
    geometry_nodes(part, realised=False)
    with pytest.raises(Trouble, match="The geometry nodes of 'part' make instances, which are not solved"):
        case_of(part)


def collected(scene, *members: bpy.types.Object) -> bpy.types.Collection:
    group = bpy.data.collections.new("lamp")
    scene.collection.children.link(group)
    for part in members:
        group.objects.link(part)
    scene.fluxface.collection = group
    return group


def test_instances_of_a_collection_are_told_and_not_left_out(scene):
    part, instance = lidded(scene), bpy.data.objects.new("copy", None)
    library = bpy.data.collections.new("screws")
    library.objects.link(block("screw"))
    collected(scene, part, instance)
    assert len(case_of(*study.parts(bpy.context)).parts) == 1
    instance.instance_type, instance.instance_collection = "COLLECTION", library
    with pytest.raises(Trouble, match="'copy' shows instances, which are not solved"):
        case_of(*study.parts(bpy.context))


def test_two_objects_of_one_mesh_are_two_parts(scene):
    part = lidded(scene)
    twin = bpy.data.objects.new("twin", part.data)
    twin.location, twin.scale = (0.5, 0.0, 0.0), (2.0, 2.0, 2.0)
    twin.fluxface.material.name = "copper, pure"
    scene.collection.objects.link(twin)
    collected(scene, part, twin)
    case = case_of(*study.parts(bpy.context))
    assert [measured(case, number)[0] for number in (0, 1)] == pytest.approx([VOLUME, 8 * VOLUME], rel=1e-5)
    assert [measured(case, number)[1]["lid"] for number in (0, 1)] == pytest.approx([LID, 4 * LID], rel=1e-5)


# Shapes ---------------------------------------------------------------------------------------------------------------


def test_a_polygon_that_is_not_flat_is_closed_by_its_triangles(scene):
    """A lifted corner adds a pyramid over one half of the lid or over both, by the diagonal the host takes."""
    part = lidded(scene)
    lift = 0.01
    part.data.vertices[7].co.z += lift
    part.data.update()
    volume, _ = measured(case_of(part))
    assert min(abs(volume - VOLUME - share * LID * lift / 6) for share in (1, 2)) < 1e-6 * VOLUME


def row(part: bpy.types.Object, name: str) -> dict:
    summary = study.summary(study.outcome(bpy.context.scene, [part]))
    return next(each for each in summary["tags"] if each["name"] == name)


def excess(part: bpy.types.Object) -> float:
    """K of the skin above the air; by Newton's law of cooling it is 12 W over 8 W/m2K and the skin's area."""
    return row(part, "skin")["mean"] - 298.15


@pytest.mark.parametrize("place", [(1e4, 0.0, 0.0), (-6e3, 8e3, 50.0)])
def test_a_part_10_km_away_is_solved(scene, place):
    part = lamp(scene)
    part.location = place
    bpy.ops.fluxface.run()
    area = LID + 2 * H * (L + W)
    assert row(part, "skin")["area"] == pytest.approx(area, rel=1e-5)
    assert excess(part) == pytest.approx(12 / (8 * area), rel=1e-5)


@pytest.mark.parametrize("longest", [1e-3, 50.0])
def test_a_part_of_a_millimetre_and_one_of_many_metres_are_solved(scene, longest):
    part = lamp(scene)
    part.scale = 3 * (longest / L,)
    scene.fluxface.size = longest / 4
    bpy.ops.fluxface.run()
    area = (LID + 2 * H * (L + W)) * (longest / L) ** 2
    assert row(part, "skin")["area"] == pytest.approx(area, rel=1e-5)
    assert excess(part) == pytest.approx(12 / (8 * area), rel=1e-5)


def test_a_mirrored_and_sheared_part_in_edit_mode_is_solved_with_its_unsaved_edit(scene):
    parent, part = bpy.data.objects.new("parent", None), lamp(scene)
    scene.collection.objects.link(parent)
    parent.scale = (-1.0, 2.0, 1.0)
    part.parent, part.rotation_euler.x = parent, radians(90)
    select(part, side(part, "+x"))
    bpy.ops.transform.translate(value=(-0.02, 0.0, 0.0))
    bpy.ops.fluxface.run()
    assert part.mode == "EDIT"
    # A block of 0.1 x 0.06 x 0.02 standing on its y side, with its z side stretched twofold along the world's y.
    area = 0.1 * W + 2 * (0.1 * 2 * H + W * 2 * H)
    assert row(part, "skin")["area"] == pytest.approx(area, rel=1e-5)
    assert excess(part) == pytest.approx(12 / (8 * area), rel=1e-5)


def test_a_hidden_part_is_solved_and_stays_hidden(scene):
    part = lamp(scene)
    part.hide_set(True)
    bpy.ops.fluxface.run()
    area = LID + 2 * H * (L + W)
    assert part.hide_get()
    assert excess(part) == pytest.approx(12 / (8 * area), rel=1e-5)
