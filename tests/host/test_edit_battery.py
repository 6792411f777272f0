"""Every edit that a designer has at hand, and the areas that the tags have after it, worked out by hand.

The block is L x W x H with a tag on its lid (+z) and one on its end (+x), the other faces untagged. Whose tag a new
face takes is the host's choice, the same in every version: the sides of an extruded region and of a sweep that of the
face beside, the sides of faces extruded one by one their own face's, a chamfer that of one of its two faces, a cut the
cutter's, a fill and a bridge none.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from math import hypot, pi, sin, sqrt

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import tags, upkeep  # noqa: E402
from modelled import block, select, side, tag  # noqa: E402

L, W, H = 0.08, 0.06, 0.02
LID, END, WALL = L * W, W * H, L * H
STEP = 0.004


def pick(*directions: str) -> bpy.types.Object:
    """Edit mode with those sides of the block selected; none for all of them."""
    part = bpy.context.view_layer.objects.active
    select(part, side(part, *directions) if directions else np.ones(len(part.data.polygons), bool))
    return part


def pick_edges(which: Callable[[np.ndarray], bool]) -> None:
    """Edit mode with the edges selected whose middle, as shares of the half block, passes."""
    part = bpy.context.view_layer.objects.active
    bpy.ops.object.mode_set(mode="EDIT")
    bpy.ops.mesh.select_all(action="DESELECT")
    bpy.ops.object.mode_set(mode="OBJECT")
    for edge in part.data.edges:
        middle = np.mean([part.data.vertices[corner].co for corner in edge.vertices], axis=0)
        edge.select = bool(which(np.round(2 * middle / (L, W, H), 3)))
    bpy.context.tool_settings.mesh_select_mode = (False, True, False)
    bpy.ops.object.mode_set(mode="EDIT")


def pick_corners(which: Callable[[np.ndarray], bool]) -> None:
    """The same of corners."""
    part = bpy.context.view_layer.objects.active
    bpy.ops.object.mode_set(mode="EDIT")
    bpy.ops.mesh.select_all(action="DESELECT")
    bpy.ops.object.mode_set(mode="OBJECT")
    for vertex in part.data.vertices:
        vertex.select = bool(which(np.round(2 * np.array(vertex.co) / (L, W, H), 3)))
    bpy.context.tool_settings.mesh_select_mode = (True, False, False)
    bpy.ops.object.mode_set(mode="EDIT")


def up(factor: float) -> dict:
    return {"TRANSFORM_OT_translate": {"value": (0.0, 0.0, factor * H)}}


# Edits in edit mode ---------------------------------------------------------------------------------------------------


def subdivide():
    pick()
    bpy.ops.mesh.subdivide(number_cuts=3)


def extrude_region():
    pick("+z")
    bpy.ops.mesh.extrude_region_move(**up(1.5))


def extrude_two_faces_as_a_region():
    pick("+z", "+x")
    bpy.ops.mesh.extrude_region_move(TRANSFORM_OT_translate={"value": (0.03, 0.0, 0.03)})


def extrude_individual():
    pick("+z", "+x")
    bpy.ops.mesh.extrude_faces_move(TRANSFORM_OT_shrink_fatten={"value": 0.01})


def bevel_the_edge_between_lid_and_end():
    pick_edges(lambda at: at[0] == 1 and at[2] == 1)
    bpy.ops.mesh.bevel(offset=STEP, offset_type="OFFSET")


def bevel_a_corner_within_the_lid():
    pick("+z")
    bpy.ops.mesh.poke()
    pick_corners(lambda at: at[2] == 1 and at[0] == 0)
    bpy.ops.mesh.bevel(offset=STEP, offset_type="OFFSET", affect="VERTICES")


def inset():
    pick("+z")
    bpy.ops.mesh.inset(thickness=0.01)


def inset_and_sink():
    pick("+z")
    bpy.ops.mesh.inset(thickness=0.01, depth=-0.005)


def inset_individual():
    pick()
    bpy.ops.mesh.inset(thickness=STEP, use_individual=True)


def loop_cut():
    pick_edges(lambda at: at[0] == 0)
    bpy.ops.mesh.subdivide_edgering(number_cuts=2, interpolation="LINEAR", smoothness=0.0)


def cut_off_an_end():
    pick()
    bpy.ops.mesh.bisect(plane_co=(0.01, 0, 0), plane_no=(1, 0, 0), use_fill=True, clear_outer=True)


def cut_aslant():
    pick()
    bpy.ops.mesh.bisect(plane_co=(0, 0, 0), plane_no=(1, 1, 0))


def bridge_through():
    pick("+z", "-z")
    bpy.ops.mesh.inset(thickness=0.01, use_individual=True)
    bpy.ops.mesh.bridge_edge_loops()


def dissolve_back():
    subdivide()
    bpy.ops.mesh.select_all(action="SELECT")
    bpy.ops.mesh.dissolve_limited(angle_limit=0.01, delimit={"NORMAL"})


def merge_by_distance():
    pick("+z")
    bpy.ops.mesh.split()
    bpy.ops.mesh.select_all(action="SELECT")
    bpy.ops.mesh.remove_doubles(threshold=1e-5)


def triangulate():
    pick()
    bpy.ops.mesh.quads_convert_to_tris()


def triangulate_and_back():
    triangulate()
    bpy.ops.mesh.tris_convert_to_quads()


def mirror_the_coordinates():
    pick()
    bpy.ops.transform.mirror(constraint_axis=(True, False, False))


def duplicate():
    pick("+z")
    bpy.ops.mesh.duplicate_move(**up(1.0))


def delete_and_fill():
    pick("+z")
    bpy.ops.mesh.delete(type="FACE")
    pick_edges(lambda at: at[2] == 1)
    bpy.ops.mesh.edge_face_add()


def fill_by_a_grid():
    subdivide()
    bpy.ops.mesh.select_all(action="DESELECT")
    part = bpy.context.object
    tags.select(part.data, tags.read(part.data) == bpy.context.scene.fluxface.tags["lid"].uid)
    bpy.ops.mesh.delete(type="FACE")
    pick_edges(lambda at: at[2] == 1)
    bpy.ops.mesh.fill_grid(span=4)


def solidify():
    pick()
    bpy.ops.mesh.solidify(thickness=STEP)


def decimate():
    subdivide()
    bpy.ops.mesh.select_all(action="SELECT")
    bpy.ops.mesh.decimate(ratio=0.5)


def smooth_within_the_lid():
    subdivide()
    pick_corners(lambda at: at[2] == 1 and max(abs(at[:2])) < 1)
    bpy.ops.transform.resize(value=(0.7, 1.2, 1.0))
    bpy.ops.mesh.vertices_smooth(factor=0.5, repeat=5)


def spin():
    pick("+x")
    bpy.ops.mesh.spin(steps=90, angle=pi / 2, center=(L / 2, 0.1, 0), axis=(0, 0, 1))


def symmetrize():
    pick()
    bpy.ops.mesh.symmetrize(direction="POSITIVE_X")


def split_edges():
    pick()
    bpy.ops.mesh.edge_split(type="EDGE")


def convex_hull():
    pick()
    bpy.ops.mesh.convex_hull()


def poke():
    pick()
    bpy.ops.mesh.poke()


def rip_the_lid_off():
    pick("+z")
    bpy.ops.mesh.split()
    bpy.ops.transform.translate(value=(0.0, 0.0, 0.01))


def flip_normals():
    pick()
    bpy.ops.mesh.flip_normals()


def connect_corners():
    pick_corners(lambda at: at[2] == 1 and at[0] * at[1] == 1)
    bpy.ops.mesh.vert_connect_path()


def scale_the_lid():
    pick("+z")
    bpy.ops.transform.resize(value=(0.5, 0.5, 1.0))


def cut_a_slot_by_a_boolean_in_edit_mode():
    other = pick()
    bpy.ops.object.mode_set(mode="OBJECT")
    join_with_another((0.02, 0.02, 0.1), lambda cutter: ~side(cutter, "+z", "-z"))
    select(other, np.arange(len(other.data.polygons)) >= 6)
    bpy.ops.mesh.intersect_boolean(operation="DIFFERENCE", solver="EXACT")


# Edits in object mode -------------------------------------------------------------------------------------------------


def join_with_another(size: tuple[float, float, float], faces: Callable[[bpy.types.Object], np.ndarray]) -> None:
    """Another block at the origin joined to the active one, its ``faces`` in the tag "end"."""
    part, scene = bpy.context.object, bpy.context.scene
    other = block("other", size)
    tags.give(other.data, faces(other), scene.fluxface.tags["end"].uid)
    bpy.ops.object.select_all(action="DESELECT")
    other.select_set(True)
    part.select_set(True)
    bpy.context.view_layer.objects.active = part
    bpy.ops.object.join()


def join():
    join_with_another((0.01, 0.01, 0.01), lambda other: side(other, "+x", "-x"))


def separate():
    part = pick("+z")
    bpy.ops.mesh.separate(type="SELECTED")
    bpy.ops.object.mode_set(mode="OBJECT")
    # The lid goes off as an object of its own, its tag with it.
    away = next(thing for thing in bpy.context.scene.objects if thing != part)
    lid = bpy.context.scene.fluxface.tags["lid"].uid
    assert (tags.read(away.data) == lid).all()


def apply_scale():
    part = bpy.context.object
    part.scale = (2.0, 3.0, -1.0)
    part.select_set(True)
    bpy.ops.object.transform_apply(location=False, rotation=False, scale=True)


def apply_rotation():
    part = bpy.context.object
    part.rotation_euler = (0.4, 0.5, 0.6)
    part.select_set(True)
    bpy.ops.object.transform_apply(location=False, rotation=True, scale=False)


def remesh():
    """A voxel remesh loses the tags, which come back from the shape before it."""
    part = bpy.context.object
    part.data.remesh_voxel_size = 0.001
    part.data.use_remesh_preserve_attributes = False
    bpy.ops.object.voxel_remesh()


def modifier(kind: str, **settings) -> Callable[[], None]:
    """A modifier added and applied."""

    def act() -> None:
        made = bpy.context.object.modifiers.new(kind, kind)
        for key, value in settings.items():
            setattr(made, key, value)
        bpy.ops.object.modifier_apply(modifier=made.name)

    act.__name__ = f"modifier_{kind}".lower()
    return act


def boolean(operation: str, solver: str) -> Callable[[], None]:
    """A cutter of 0.02 x 0.02 through the lid and the base, its walls in the tag "end"."""

    def act() -> None:
        part, scene = bpy.context.object, bpy.context.scene
        cutter = block("cutter", (0.02, 0.02, 0.1))
        tags.give(cutter.data, ~side(cutter, "+z", "-z"), scene.fluxface.tags["end"].uid)
        bpy.context.view_layer.objects.active = part
        known = bpy.types.BooleanModifier.bl_rna.properties["solver"].enum_items.keys()
        modifier("BOOLEAN", operation=operation, object=cutter, solver=solver if solver in known else "FLOAT")()

    act.__name__ = f"{operation}_{solver}".lower()
    return act


def nodes() -> None:
    """Geometry nodes that subdivide the mesh and put a copy, twice as wide, beside it."""
    tree = bpy.data.node_groups.new("twice", "GeometryNodeTree")
    tree.interface.new_socket("Geometry", in_out="INPUT", socket_type="NodeSocketGeometry")
    tree.interface.new_socket("Geometry", in_out="OUTPUT", socket_type="NodeSocketGeometry")
    names = ("NodeGroupInput", "GeometryNodeSubdivideMesh", "GeometryNodeTransform", "GeometryNodeJoinGeometry")
    given, finer, moved, both = (tree.nodes.new(name) for name in names)
    left = tree.nodes.new("NodeGroupOutput")
    moved.inputs["Translation"].default_value = (0.0, 0.2, 0.0)
    moved.inputs["Scale"].default_value = (1.0, 2.0, 1.0)
    tree.links.new(given.outputs[0], finer.inputs["Mesh"])
    tree.links.new(finer.outputs["Mesh"], moved.inputs["Geometry"])
    tree.links.new(finer.outputs["Mesh"], both.inputs["Geometry"])
    tree.links.new(moved.outputs["Geometry"], both.inputs["Geometry"])
    tree.links.new(both.outputs["Geometry"], left.inputs[0])
    modifier("NODES", node_group=tree)()


HOLE, TUBE = 0.02**2, 4 * 0.02
CHAMFER = W * STEP * sqrt(2)
INNER, RIM_LENGTH = (L - 0.02) * (W - 0.02), 2 * (L - 0.01) + 2 * (W - 0.01)
# A ring from 0.07 to 0.13 about the axis, by 90 chords of a degree each.
SWEPT = 90 * 0.5 * sin(pi / 180) * (0.13**2 - 0.07**2)

# The areas of the lid and the end after each edit.
EDITS: dict[Callable[[], None], tuple[float, float]] = {
    subdivide: (LID, END),
    extrude_region: (LID, END + 1.5 * H * W),
    extrude_two_faces_as_a_region: (LID, END),
    extrude_individual: (LID + 0.01 * 2 * (L + W), END + 0.01 * 2 * (W + H)),
    bevel_the_edge_between_lid_and_end: (LID - W * STEP, END - W * STEP + CHAMFER),
    bevel_a_corner_within_the_lid: (LID, END),
    inset: (LID, END),
    inset_and_sink: (INNER + RIM_LENGTH * hypot(0.01, 0.005), END),
    inset_individual: (LID, END),
    loop_cut: (LID, END),
    cut_off_an_end: (LID * 5 / 8, 0.0),
    cut_aslant: (LID, END),
    bridge_through: (LID - INNER, END),
    dissolve_back: (LID, END),
    merge_by_distance: (LID, END),
    triangulate: (LID, END),
    triangulate_and_back: (LID, END),
    mirror_the_coordinates: (LID, END),
    duplicate: (2 * LID, END),
    delete_and_fill: (0.0, END),
    fill_by_a_grid: (0.0, END),
    solidify: (LID + (L - 2 * STEP) * (W - 2 * STEP), END + (W - 2 * STEP) * (H - 2 * STEP)),
    decimate: (LID, END),
    smooth_within_the_lid: (LID, END),
    spin: (LID + SWEPT, END),
    symmetrize: (LID, 2 * END),
    split_edges: (LID, END),
    convex_hull: (LID, END),
    poke: (LID, END),
    rip_the_lid_off: (LID, END),
    flip_normals: (LID, END),
    connect_corners: (LID, END),
    scale_the_lid: (LID / 4, 0.75 * W * hypot(H, L / 4)),
    cut_a_slot_by_a_boolean_in_edit_mode: (LID - HOLE, END + TUBE * H),
    join: (LID, END + 2 * 0.01**2),
    separate: (0.0, END),
    apply_scale: (6 * LID, 3 * END),
    apply_rotation: (LID, END),
    remesh: (LID, END),
    nodes: (3 * LID, 3 * END),
    modifier("MIRROR", use_axis=(True, False, False), use_bisect_axis=(True, False, False)): (LID, 2 * END),
    modifier("ARRAY", count=3, relative_offset_displace=(2.0, 0.0, 0.0)): (3 * LID, 3 * END),
    modifier("WELD"): (LID, END),
    modifier("SOLIDIFY", thickness=STEP, use_even_offset=True): (
        LID + (L - 2 * STEP) * (W - 2 * STEP),
        END + (W - 2 * STEP) * (H - 2 * STEP),
    ),
    modifier("SUBSURF", subdivision_type="SIMPLE", levels=2): (LID, END),
    modifier("DECIMATE", decimate_type="DISSOLVE"): (LID, END),
    modifier("TRIANGULATE"): (LID, END),
    modifier("EDGE_SPLIT", use_edge_angle=True): (LID, END),
}
for solver in ("EXACT", "FAST", "MANIFOLD"):
    EDITS[boolean("DIFFERENCE", solver)] = (LID - HOLE, END + TUBE * H)
    EDITS[boolean("UNION", solver)] = (LID - HOLE, END + TUBE * (0.1 - H))
    EDITS[boolean("INTERSECT", solver)] = (HOLE, TUBE * H)


@pytest.mark.parametrize("edit", EDITS, ids=lambda edit: edit.__name__)
def test_tags_have_the_areas_they_should_after_the_edit(scene, edit):
    part = block()
    for name, direction in (("lid", "+z"), ("end", "+x")):
        tag(scene, part, name, side(part, direction))
    upkeep.refresh()
    edit()
    if part.mode == "EDIT":
        bpy.ops.object.mode_set(mode="OBJECT")
    bpy.context.view_layer.objects.active = part
    upkeep.refresh()
    measured = json.loads(part.fluxface.areas)
    uids = (str(scene.fluxface.tags[name].uid) for name in ("lid", "end"))
    assert [measured.get(uid, 0.0) for uid in uids] == pytest.approx(EDITS[edit], rel=1e-5, abs=1e-9)
