"""What the host loses of tags, found again: on a mesh made anew without them, and definitions that undo leaves out."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import bpy
import numpy as np

from ..solver.errors import Trouble
from . import groups, inspection, tags
from .nearest import nearest_uids
from .parts import triangulated

CARRIED = "Tags were carried over to the new shape from the old one: look at them."


@dataclass(frozen=True)
class Tagged:
    """A mesh when it last had tags. vertices: (V, 3). triangles: (F, 3). uid: (F,)."""

    vertices: np.ndarray
    triangles: np.ndarray
    uid: np.ndarray


class Memory:
    """The tagged meshes of this session, by the host's ids."""

    def __init__(self) -> None:
        self._meshes: dict[int, Tagged] = {}

    def follow(self, scene: bpy.types.Scene, part: bpy.types.Object) -> None:
        """Remember the tags of the part's mesh, or give them back if it was made anew without them.

        A mesh that has the attribute and no tags was untagged by the designer, and one that lost the attribute and
        nothing else was rid of it: those are forgotten.
        """
        mesh = part.data
        if mesh.is_editmode or mesh.library is not None:
            return
        if tags.ATTRIBUTE in mesh.attributes:
            self._remember(mesh)
            return
        known = self._meshes.pop(mesh.session_uid, None)
        if known is None or not len(mesh.polygons) or np.array_equal(known.vertices, triangulated(mesh)[0]):
            return
        uids = nearest_uids(known.vertices, known.triangles, known.uid, mesh)
        uids[~np.isin(uids, [tag.uid for tag in scene.fluxface.tags])] = 0
        tags.give(mesh, np.ones(len(uids), bool), uids)
        tags.keep_copies(scene, mesh)
        self._remember(mesh)
        inspection.note(part, CARRIED)

    def forget(self) -> None:
        self._meshes.clear()

    def _remember(self, mesh: bpy.types.Mesh) -> None:
        try:
            uids = tags.read(mesh)
        except Trouble:
            # A foreign attribute of that name is told of when a run starts.
            return
        if not uids.any():
            self._meshes.pop(mesh.session_uid, None)
            return
        vertices, triangles, polygon = triangulated(mesh)
        self._meshes[mesh.session_uid] = Tagged(vertices, triangles, uids[polygon])


class Definitions:
    """The tags of this session as they last were, by uid.

    In edit mode the host's undo brings back a mesh and not the scene: faces may then be in a tag that the scene has
    lost, as after a deletion that was undone.
    """

    def __init__(self) -> None:
        self._known: dict[int, dict[str, Any]] = {}

    def keep(self, scene: bpy.types.Scene) -> None:
        self._known |= {tag.uid: groups.as_json(tag) for tag in scene.fluxface.tags}

    def give_back(self, scene: bpy.types.Scene) -> None:
        """Let the scene know every tag again that faces in it are in."""
        meshes = {thing.data for thing in scene.objects if thing.type == "MESH" and tags.is_tagged(thing.data)}
        for mesh in meshes:
            try:
                used = np.unique(tags.read(mesh)).tolist()
            except Trouble:
                # A foreign attribute of that name is told of when a run starts.
                continue
            for uid in used:
                if uid in self._known and tags.of_uid(scene, uid) is None:
                    groups.fill(scene.fluxface.tags.add(), self._known[uid])

    def forget(self) -> None:
        self._known.clear()


# One for the session, which is as long as the shapes that it remembers are of use.
memory = Memory()
definitions = Definitions()
