"""Tags and the faces they are given."""

from __future__ import annotations

import bpy
import numpy as np
from bpy.props import BoolProperty, IntProperty, StringProperty

from ...solver.errors import Trouble
from .. import presets, study, tags, upkeep, view
from ..language import report
from ..places import enter_edit_mode
from ..recovery import definitions
from .telling import TellsTrouble


def _parts(context: bpy.types.Context) -> list[bpy.types.Object]:
    """Those in edit mode, or else the active one."""
    edited = context.mode == "EDIT_MESH"
    return list(context.objects_in_mode_unique_data) if edited else [study.active_part(context)]


def _give(context: bpy.types.Context, selections: list[tuple[bpy.types.Object, np.ndarray]], uid: int) -> None:
    view.settings_of(context.scene).showing = "PART"
    for part, faces in selections:
        tags.give(part.data, faces, uid)
        tags.keep_copies(context.scene, part.data)
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

    name: StringProperty(name="Name", description="What the faces are", default="face tag")

    def act(self, context: bpy.types.Context) -> None:
        selections = tags.selections(_parts(context))
        study.restore_tags(context.scene)
        _give(context, selections, tags.new(context.scene, self.name).uid)


class GiveToTag(_OnTag, bpy.types.Operator):
    bl_idname = "fluxface.tag_give"
    bl_label = "Give Faces"
    bl_description = "Give the selected faces to the active tag; a face is in one tag at most"

    def act(self, context: bpy.types.Context) -> None:
        _give(context, tags.selections(_parts(context)), tags.active(context.scene).uid)


class TakeFromTags(_OnPart, bpy.types.Operator):
    bl_idname = "fluxface.tag_take"
    bl_label = "Untag Faces"
    bl_description = "Take the selected faces out of whichever tag they are in"

    def act(self, context: bpy.types.Context) -> None:
        _give(context, tags.selections(_parts(context)), 0)


def _other_tags(_operator: bpy.types.Operator, context: bpy.types.Context, _typed: str) -> list[str]:
    own = tags.active(context.scene)
    return [tag.name for tag in context.scene.fluxface.tags if tag != own]


class MoveFaces(_OnTag, bpy.types.Operator):
    bl_idname = "fluxface.tag_move"
    bl_label = "Move Faces to Tag"
    bl_description = "Give the faces of the active tag, or those of them that are selected, to another tag"

    to: StringProperty(
        name="To", description="The tag that gets the faces", search=_other_tags, search_options={"SUGGESTION"}
    )
    only_selected: BoolProperty(name="Selected Faces Only", description="Leave the tag's other faces where they are")

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if len(context.scene.fluxface.tags) < 2:
            cls.poll_message_set("There is no other tag to move faces to")
            return False
        return super().poll(context)

    def invoke(self, context: bpy.types.Context, _event: bpy.types.Event) -> set[str]:
        others = _other_tags(self, context, "")
        self.to = self.to if self.to in others else others[0]
        return context.window_manager.invoke_props_dialog(self)

    def act(self, context: bpy.types.Context) -> None:
        own, other = tags.active(context.scene), context.scene.fluxface.tags.get(self.to)
        if other is None or other == own:
            raise Trouble(
                "case", report("There is no other tag '{name}'.", name=self.to), "Choose one of the scene's tags."
            )
        moved = []
        for part in _parts(context):
            faces = tags.read(part.data) == own.uid
            moved.append((part, faces & tags.selected(part.data) if self.only_selected else faces))
        count = int(sum(faces.sum() for _, faces in moved))
        if not count:
            raise Trouble(
                "case",
                report("No such faces are in '{name}'.", name=own.name),
                "Make the tag that has them the active one.",
            )
        _give(context, moved, other.uid)
        self.report({"INFO"}, report("Faces moved to '{name}': {count}.", name=other.name, count=count))


class SelectTag(_OnTag, bpy.types.Operator):
    bl_idname = "fluxface.tag_select"
    bl_label = "Select Faces"
    bl_description = "Select the faces of the active tag, in edit mode"

    def act(self, context: bpy.types.Context) -> None:
        uid = tags.active(context.scene).uid
        enter_edit_mode(context, study.active_part(context))
        for part in _parts(context):
            tags.select(part.data, tags.read(part.data) == uid)


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
        # Terms that were typed since the last edit are worth as much as the tag when this is undone.
        definitions.keep(context.scene)
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
    (NewTag, GiveToTag, TakeFromTags, MoveFaces, SelectTag, DeleteTag, UsePreset)
)
