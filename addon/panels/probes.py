"""The probes and what they read."""

from __future__ import annotations

import bpy

from .. import probes, study
from ..units import signed_difference_text, temperature_text
from .result import OfResult


class ProbesPanel(OfResult, bpy.types.Panel):
    bl_idname = "FLUXFACE_PT_probes"
    bl_parent_id = "FLUXFACE_PT_result"
    bl_label = "Probes"

    def draw(self, context: bpy.types.Context) -> None:
        column = self.layout.column(align=True)
        for probe in probes.probes(study.parts(context)):
            row = column.row(align=True)
            split = row.split(factor=0.45)
            split.prop(probe, "name", text="")
            split.label(text=told(context.scene, probe))
            row.operator("fluxface.probe_remove", text="", icon="X").name = probe.name
        self.layout.operator("fluxface.read_temperatures", icon="EYEDROPPER")
        self.layout.operator("fluxface.probe_put", icon="PIVOT_CURSOR")


def told(scene: bpy.types.Scene, probe: bpy.types.Object) -> str:
    """As in "61.3 °C (−2.0 °C)": the change is the one since the run before."""
    kelvin, change = probes.reading(probe), probes.change(probe)
    if kelvin is None:
        return "off the surface"
    since = "" if change is None else f" ({signed_difference_text(scene, change)})"
    return temperature_text(scene, kelvin) + since


register, unregister = bpy.utils.register_classes_factory((ProbesPanel,))
