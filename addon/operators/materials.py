"""Materials of parts: tables over temperature, the user's own library, and emissivities of finishes."""

from __future__ import annotations

import bpy
from bpy.props import FloatProperty, StringProperty

from ...solver.errors import Trouble
from .. import materials, study, tags
from ..language import report
from .telling import TellsTrouble


class _OnPart(TellsTrouble):
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if study.active_part(context) is None:
            cls.poll_message_set("Make the part the active object")
            return False
        return True


class ChooseMaterial(_OnPart, bpy.types.Operator):
    bl_idname = "fluxface.material_choose"
    bl_label = "Choose Material"
    bl_description = "Make the part of this material"

    name: StringProperty(name="Material", description="Of the library, or one of your own")

    def act(self, context: bpy.types.Context) -> None:
        if self.name not in materials.at_hand():
            raise Trouble(
                "case", report("There is no material '{name}'.", name=self.name), "Choose one of the library."
            )
        study.active_part(context).fluxface.material.name = self.name


class AddTableRow(_OnPart, bpy.types.Operator):
    bl_idname = "fluxface.table_row_add"
    bl_label = "Add Row"
    bl_description = "Add a row to the table, 100 degrees above its last"

    which: StringProperty(options={"HIDDEN"})

    def act(self, context: bpy.types.Context) -> None:
        item = getattr(study.active_part(context).fluxface.material, self.which)
        last = (item.points[-1].temperature, item.points[-1].value) if item.points else (193.15, item.value)
        point = item.points.add()
        point.temperature, point.value = last[0] + 100.0, last[1]
        item.active_point = len(item.points) - 1


class RemoveTableRow(_OnPart, bpy.types.Operator):
    bl_idname = "fluxface.table_row_remove"
    bl_label = "Remove Row"
    bl_description = "Remove the active row of the table"

    which: StringProperty(options={"HIDDEN"})

    def act(self, context: bpy.types.Context) -> None:
        item = getattr(study.active_part(context).fluxface.material, self.which)
        item.points.remove(item.active_point)
        item.active_point = max(0, min(item.active_point, len(item.points) - 1))


class KeepMaterial(_OnPart, bpy.types.Operator):
    bl_idname = "fluxface.material_keep"
    bl_label = "Keep as My Material"
    bl_description = "Put this material in your own library, for every file; one of the same name is replaced"
    bl_options = {"REGISTER"}

    def act(self, context: bpy.types.Context) -> None:
        material = materials.material_of(study.active_part(context))
        if material.name in materials.library():
            raise Trouble(
                "case",
                report("'{name}' is a name of the built-in library.", name=material.name),
                "Give yours another name.",
            )
        materials.save_own(material)
        self.report({"INFO"}, report("'{name}' is now among your own materials", name=material.name))


class UseEmissivity(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.emissivity_use"
    bl_label = "Use Emissivity"
    bl_description = "Give the active tag this emissivity"
    bl_options = {"REGISTER", "UNDO"}

    emissivity: FloatProperty(name="Emissivity", description="Of the finish", min=0.0, max=1.0)

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if tags.active(context.scene) is None:
            cls.poll_message_set("There is no tag yet")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        tags.active(context.scene).emissivity = self.emissivity


register, unregister = bpy.utils.register_classes_factory(
    (ChooseMaterial, AddTableRow, RemoveTableRow, KeepMaterial, UseEmissivity)
)
