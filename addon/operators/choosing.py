"""Choosing faces and tags: a tag picked in the view, a selection grown to a patch."""

from __future__ import annotations

import math

import bpy
import numpy as np
from bpy.props import FloatProperty, IntProperty

from .. import patches, picking, tags, upkeep, view, words
from ..language import report
from .telling import TellsTrouble

PICK = {"LEFTMOUSE", "RET", "NUMPAD_ENTER", "SPACE"}
LEAVE = {"ESC", "RIGHTMOUSE"}


class PickTag(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.tag_pick"
    bl_label = "Pick Tag"
    bl_description = "Click a face in the 3D view to make its tag the active one"
    bl_options = {"REGISTER", "UNDO"}

    uid: IntProperty(
        name="Tag", description="The tag's stable number; 0 = click a face", options={"HIDDEN", "SKIP_SAVE"}
    )

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if tags.active(context.scene) is None:
            cls.poll_message_set("There is no tag yet")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        tag = tags.activate(context.scene, self.uid)
        carried = words.carries_or_not(context.scene, tag)
        self.report({"INFO"}, report("'{name}' is the active tag: {carried}.", name=tag.name, carried=carried))

    def invoke(self, context: bpy.types.Context, _event: bpy.types.Event) -> set[str]:
        if context.area is None or context.area.type != "VIEW_3D":
            self.report({"ERROR"}, report("Pick a tag in a 3D view."))
            return {"CANCELLED"}
        view.settings_of(context.scene).showing = "PART"
        upkeep.refresh()
        context.window.cursor_modal_set("EYEDROPPER")
        context.workspace.status_text_set(report("Click a face to make its tag the active one; Esc leaves"))
        context.window_manager.modal_handler_add(self)
        return {"RUNNING_MODAL"}

    def modal(self, context: bpy.types.Context, event: bpy.types.Event) -> set[str]:
        if event.type in LEAVE and event.value == "PRESS":
            return self._leave(context, {"CANCELLED"})
        if event.type == "MOUSEMOVE":
            context.workspace.status_text_set(_seen(context, picking.tag_at(context, event.mouse_x, event.mouse_y)))
        elif event.type in PICK and event.value == "PRESS":
            self.uid = picking.tag_at(context, event.mouse_x, event.mouse_y) or 0
            return self._leave(context, self.execute(context))
        else:
            # The view can be turned meanwhile.
            return {"PASS_THROUGH"}
        return {"RUNNING_MODAL"}

    def cancel(self, context: bpy.types.Context) -> None:
        self._leave(context, set())

    def _leave(self, context: bpy.types.Context, outcome: set[str]) -> set[str]:
        context.window.cursor_modal_restore()
        context.workspace.status_text_set(None)
        return outcome


def _seen(context: bpy.types.Context, uid: int | None) -> str:
    """What the status bar says of the face under the pointer."""
    tag = tags.of_uid(context.scene, uid or 0)
    if tag is not None:
        carried = words.carries_or_not(context.scene, tag)
        return report("'{name}': {carried}. Click to make it the active tag", name=tag.name, carried=carried)
    if uid is None:
        return report("Click a face to make its tag the active one; Esc leaves")
    return report("This face is in no tag; Esc leaves")


class _Grows(TellsTrouble):
    """Give ``patch``: the faces that a selection grows to."""

    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if context.mode != "EDIT_MESH":
            cls.poll_message_set("Select a face in edit mode first")
            return False
        return True

    def patch(self, facets: patches.Facets, seeds: np.ndarray) -> np.ndarray:
        raise NotImplementedError

    def act(self, context: bpy.types.Context) -> None:
        more = 0
        for part, seeds in tags.selections(context.objects_in_mode_unique_data):
            added = self.patch(patches.facets_of(part), seeds) & ~seeds
            tags.select(part.data, added)
            more += int(added.sum())
        self.report({"INFO"}, report("Faces added to the selection: {count}.", count=more))


class SelectFlat(_Grows, bpy.types.Operator):
    bl_idname = "fluxface.select_flat"
    bl_label = "Flat Patch"
    bl_description = "Grow the selection over each flat face it lies on, of however many pieces that is"

    angle: FloatProperty(
        name="Angle", description="How far a face may look another way than the selected one it is reached from",
        subtype="ANGLE", default=math.radians(1.0), min=0.0, max=math.radians(90.0),
    )  # fmt: skip

    def patch(self, facets: patches.Facets, seeds: np.ndarray) -> np.ndarray:
        return patches.flat_patch(facets, seeds, self.angle)


class SelectSmooth(_Grows, bpy.types.Operator):
    bl_idname = "fluxface.select_smooth"
    bl_label = "Smooth Patch"
    bl_description = "Grow the selection over the surface up to its sharp edges"

    angle: FloatProperty(
        name="Angle", description="An edge at which the surface turns by more than this ends the patch",
        subtype="ANGLE", default=math.radians(30.0), min=0.0, max=math.radians(180.0),
    )  # fmt: skip

    def patch(self, facets: patches.Facets, seeds: np.ndarray) -> np.ndarray:
        return patches.smooth_patch(facets, seeds, self.angle)


register, unregister = bpy.utils.register_classes_factory((PickTag, SelectFlat, SelectSmooth))
