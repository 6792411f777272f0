"""The scene's tags, which faces they have, and what they carry."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble
from ...solver.materials import library
from .. import ledger, study, tags, words
from ..cases import FILM_NEEDS
from ..language import label
from ..presets import PRESETS
from ..properties import Terms
from ..units import area_text
from .sidebar import Sidebar, fields, paragraph


def areas(context: bpy.types.Context) -> dict[int, float]:
    """m² of each tag on the parts of the present study."""
    try:
        return study.tag_areas(context.scene, study.parts(context))
    except Trouble:
        return {}


class TagList(bpy.types.UIList):
    bl_idname = "FLUXFACE_UL_tags"

    def draw_item(self, context, layout, _settings, tag, _icon, _active, _property, _index) -> None:
        row = layout.row()
        swatch = row.row()
        swatch.ui_units_x = 0.6
        swatch.prop(tag, "colour", text="")
        lines = row.column(align=True)
        split = lines.split(factor=0.6)
        split.prop(tag, "name", text="", emboss=False)
        end = split.row()
        end.alignment = "RIGHT"
        area = areas(context).get(tag.uid)
        end.label(text=area_text(context.scene, area) if area else label("no faces"))
        carried = lines.row()
        carried.active = False
        carried.label(text=words.carries_or_not(context.scene, tag))


class TagsPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_tags"
    bl_label = "Face Tags"

    def draw(self, context: bpy.types.Context) -> None:
        layout, settings = self.layout, context.scene.fluxface
        row = layout.row()
        row.template_list("FLUXFACE_UL_tags", "", settings, "tags", settings, "active_tag", rows=3)
        buttons = row.column(align=True)
        buttons.operator("fluxface.tag_new", text="", icon="ADD")
        buttons.operator("fluxface.tag_delete", text="", icon="REMOVE")
        buttons.operator("fluxface.tag_pick", text="", icon="EYEDROPPER")
        buttons.menu("FLUXFACE_MT_tag_faces", text="", icon="DOWNARROW_HLT")
        if changed := ledger.of_present(context):
            box = layout.box()
            for sentence in changed:
                paragraph(context, box, sentence, "ERROR")
            box.operator("fluxface.areas_accept")
        tag = tags.active(context.scene)
        if tag is None:
            paragraph(context, layout, "Select faces in edit mode and press + to make a tag of them.", "INFO")
            return
        row = layout.row(align=True)
        row.operator("fluxface.tag_give")
        row.operator("fluxface.tag_take")
        row.operator("fluxface.tag_select")
        row = layout.row(align=True)
        row.prop(settings, "show_tags")
        rest = row.row()
        rest.active = settings.show_tags
        rest.prop(settings, "show_untagged")
        layout.menu("FLUXFACE_MT_presets", icon="PRESET")
        draw_terms(context, layout, tag)


class TagMeshPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_tag_mesh"
    bl_parent_id = "FLUXFACE_PT_tags"
    bl_label = "Mesh of the Tag"
    bl_options = {"DEFAULT_CLOSED"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return tags.active(context.scene) is not None

    def draw(self, context: bpy.types.Context) -> None:
        tag, column = tags.active(context.scene), fields(self.layout)
        column.prop(tag, "size")
        if tag.size == 0.0:
            column.label(text="Mesh size 0: as the part")


class UntaggedPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_untagged"
    bl_parent_id = "FLUXFACE_PT_tags"
    bl_label = "All Other Faces"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        untagged = context.scene.fluxface.untagged
        _draw_untagged_faces(context, self.layout)
        told = words.carries_or_not(context.scene, untagged)
        paragraph(context, self.layout, label("Faces without a tag: {carried}.", carried=told))
        draw_terms(context, self.layout, untagged)


def _draw_untagged_faces(context: bpy.types.Context, layout: bpy.types.UILayout) -> None:
    part = study.active_part(context)
    if part is not None and part.fluxface.body:
        count = part.fluxface.untagged_faces
        area = area_text(context.scene, part.fluxface.untagged)
        rest = label("Faces: {count}, {area}", count=count, area=area)
        layout.label(text=rest if count else label("Every face is in a tag"))
    layout.operator("fluxface.untagged_select", icon="RESTRICT_SELECT_OFF")


def draw_terms(context: bpy.types.Context, layout: bpy.types.UILayout, terms: Terms) -> None:
    """A switch for each term and, under it, its fields while it is on."""
    if message := words.clash(terms):
        paragraph(context, layout, message, "ERROR")
    layout.prop(terms, "insulated")
    column = layout.column()
    column.active = not terms.insulated
    for switch, draw in TERMS:
        column.prop(terms, switch)
        if getattr(terms, switch):
            row = column.row()
            row.separator(factor=0.5)
            draw(context, fields(row), terms)


def _draw_heat(_context: bpy.types.Context, column: bpy.types.UILayout, terms: Terms) -> None:
    column.prop(terms, "heat", text="Total (W)")


def _draw_heat_flux(_context: bpy.types.Context, column: bpy.types.UILayout, terms: Terms) -> None:
    column.prop(terms, "heat_flux", text="Flux (W/m²)")


def _draw_convection(_context: bpy.types.Context, column: bpy.types.UILayout, terms: Terms) -> None:
    column.prop(terms, "film", text="")
    if terms.film == "COEFFICIENT":
        column.prop(terms, "coefficient", text="Film (W/m²K)")
    else:
        column.prop(terms, "fluid", text="")
        for key in FILM_NEEDS.get(terms.film, ()):
            column.prop(terms, key)
    column.prop(terms, "ambient")


def _draw_radiation(context: bpy.types.Context, column: bpy.types.UILayout, terms: Terms) -> None:
    row = column.row(align=True)
    row.prop(terms, "emissivity")
    if terms == tags.active(context.scene):
        row.menu("FLUXFACE_MT_finishes", text="", icon="DOWNARROW_HLT")
    column.prop(terms, "surroundings", text="Walls at")


def _draw_temperature(_context: bpy.types.Context, column: bpy.types.UILayout, terms: Terms) -> None:
    column.prop(terms, "temperature")


TERMS = (
    ("use_heat", _draw_heat),
    ("use_heat_flux", _draw_heat_flux),
    ("use_convection", _draw_convection),
    ("use_radiation", _draw_radiation),
    ("use_temperature", _draw_temperature),
)


class TagFacesMenu(bpy.types.Menu):
    bl_idname = "FLUXFACE_MT_tag_faces"
    bl_label = "Face Tags"
    bl_description = "Select and move the faces of tags, and grow a selection to a patch"

    def draw(self, _context: bpy.types.Context) -> None:
        layout = self.layout
        layout.operator("fluxface.select_flat", icon="SNAP_FACE")
        layout.operator("fluxface.select_smooth", icon="SMOOTHCURVE")
        layout.separator()
        layout.operator("fluxface.tag_select", text="Faces of the Active Tag", icon="RESTRICT_SELECT_OFF")
        layout.operator("fluxface.untagged_select", text="Untagged Faces")
        layout.separator()
        layout.operator("fluxface.tag_move", icon="FORWARD")


def offer_in_select_menu(menu: bpy.types.Menu, _context: bpy.types.Context) -> None:
    """In the host's own menu of edit mode, one line."""
    menu.layout.separator()
    menu.layout.menu(TagFacesMenu.bl_idname)


