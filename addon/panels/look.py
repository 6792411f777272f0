"""How the result is shown, and the picture and report of it."""

from __future__ import annotations

import bpy

from .. import view
from .result import OfResult
from .sidebar import named


class LookPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_look"
    bl_label = "View and Picture"

    def draw(self, context: bpy.types.Context) -> None:
        view.draw_settings(self.layout, context.scene)
        named(self.layout, "Render with").prop(view.settings_of(context.scene), "engine", text="")
        self.layout.operator("fluxface.render_picture", icon="RENDER_STILL")
        self.layout.operator("fluxface.write_report", icon="DOCUMENTS")


register, unregister = bpy.utils.register_classes_factory((LookPanel,))
