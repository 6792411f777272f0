"""Run, how far it is, and what went wrong."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble
from .. import study
from ..language import label
from ..properties import Outcome
from .sidebar import Sidebar, paragraph


class RunPanel(Sidebar, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_run"
    bl_label = "Run"

    def draw(self, context: bpy.types.Context) -> None:
        layout, state = self.layout, context.window_manager.fluxface
        if state.running:
            layout.progress(factor=state.fraction, text=state.text)
            layout.operator("fluxface.cancel", icon="CANCEL")
            return
        run = layout.row()
        run.scale_y = 1.4
        run.operator("fluxface.run", icon="PLAY")
        try:
            members = study.parts(context)
        except Trouble:
            return
        left = study.outcome(context.scene, members)
        if left.message:
            _draw_trouble(context, layout, left)
        icon, told = standing(context, left)
        paragraph(context, layout, told, icon)
        layout.prop(context.scene.fluxface, "auto_run")


def standing(context: bpy.types.Context, left: Outcome) -> tuple[str, str]:
    """An icon and a few words for how the result shown relates to the present settings."""
    if not left.summary:
        return "BLANK1", "Not run yet"
    if left.live:
        return "RADIOBUT_ON", "Live: Run confirms these loads"
    if study.is_current(context.scene, study.parts(context)):
        return "CHECKMARK", "The result is current"
    changed = ", ".join(study.changes(context.scene, study.parts(context)))
    return "FILE_REFRESH", label("Changed since the last run: {kinds}", kinds=changed)


def _draw_trouble(context: bpy.types.Context, layout: bpy.types.UILayout, left: Outcome) -> None:
    box = layout.box()
    paragraph(context, box, left.message, "ERROR")
    if left.mend:
        paragraph(context, box, left.mend)
    if len(left.faces) > 2 or len(left.points) > 2:
        box.operator("fluxface.show_place", icon="VIEWZOOM")


register, unregister = bpy.utils.register_classes_factory((RunPanel,))
