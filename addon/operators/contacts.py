"""Contacts between parts."""

from __future__ import annotations

import bpy

from .. import contacts, jobs
from .telling import Finish, TellsTrouble, WorksBeside


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


class FindContacts(WorksBeside, bpy.types.Operator):
    bl_idname = "fluxface.contacts_find"
    bl_label = "Find Contacts"
    bl_description = "List every pair of parts that lie against each other; contacts that are there keep their values"
    bl_options = {"REGISTER"}
    undo_step = "Find Contacts"

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if context.scene.fluxface.collection is None:
            cls.poll_message_set("Choose the collection that holds the parts")
            return False
        return super().poll(context)

    def start(self, context: bpy.types.Context) -> tuple[jobs.Job, Finish]:
        search = contacts.start(context)
        return search.job, lambda ending: contacts.finish(search, ending)


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
