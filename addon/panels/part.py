"""What the active part is made of, and the heat released in it."""

from __future__ import annotations

import bpy

from ...solver.materials import Material
from .. import materials, study
from ..language import label
from ..properties import MaterialProperty
from .sidebar import Sidebar, fields, named, pair, paragraph


class _OfPart(Sidebar):
    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return study.active_part(context) is not None


class MaterialPanel(_OfPart, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_material"
    bl_label = "Material"

    def draw(self, context: bpy.types.Context) -> None:
        part = study.active_part(context)
        values = part.fluxface.material
        if context.scene.fluxface.collection is not None:
            self.layout.label(text=label("of '{name}'", name=part.name))
        row = self.layout.row(align=True)
        row.prop(values, "name", text="", icon="MATERIAL", placeholder="Search the library")
        row.menu("FLUXFACE_MT_materials", text="", icon="DOWNARROW_HLT")
        if not values.name:
            paragraph(context, self.layout, label("Choose what '{name}' is made of.", name=part.name), "INFO")
            return
        _draw_conductivity(self.layout, values)
        if values.conductivity.value <= 0.0 and not values.conductivity.tabulated:
            paragraph(context, self.layout, "Conductivity must be greater than zero.", "ERROR")


def _draw_conductivity(layout: bpy.types.UILayout, values: bpy.types.PropertyGroup) -> None:
    column = fields(layout)
    _draw_number(column, values.conductivity, "Conductivity (W/mK)" if not values.directional else "Along x (W/mK)")
    if values.directional:
        _draw_number(column, values.along_y, "Along y (W/mK)")
        _draw_number(column, values.along_z, "Along z (W/mK)")
        named(column, "Axes of").prop(values, "axes", text="")
    column.prop(values, "directional")


def _draw_number(column: bpy.types.UILayout, item: MaterialProperty, text: str) -> None:
    if item.tabulated:
        first, last = (item.points[0].value, item.points[-1].value) if item.points else (0.0, 0.0)
        span = label("{first:g} to {last:g}", first=first, last=last) if item.points else "no rows yet"
        pair(column, text, span)
    else:
        column.prop(item, "value", text=text)


class MaterialDetailsPanel(_OfPart, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_material_details"
    bl_parent_id = "FLUXFACE_PT_material"
    bl_label = "Source and Tables"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        values = study.active_part(context).fluxface.material
        source = materials.source_of(values)
        paragraph(context, self.layout, source or "Your own values.")
        column = fields(self.layout)
        column.prop(values, "density")
        which = [("conductivity", "Conductivity (W/mK)"), ("heat_capacity", "Heat capacity (J/kgK)")]
        if values.directional:
            which[:1] = [(key, f"Along {key[-1]} (W/mK)") for key in ("along_y", "along_z")]
            which.insert(0, ("conductivity", "Along x (W/mK)"))
        for key, text in which:
            _draw_table(self.layout, getattr(values, key), key, text)
        self.layout.operator("fluxface.material_keep", icon="FILE_TICK")


def _draw_table(layout: bpy.types.UILayout, item: MaterialProperty, key: str, text: str) -> None:
    box = layout.box()
    box.row().prop(item, "tabulated", text=text.replace(" (", " table ("))
    if not item.tabulated:
        fields(box).prop(item, "value", text=text)
        return
    row = box.row()
    row.template_list("FLUXFACE_UL_table", key, item, "points", item, "active_point", rows=3)
    buttons = row.column(align=True)
    buttons.operator("fluxface.table_row_add", text="", icon="ADD").which = key
    buttons.operator("fluxface.table_row_remove", text="", icon="REMOVE").which = key


class TableList(bpy.types.UIList):
    bl_idname = "FLUXFACE_UL_table"

    def draw_item(self, _context, layout, _item, point, _icon, _active, _property, _index) -> None:
        row = layout.row(align=True)
        row.prop(point, "temperature", text="", emboss=False)
        row.prop(point, "value", text="", emboss=False)


class VolumeHeatPanel(_OfPart, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_volume_heat"
    bl_label = "Heat in the Volume"
    bl_options = {"DEFAULT_CLOSED"}

    def draw(self, context: bpy.types.Context) -> None:
        settings = study.active_part(context).fluxface
        self.layout.row().prop(settings, "heat_kind", expand=True)
        fields(self.layout).prop(settings, "heat" if settings.heat_kind == "TOTAL" else "heat_density")


class MaterialsMenu(bpy.types.Menu):
    bl_idname = "FLUXFACE_MT_materials"
    bl_label = "Materials"
    bl_description = "The library by groups, and your own"

    def draw(self, _context: bpy.types.Context) -> None:
        for menu in GROUP_MENUS:
            self.layout.menu(menu.bl_idname)
        for name, material in materials.at_hand().items():
            if name not in materials.library():
                _offer(self.layout, material)


def _offer(layout: bpy.types.UILayout, material: Material) -> None:
    text = f"{material.name}   {materials.conductivity_text(material)}"
    layout.operator("fluxface.material_choose", text=text).name = material.name


def _menu_of(group: str) -> type[bpy.types.Menu]:
    """The host takes a submenu by a class of its own only."""

    def draw(self: bpy.types.Menu, _context: bpy.types.Context) -> None:
        for row in materials.library().values():
            if row.group == group:
                _offer(self.layout, row.material)

    name = f"FLUXFACE_MT_materials_{group.replace(' ', '_')}"
    return type(name, (bpy.types.Menu,), {"bl_idname": name, "bl_label": group.capitalize(), "draw": draw})


GROUP_MENUS = tuple(_menu_of(group) for group in dict.fromkeys(row.group for row in materials.library().values()))

register, unregister = bpy.utils.register_classes_factory(
    (*GROUP_MENUS, MaterialsMenu, MaterialPanel, TableList, MaterialDetailsPanel, VolumeHeatPanel)
)
