"""Property groups as plain JSON and back: for copies kept with a mesh and for seeing whether anything changed."""

from __future__ import annotations

from typing import Any

import bpy

from .units import as_typed


def as_json(group: bpy.types.PropertyGroup) -> dict[str, Any]:
    """Every property of ``group``; an object it points at is given by name."""
    properties = (item for item in group.bl_rna.properties if item.identifier != "rna_type")
    return {item.identifier: _value(getattr(group, item.identifier), item) for item in properties}


def _value(value: Any, item: bpy.types.Property) -> Any:
    if item.type == "COLLECTION":
        return [as_json(member) for member in value]
    if item.type == "POINTER":
        return as_json(value) if isinstance(value, bpy.types.PropertyGroup) else value and value.name
    if item.type == "FLOAT":
        return [as_typed(number) for number in value] if item.is_array else as_typed(value)
    return value


def fill(group: bpy.types.PropertyGroup, document: dict[str, Any]) -> None:
    """Set the properties of ``group`` that ``document`` holds; what it holds beyond them is left alone.

    An older or newer file may know other properties, so unknown keys and values are no error.
    """
    for item in group.bl_rna.properties:
        value = document.get(item.identifier)
        if value is None or item.identifier == "rna_type":
            continue
        target = getattr(group, item.identifier)
        if item.type == "COLLECTION":
            target.clear()
            for member in value:
                fill(target.add(), member)
        elif item.type == "POINTER":
            if isinstance(target, bpy.types.PropertyGroup):
                fill(target, value)
        elif item.type != "ENUM" or value in item.enum_items:
            setattr(group, item.identifier, value)
