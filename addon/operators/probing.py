"""Temperatures read at the pointer, and probes that stay."""

from __future__ import annotations

import bpy
from bpy.props import StringProperty
from bpy_extras.view3d_utils import region_2d_to_origin_3d, region_2d_to_vector_3d
from mathutils import Vector

from ...solver.errors import Trouble
from .. import host, picking, probes, study
from ..language import report
from ..units import temperature_text
from .seeing import members_with_result
from .telling import TellsTrouble

LEAVE, PUT = ("ESC", "RIGHTMOUSE", "RET"), ("LEFTMOUSE",)


class _OfResult(TellsTrouble):
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return members_with_result(cls, context)


class ReadTemperatures(_OfResult, bpy.types.Operator):
    bl_idname = "fluxface.read_temperatures"
    bl_label = "Read Temperatures"
    bl_description = "Tell the temperature under the pointer in the status bar; a click leaves a probe there"

    def act(self, context: bpy.types.Context) -> None:
        raise Trouble("case", "There is no pointer to read at here.", "Put a probe at the 3D cursor instead.")

    def invoke(self, context: bpy.types.Context, _event: bpy.types.Event) -> set[str]:
        if context.area is None or context.area.type != "VIEW_3D":
            self.report({"ERROR"}, report("Read temperatures in a 3D view."))
            return {"CANCELLED"}
        context.window.cursor_modal_set("CROSSHAIR")
        context.workspace.status_text_set(report("Move over the part; a click leaves a probe, Esc leaves"))
        context.window_manager.modal_handler_add(self)
        return {"RUNNING_MODAL"}

    def modal(self, context: bpy.types.Context, event: bpy.types.Event) -> set[str]:
        if event.type in LEAVE and event.value == "PRESS":
            return self._leave(context)
        if event.type == "MOUSEMOVE":
            context.workspace.status_text_set(_told(context, _met(context, event)))
        elif event.type in PUT and event.value == "PRESS" and (met := _met(context, event)):
            probes.put(met[0], met[1])
            host.push_undo("Put a Probe")
        else:
            # The view can be turned meanwhile.
            return {"PASS_THROUGH"}
        return {"RUNNING_MODAL"}

    def cancel(self, context: bpy.types.Context) -> None:
        self._leave(context)

    def _leave(self, context: bpy.types.Context) -> set[str]:
        context.window.cursor_modal_restore()
        context.workspace.status_text_set(None)
        return {"FINISHED"}


def _met(context: bpy.types.Context, event: bpy.types.Event) -> tuple[bpy.types.Object, Vector, float] | None:
    """What the pointer is on, as ``probes.under`` gives it."""
    found = picking.view_at(context.window, event.mouse_x, event.mouse_y)
    if found is None:
        return None
    space, region = found
    pixel, seen = (event.mouse_x - region.x, event.mouse_y - region.y), space.region_3d
    origin, way = region_2d_to_origin_3d(region, seen, pixel), region_2d_to_vector_3d(region, seen, pixel)
    return probes.under(study.parts(context), origin, way)


def _told(context: bpy.types.Context, met: tuple[bpy.types.Object, Vector, float] | None) -> str:
    if met is None:
        return report("Move over the part; a click leaves a probe, Esc leaves")
    part, _, kelvin = met
    there = temperature_text(context.scene, kelvin)
    return report("{temperature} on {part}; a click leaves a probe, Esc leaves", temperature=there, part=part.name)


class PutProbe(_OfResult, bpy.types.Operator):
    bl_idname = "fluxface.probe_put"
    bl_label = "Probe at the 3D Cursor"
    bl_description = "Leave a probe at the 3D cursor, which tells the temperature of the surface there after each run"

    name: StringProperty(name="Name", description="What the place is", default="Probe")

    def act(self, context: bpy.types.Context) -> None:
        probe = probes.put(study.parts(context)[0], context.scene.cursor.location, self.name)
        if probes.reading(probe) is None:
            self.report({"WARNING"}, report("The 3D cursor is not on the part, so the probe reads nothing there."))


class RemoveProbe(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.probe_remove"
    bl_label = "Remove Probe"
    bl_description = "Take this probe away"
    bl_options = {"REGISTER", "UNDO"}

    name: StringProperty(name="Name", description="The probe's name")

    def act(self, context: bpy.types.Context) -> None:
        probe = next((one for one in probes.probes(study.parts(context)) if one.name == self.name), None)
        if probe is None:
            raise Trouble("case", report("There is no probe '{name}'.", name=self.name), "Choose one of the list.")
        bpy.data.objects.remove(probe)


register, unregister = bpy.utils.register_classes_factory((ReadTemperatures, PutProbe, RemoveProbe))
