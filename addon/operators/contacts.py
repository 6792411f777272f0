"""Contacts between parts."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble
from .. import contacts, running
from .telling import TellsTrouble


class AddContact(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.contact_add"
    bl_label = "Add Contact"
    bl_description = "Let heat cross between two parts; with two parts selected, between those"
    bl_options = {"REGISTER", "UNDO"}

    def act(self, context: bpy.types.Context) -> None:
        settings = context.scene.fluxface
        contact = settings.contacts.add()
        settings.active_contact = len(settings.contacts) - 1
        chosen = [thing for thing in context.selected_objects if thing.type == "MESH"]
        if len(chosen) == 2:
            contact.first, contact.second = chosen


class FindContacts(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.contacts_find"
    bl_label = "Find Contacts"
    bl_description = "List every pair of parts that lie against each other; contacts that are there keep their values"
    bl_options = {"REGISTER"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if context.scene.fluxface.collection is None:
            cls.poll_message_set("Choose the collection that holds the parts")
            return False
        if context.window_manager.fluxface.running:
            cls.poll_message_set("The solver is running")
            return False
        return True

    def invoke(self, context: bpy.types.Context, _event: bpy.types.Event) -> set[str]:
        if bpy.app.background:
            return self.execute(context)
        try:
            search = contacts.start(context)
        except Trouble as trouble:
            self.report({"ERROR"}, f"{trouble.message} {trouble.mend}".strip())
            return {"CANCELLED"}
        running.watch(search.job, lambda ending: contacts.finish(search, ending), "Find Contacts")
        return {"FINISHED"}

    def act(self, context: bpy.types.Context) -> None:
        search = contacts.start(context)
        trouble = contacts.finish(search, running.wait(search.job))
        if trouble:
            raise trouble


class RemoveContact(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.contact_remove"
    bl_label = "Remove Contact"
    bl_description = "Remove the active contact"
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if not context.scene.fluxface.contacts:
            cls.poll_message_set("There is no contact yet")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        settings = context.scene.fluxface
        settings.contacts.remove(settings.active_contact)
        settings.active_contact = max(0, min(settings.active_contact, len(settings.contacts) - 1))


register, unregister = bpy.utils.register_classes_factory((AddContact, FindContacts, RemoveContact))
