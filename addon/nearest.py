"""From one surface to another: tags by the nearest face that looks the same way, temperatures by the nearest place."""

from __future__ import annotations

import bpy
import numpy as np
from mathutils.bvhtree import BVHTree

from .view.result_object import mesh_of

# Cosine of the widest angle between an axis and the faces that count as looking along it: every face does along one
# axis at least, and a face at 45 degrees along two.
LIKE = 0.5


def nearest_uids(vertices: np.ndarray, triangles: np.ndarray, uid: np.ndarray, mesh: bpy.types.Mesh) -> np.ndarray:
    """(P,) int32 tag ids for the polygons of ``mesh`` from a surface: (V, 3), (F, 3) and its tag ids (F,).

    Across a thin wall the nearest face alone may be that of the wrong side, so faces are sought by where they look.
    """
    count = len(mesh.polygons)
    middle, normal = np.empty((count, 3), np.float32), np.empty((count, 3), np.float32)
    mesh.polygons.foreach_get("center", middle.ravel())
    mesh.polygons.foreach_get("normal", normal.ravel())
    main = np.abs(normal).argmax(axis=1)
    towards = 2 * main + (np.take_along_axis(normal, main[:, None], axis=1)[:, 0] < 0)
    looks = np.repeat(_directions(vertices, triangles), 2, axis=1) * np.tile([1.0, -1.0], 3)
    found = np.zeros(count, np.int32)
    for side in np.unique(towards).tolist():
        alike = np.flatnonzero(looks[:, side] >= LIKE)
        alike = alike if len(alike) else np.arange(len(triangles))
        tree = BVHTree.FromPolygons(vertices.tolist(), triangles[alike].tolist())
        mine = np.flatnonzero(towards == side)
        # The host looks up the nearest face of one point at a time only.
        found[mine] = uid[alike[[tree.find_nearest(point)[2] for point in middle[mine].tolist()]]]
    return found


def _directions(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """(F, 3) unit normals; zero where a triangle has no area."""
    a, b, c = (vertices[triangles[:, corner]].astype(float) for corner in range(3))
    normal = np.cross(b - a, c - a)
    return normal / np.maximum(np.linalg.norm(normal, axis=1, keepdims=True), 1e-300)


def nearest_values(
    vertices: np.ndarray, triangles: np.ndarray, values: np.ndarray, places: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """What a surface, (V, 3) and (F, 3), with values (V,) has nearest to places (P, 3): values (P,), how far off (P,).

    The host's own nodes look it up for all places at once. It measures in single precision, so all is set about the
    middle of the places and scaled to them.
    """
    middle = 0.5 * (places.min(axis=0) + places.max(axis=0))
    size = max(float(np.ptp(places, axis=0).max()), 1e-300)
    least = float(values.min())
    made: list[bpy.types.ID] = []
    try:
        source = _as_object("nearest source", (vertices - middle) / size, triangles, made)
        source.data.attributes.new(VALUE, "FLOAT", "POINT").data.foreach_set("value", (values - least).astype("f4"))
        target = _as_object("nearest target", (places - middle) / size, np.zeros((0, 3), int), made)
        target.modifiers.new("nearest", "NODES").node_group = _lookup(source, made)
        scene = bpy.data.scenes.new("nearest")
        made.append(scene)
        for thing in (source, target):
            scene.collection.objects.link(thing)
        layer = scene.view_layers[0]
        layer.update()
        found = target.evaluated_get(layer.depsgraph).data.attributes
        value, apart = np.empty(len(places), np.float32), np.empty(len(places), np.float32)
        found[VALUE].data.foreach_get("value", value)
        found[APART].data.foreach_get("value", apart)
    finally:
        bpy.data.batch_remove(made)
    return value.astype(float) + least, apart.astype(float) * size


VALUE, APART = "nearest value", "nearest apart"


def _as_object(name: str, places: np.ndarray, triangles: np.ndarray, made: list[bpy.types.ID]) -> bpy.types.Object:
    mesh = mesh_of(name, places, triangles)
    thing = bpy.data.objects.new(name, mesh)
    made += [mesh, thing]
    return thing


def _lookup(source: bpy.types.Object, made: list[bpy.types.ID]) -> bpy.types.NodeTree:
    """Nodes that give each vertex the value of ``source`` nearest to it, and how far off that is."""
    tree = bpy.data.node_groups.new("nearest", "GeometryNodeTree")
    made.append(tree)
    for way in ("INPUT", "OUTPUT"):
        tree.interface.new_socket("Geometry", in_out=way, socket_type="NodeSocketGeometry")
    given, left = tree.nodes.new("NodeGroupInput"), tree.nodes.new("NodeGroupOutput")
    surface, value = tree.nodes.new("GeometryNodeObjectInfo"), tree.nodes.new("GeometryNodeInputNamedAttribute")
    nearest, apart = tree.nodes.new("GeometryNodeSampleNearestSurface"), tree.nodes.new("GeometryNodeProximity")
    surface.inputs["Object"].default_value = source
    value.data_type = nearest.data_type = "FLOAT"
    value.inputs["Name"].default_value = VALUE
    apart.target_element = "FACES"
    geometry = given.outputs[0]
    tree.links.new(surface.outputs["Geometry"], nearest.inputs["Mesh"])
    tree.links.new(surface.outputs["Geometry"], apart.inputs[0])
    tree.links.new(value.outputs["Attribute"], _in_use(nearest.inputs, "Value"))
    for name, found in ((VALUE, _in_use(nearest.outputs, "Value")), (APART, apart.outputs["Distance"])):
        store = tree.nodes.new("GeometryNodeStoreNamedAttribute")
        store.data_type, store.domain = "FLOAT", "POINT"
        store.inputs["Name"].default_value = name
        tree.links.new(geometry, store.inputs["Geometry"])
        tree.links.new(found, _in_use(store.inputs, "Value"))
        geometry = store.outputs["Geometry"]
    tree.links.new(geometry, left.inputs[0])
    return tree


def _in_use(sockets: bpy.types.bpy_prop_collection, name: str) -> bpy.types.NodeSocket:
    """The socket of that name for the type of data that the node is set to."""
    return next(socket for socket in sockets if socket.name == name and socket.enabled)
