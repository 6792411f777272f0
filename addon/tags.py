"""Face tags: one INT face attribute that holds a tag's stable id, 0 = untagged, and the definitions it refers to.

Definitions live on the scene. Each mesh keeps a copy of those it uses, so that a part appended from another file brings
its tags along.
"""

from __future__ import annotations

import json
import secrets
from collections.abc import Iterable
from itertools import compress, repeat
from typing import Any

import bmesh
import bpy
import numpy as np

from ..solver.errors import Trouble
from . import groups
from .properties import TagDefinition, next_free_name

ATTRIBUTE = "fluxface_tag"
COPY = "fluxface_tags"

# Okabe & Ito, "Color Universal Design" (2008): told apart with any colour vision; their black is left out.
COLOURS = ((230, 159, 0), (86, 180, 233), (0, 158, 115), (240, 228, 66), (0, 114, 178), (213, 94, 0), (204, 121, 167))


# Definitions ----------------------------------------------------------------------------------------------------------


def new(scene: bpy.types.Scene, name: str) -> TagDefinition:
    """A tag without faces or terms, made the active one; its name is numbered if it is taken."""
    settings = scene.fluxface
    taken = {tag.name for tag in settings.tags} | {"untagged"}
    shades = [tuple(round(255 * channel) for channel in tag.colour) for tag in settings.tags]
    # Drawn at random, an id does not clash with one that a part from another file brings.
    uid = secrets.randbelow(2**31 - 1) + 1
    tag = settings.tags.add()
    tag.uid = uid
    tag.name = next_free_name(name, taken)
    tag.colour = [channel / 255 for channel in min(COLOURS, key=shades.count)]
    settings.active_tag = len(settings.tags) - 1
    return tag


def active(scene: bpy.types.Scene) -> TagDefinition | None:
    settings = scene.fluxface
    return settings.tags[settings.active_tag] if 0 <= settings.active_tag < len(settings.tags) else None


def of_uid(scene: bpy.types.Scene, uid: int) -> TagDefinition | None:
    return next((tag for tag in scene.fluxface.tags if tag.uid == uid), None)


def activate(scene: bpy.types.Scene, uid: int) -> TagDefinition:
    """Make a tag the active one.

    Raises Trouble when there is none of that id, as on a face without a tag.
    """
    tag = of_uid(scene, uid)
    if tag is None:
        raise Trouble("case", "There is no tagged face at that place.", "Pick a face that is drawn in a tag's colour.")
    scene.fluxface.active_tag = list(scene.fluxface.tags).index(tag)
    return tag


def delete(scene: bpy.types.Scene, uid: int) -> None:
    """Remove a tag from the scene and from the faces of every mesh in it."""
    settings = scene.fluxface
    for mesh in {thing.data for thing in scene.objects if thing.type == "MESH"}:
        if mesh.library is None:
            replace(mesh, uid, 0)
            keep_copies(scene, mesh)
    settings.tags.remove(next(index for index, tag in enumerate(settings.tags) if tag.uid == uid))
    settings.active_tag = max(0, min(settings.active_tag, len(settings.tags) - 1))


def keep_copies(scene: bpy.types.Scene, mesh: bpy.types.Mesh) -> None:
    """Let the mesh hold the definitions of the tags on its faces."""
    used = set(np.unique(read(mesh)).tolist())
    copies = json.dumps([groups.as_json(tag) for tag in scene.fluxface.tags if tag.uid in used])
    if copies != mesh.get(COPY, "[]"):
        mesh[COPY] = copies


def restore(scene: bpy.types.Scene, meshes: Iterable[bpy.types.Mesh]) -> None:
    """Give the scene every definition that the meshes hold a copy of and that it lacks."""
    known = {tag.uid for tag in scene.fluxface.tags}
    for mesh in meshes:
        for copy in _copies(mesh):
            if copy["uid"] not in known:
                known.add(copy["uid"])
                groups.fill(scene.fluxface.tags.add(), copy)


def _copies(mesh: bpy.types.Mesh) -> list[dict[str, Any]]:
    """The definitions that the mesh holds; none where the property has been tampered with."""
    try:
        return [copy for copy in json.loads(mesh.get(COPY, "[]")) if isinstance(copy["uid"], int)]
    except (ValueError, TypeError, KeyError):
        return []


