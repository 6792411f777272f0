"""Where the parts of a collection lie against each other."""

from __future__ import annotations

import bpy

from .. import words
from ..units import area_text
from .sidebar import Sidebar, fields, named, paragraph

FIELDS = {
    "CONDUCTANCE": ("conductance",),
    "RESISTANCE": ("resistance",),
    "FILLER": ("thickness", "conductivity"),
    "BONDED": (),
}


class ContactList(bpy.types.UIList):
    bl_idname = "FLUXFACE_UL_contacts"

    def draw_item(self, context, layout, _settings, contact, _icon, _active, _property, _index) -> None:
        pair = " / ".join(side.name if side else "?" for side in (contact.first, contact.second))
        lines = layout.column(align=True)
        split = lines.split(factor=0.65)
        split.label(text=pair)
        end = split.row()
        end.alignment = "RIGHT"
        end.label(text=area_text(context.scene, contact.area) if contact.area else "")
        carried = lines.row()
        carried.active = False
        carried.label(text=words.crossing(context.scene, contact))


class ContactsPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_contacts"
    bl_label = "Contacts"

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return context.scene.fluxface.collection is not None

    def draw(self, context: bpy.types.Context) -> None:
        layout, settings = self.layout, context.scene.fluxface
        row = layout.row()
        row.template_list("FLUXFACE_UL_contacts", "", settings, "contacts", settings, "active_contact", rows=3)
        buttons = row.column(align=True)
        buttons.operator("fluxface.contact_add", text="", icon="ADD")
        buttons.operator("fluxface.contact_remove", text="", icon="REMOVE")
        layout.operator("fluxface.contacts_find", icon="VIEWZOOM")
        if not 0 <= settings.active_contact < len(settings.contacts):
            paragraph(context, layout, "Parts exchange no heat until a contact says how.", "INFO")
            return
        contact = settings.contacts[settings.active_contact]
        column = fields(layout)
        named(column, "Part").prop(contact, "first", text="")
        named(column, "and").prop(contact, "second", text="")
        named(column, "Crossing").prop(contact, "crossing", text="")
        column.separator()
        for key in (*FIELDS[contact.crossing], "gap"):
            column.prop(contact, key)


register, unregister = bpy.utils.register_classes_factory((ContactList, ContactsPanel))
