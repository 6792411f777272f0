"""What all panels share: their place, and text in the width there is."""

from __future__ import annotations

import textwrap

import bpy

from ..language import label

# Pixels of a usual letter and of what stands beside the text, at the host's scale of one.
LETTER, BESIDE = 6.2, 50.0
NARROWEST = 20


class Sidebar:
    bl_space_type = "VIEW_3D"
    bl_region_type = "UI"
    bl_category = "Fluxface"


def paragraph(context: bpy.types.Context, layout: bpy.types.UILayout, text: str, icon: str = "NONE") -> None:
    """Text over as many lines as the width of the sidebar asks for; the host cuts off longer labels."""
    column = layout.column(align=True)
    column.scale_y = 0.8
    icon_width = 0.0 if icon == "NONE" else 20.0
    width = context.region.width / context.preferences.system.ui_scale - BESIDE - icon_width
    lines = textwrap.wrap(label(text), max(NARROWEST, int(width / LETTER)))
    for number, line in enumerate(lines):
        if icon == "NONE":
            column.label(text=line, translate=False)
        else:
            column.label(text=line, icon=icon if number == 0 else "BLANK1", translate=False)


def pair(layout: bpy.types.UILayout, name: str, value: str, icon: str = "NONE") -> None:
    """A name at the left and its value at the right."""
    row = layout.row()
    row.label(text=name, icon=icon)
    end = row.row()
    end.alignment = "RIGHT"
    end.label(text=value)


def fields(layout: bpy.types.UILayout) -> bpy.types.UILayout:
    """A column of fields with their names inside: in front of them there is no room for a name with its unit."""
    column = layout.column(align=True)
    column.use_property_decorate = False
    return column


def named(layout: bpy.types.UILayout, name: str) -> bpy.types.UILayout:
    """A row with a name in front, for fields that cannot hold it."""
    split = layout.split(factor=0.32)
    split.label(text=name)
    return split.row(align=True)
