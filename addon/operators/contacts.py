"""Contacts between parts."""

from __future__ import annotations

import bpy

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


register, unregister = bpy.utils.register_classes_factory((AddContact, RemoveContact))
