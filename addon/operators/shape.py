"""What is amiss with a part's shape: shown on it, and mended."""

from __future__ import annotations

import bpy
from bpy.props import IntProperty

from ...solver.errors import Trouble
from .. import inspection, jobs, ledger, mending, places, study, tags
from ..language import report
from .telling import Finish, TellsTrouble, WorksBeside


class ShowFinding(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.finding_show"
    bl_label = "Show It"
    bl_description = "Select the faces this is about, in edit mode, and bring them into view"
    bl_options = {"REGISTER", "UNDO"}

    which: IntProperty(options={"HIDDEN"})

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        part = study.active_part(context)
        if part is None or not inspection.findings(part):
            cls.poll_message_set("Nothing was found amiss with the active part")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        part = study.active_part(context)
        found = inspection.findings(part)
        if not 0 <= self.which < len(found):
            raise Trouble(
                "case",
                report("There is no finding of that number on '{name}'.", name=part.name),
                "Choose one in the sidebar.",
            )
        if not places.show(context, part, inspection.faces_of(part, self.which), found[self.which]["points"]):
            self.report({"INFO"}, report(places.ELSEWHERE))


class MendMesh(WorksBeside, bpy.types.Operator):
    bl_idname = "fluxface.mend"
    bl_label = "Mend This Mesh"
    bl_description = (
        "Weld, turn, close and untangle the part's own mesh until it bounds a solid; tags, materials and shading stay "
        "on their faces, other layers such as UV maps do not"
    )
    bl_options = {"REGISTER"}
    undo_step = "Mend This Mesh"

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        part = study.active_part(context)
        reason = _unfit(part)
        if reason:
            cls.poll_message_set(reason)
            return False
        return super().poll(context)

    def start(self, context: bpy.types.Context) -> tuple[jobs.Job, Finish]:
        begun = mending.start(context, study.active_part(context))
        return begun.job, lambda ending: mending.finish(begun, ending)


def _unfit(part: bpy.types.Object | None) -> str:
    """Why a part's mesh cannot be mended, or nothing."""
    if part is None:
        return "Make the part the active object"
    if part.data.library is not None or part.library is not None:
        return "The part is linked from another file; mend it there"
    if part.data.users > 1:
        return "Other objects share this mesh: make it a single user first (Object, Relations, Make Single User)"
    if part.modifiers:
        return "Apply the modifiers first: what is solved is the shape that they make"
    if part.data.shape_keys:
        return "Remove the shape keys first"
    return ""


class SelectUntagged(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.untagged_select"
    bl_label = "Select Untagged Faces"
    bl_description = "Select the faces that are in no tag, in edit mode"
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if study.active_part(context) is None:
            cls.poll_message_set("Make the part the active object")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        part = study.active_part(context)
        places.enter_edit_mode(context, part)
        free = tags.read(part.data) == 0
        if not free.any():
            raise Trouble("case", report("Every face of '{name}' is in a tag.", name=part.name), "")
        tags.select(part.data, free)


class DismissNotes(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.notes_dismiss"
    bl_label = "Dismiss"
    bl_description = "Take away what is told of the active part's mending and remeshing"
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        part = study.active_part(context)
        if part is None or not part.fluxface.notes:
            cls.poll_message_set("Nothing is told of the active part")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        study.active_part(context).fluxface.notes = ""


class AcceptAreas(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.areas_accept"
    bl_label = "As Meant"
    bl_description = "The tags have the areas they are meant to have: compare later ones with these"
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if not ledger.of_present(context):
            cls.poll_message_set("No tag has changed much since the last run")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        ledger.accept(context.scene, study.parts(context))


register, unregister = bpy.utils.register_classes_factory(
    (ShowFinding, MendMesh, SelectUntagged, DismissNotes, AcceptAreas)
)