class PresetsMenu(bpy.types.Menu):
    bl_idname = "FLUXFACE_MT_presets"
    bl_label = "Usual Surroundings"
    bl_description = "Air, water or a hand about the faces of the tag: figures to start from"

    def draw(self, _context: bpy.types.Context) -> None:
        for number, preset in enumerate(PRESETS):
            self.layout.operator("fluxface.preset_use", text=preset.name).which = number


class FinishesMenu(bpy.types.Menu):
    bl_idname = "FLUXFACE_MT_finishes"
    bl_label = "Finish"
    bl_description = "Emissivity of a usual finish of the part's material"

    def draw(self, context: bpy.types.Context) -> None:
        part = study.active_part(context)
        row = library().get(part.fluxface.material.name) if part else None
        if row is None:
            self.layout.label(text="Choose a library material first")
            return
        for finish, emissivity in row.emissivity.items():
            text = f"{row.material.name}, {finish}: {emissivity:g}"
            self.layout.operator("fluxface.emissivity_use", text=text).emissivity = emissivity


_register, _unregister = bpy.utils.register_classes_factory(
    (TagList, TagFacesMenu, PresetsMenu, FinishesMenu, TagsPanel, TagMeshPanel, UntaggedPanel)
)


def register() -> None:
    _register()
    bpy.types.VIEW3D_MT_select_edit_mesh.append(offer_in_select_menu)


def unregister() -> None:
    bpy.types.VIEW3D_MT_select_edit_mesh.remove(offer_in_select_menu)
    _unregister()