# Faces ----------------------------------------------------------------------------------------------------------------


def read(mesh: bpy.types.Mesh) -> np.ndarray:
    """(F,) int32 tag ids of the faces as they are now, in edit mode too.

    Raises Trouble when the attribute of that name is not one of ours.
    """
    if mesh.is_editmode:
        edited = bmesh.from_edit_mesh(mesh)
        layer = edited.faces.layers.int.get(ATTRIBUTE)
        if layer is None:
            return np.zeros(len(edited.faces), np.int32)
        # The host hands out edit-mode faces one by one only.
        return np.array([face[layer] for face in edited.faces], np.int32)
    uids = np.zeros(len(mesh.polygons), np.int32)
    if (attribute := _attribute(mesh)) is not None:
        attribute.data.foreach_get("value", uids)
    return uids


def _attribute(mesh: bpy.types.Mesh) -> bpy.types.Attribute | None:
    attribute = mesh.attributes.get(ATTRIBUTE)
    if attribute is not None and (attribute.domain, attribute.data_type) != ("FACE", "INT"):
        raise Trouble(
            "case",
            f"The mesh '{mesh.name}' has an attribute '{ATTRIBUTE}' that does not hold whole numbers on faces.",
            "Remove or rename that attribute under Object Data, Attributes.",
        )
    return attribute


def is_tagged(mesh: bpy.types.Mesh) -> bool:
    """Whether the mesh has, or had when it was last copied, tagged faces."""
    return ATTRIBUTE in mesh.attributes or COPY in mesh


def selected(mesh: bpy.types.Mesh) -> np.ndarray:
    """(F,) bool, the faces that are selected; in object mode those that edit mode would show selected."""
    if mesh.is_editmode:
        edited = bmesh.from_edit_mesh(mesh)
        return np.array([face.select for face in edited.faces], bool)
    chosen = np.zeros(len(mesh.polygons), bool)
    mesh.polygons.foreach_get("select", chosen)
    return chosen


def selections(parts: Iterable[bpy.types.Object]) -> list[tuple[bpy.types.Object, np.ndarray]]:
    """The parts that have selected faces, and which (F,).

    Raises Trouble when no face is selected.
    """
    found = [(part, selected(part.data)) for part in parts]
    if not any(faces.any() for _, faces in found):
        raise Trouble("case", "No faces are selected.", "Select faces in edit mode.")
    return [(part, faces) for part, faces in found if faces.any()]


def give(mesh: bpy.types.Mesh, faces: np.ndarray, uid: int | np.ndarray) -> None:
    """Give the faces, (F,) bool, to a tag, or to one each; 0 leaves them untagged. The shape is not touched.

    Raises Trouble when the attribute of that name is not one of ours.
    """
    if mesh.is_editmode:
        edited = bmesh.from_edit_mesh(mesh)
        layer = edited.faces.layers.int.get(ATTRIBUTE) or edited.faces.layers.int.new(ATTRIBUTE)
        given = repeat(int(uid)) if np.ndim(uid) == 0 else uid.tolist()
        for face, its in zip(compress(edited.faces, faces.tolist()), given, strict=False):
            face[layer] = its
        bmesh.update_edit_mesh(mesh, loop_triangles=False, destructive=False)
        return
    uids = read(mesh)
    uids[faces] = uid
    attribute = _attribute(mesh) or mesh.attributes.new(ATTRIBUTE, "INT", "FACE")
    attribute.data.foreach_set("value", uids)
    mesh.update()


def replace(mesh: bpy.types.Mesh, uid: int, other: int) -> None:
    """Give the faces of one tag to another."""
    faces = read(mesh) == uid
    if faces.any():
        give(mesh, faces, other)


def select(mesh: bpy.types.Mesh, faces: np.ndarray) -> None:
    """In edit mode, select the faces, (F,) bool, besides what is selected; hidden ones come back in sight."""
    edited = bmesh.from_edit_mesh(mesh)
    for face in compress(edited.faces, faces.tolist()):
        face.hide_set(False)
        face.select_set(True)
    edited.select_flush_mode()
    bmesh.update_edit_mesh(mesh, loop_triangles=False, destructive=False)
