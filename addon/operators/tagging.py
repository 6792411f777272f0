"""Tags and the faces they are given."""

from __future__ import annotations

import bpy
import numpy as np
from bpy.props import IntProperty, StringProperty

from ...solver.errors import Trouble
from .. import presets, study, tags, upkeep, view
from ..places import enter_edit_mode
from .telling import TellsTrouble


def _meshes(context: bpy.types.Context) -> list[bpy.types.Mesh]:
    """Those in edit mode, or else the active one."""
    edited = context.mode == "EDIT_MESH"
    return [part.data for part in (context.objects_in_mode_unique_data if edited else [study.active_part(context)])]


def _selections(context: bpy.types.Context) -> list[tuple[bpy.types.Mesh, np.ndarray]]:
    """Meshes with the faces selected on them.

    Raises Trouble when no face is selected.
    """
    found = [(mesh, tags.selected(mesh)) for mesh in _meshes(context)]
    if not any(faces.any() for _, faces in found):
        raise Trouble("case", "No faces are selected.", "Select faces in edit mode.")
    return found


def _give(context: bpy.types.Context, selections: list[tuple[bpy.types.Mesh, np.ndarray]], uid: int) -> None:
    view.settings_of(context.scene).showing = "PART"
    for mesh, faces in selections:
        if faces.any():
            tags.give(mesh, faces, uid)
            tags.keep_copies(context.scene, mesh)
    upkeep.refresh()


class _OnPart(TellsTrouble):
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        part = study.active_part(context)
        if part is None or context.mode not in ("OBJECT", "EDIT_MESH"):
            cls.poll_message_set("Make the part the active object, in object or edit mode")
            return False
        if part.data.library is not None:
            cls.poll_message_set("The part is linked from another file; tag it there")
            return False
        return True


class _OnTag(_OnPart):
    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if tags.active(context.scene) is None:
            cls.poll_message_set("There is no tag yet")
            return False
        return super().poll(context)


class NewTag(_OnPart, bpy.types.Operator):
    bl_idname = "fluxface.tag_new"
    bl_label = "New Tag"
    bl_description = "Make a tag and give it the selected faces"

    name: StringProperty(name="Name", default="face tag")

    def act(self, context: bpy.types.Context) -> None:
        selections = _selections(context)
        study.restore_tags(context.scene)
        _give(context, selections, tags.new(context.scene, self.name).uid)


class GiveToTag(_OnTag, bpy.types.Operator):
    bl_idname = "fluxface.tag_give"
    bl_label = "Give Faces"
    bl_description = "Give the selected faces to the active tag; a face is in one tag at most"

    def act(self, context: bpy.types.Context) -> None:
        _give(context, _selections(context), tags.active(context.scene).uid)


class TakeFromTags(_OnPart, bpy.types.Operator):
    bl_idname = "fluxface.tag_take"
    bl_label = "Untag Faces"
    bl_description = "Take the selected faces out of whichever tag they are in"

    def act(self, context: bpy.types.Context) -> None:
        _give(context, _selections(context), 0)


class SelectTag(_OnTag, bpy.types.Operator):
    bl_idname = "fluxface.tag_select"
    bl_label = "Select Faces"
    bl_description = "Select the faces of the active tag, in edit mode"

    def act(self, context: bpy.types.Context) -> None:
        uid = tags.active(context.scene).uid
        enter_edit_mode(context, study.active_part(context))
        for mesh in _meshes(context):
            tags.select(mesh, tags.read(mesh) == uid)


class DeleteTag(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.tag_delete"
    bl_label = "Delete Tag"
    bl_description = "Delete the active tag; its faces stay, untagged"
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if tags.active(context.scene) is None:
            cls.poll_message_set("There is no tag yet")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        tags.delete(context.scene, tags.active(context.scene).uid)
        upkeep.refresh()


class UsePreset(_OnTag, bpy.types.Operator):
    bl_idname = "fluxface.preset_use"
    bl_label = "Use Preset"

    which: IntProperty(options={"HIDDEN"}, max=len(presets.PRESETS) - 1, min=0)

    @classmethod
    def description(cls, _context: bpy.types.Context, properties: bpy.types.OperatorProperties) -> str:
        return presets.PRESETS[properties.which].about

    def act(self, context: bpy.types.Context) -> None:
        presets.apply(tags.active(context.scene), presets.PRESETS[self.which])


register, unregister = bpy.utils.register_classes_factory(
    (NewTag, GiveToTag, TakeFromTags, SelectTag, DeleteTag, UsePreset)
)
