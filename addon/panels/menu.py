"""All that can be done, as a menu of the 3D view: what stands in a menu is found by the host's search, F3."""

from __future__ import annotations

import bpy

# Groups in the order of the work. What acts on one row of a list (a finding, a preset, a table) stays beside its row.
COMMANDS = (
    ("tag_new", "tag_give", "tag_take", "tag_pick", "tag_move", "tag_delete", "tag_select", "untagged_select"),
    ("select_flat", "select_smooth"),
    ("mend", "material_keep", "contact_add", "contacts_find"),
    ("run", "cancel"),
    ("cut_open", "close_cut", "read_temperatures", "probe_put"),
    ("run_compare", "end_comparison", "run_log", "run_folder"),
    ("render_picture", "render_views", "render_turntable", "write_report", "show_true_colours"),
)


class CommandsMenu(bpy.types.Menu):
    bl_idname = "FLUXFACE_MT_commands"
    bl_label = "Fluxface"

    def draw(self, _context: bpy.types.Context) -> None:
        for number, group in enumerate(COMMANDS):
            if number:
                self.layout.separator()
            for name in group:
                self.layout.operator(f"fluxface.{name}")


def offer(menu: bpy.types.Menu, _context: bpy.types.Context) -> None:
    menu.layout.separator()
    menu.layout.menu(CommandsMenu.bl_idname)


def register() -> None:
    bpy.utils.register_class(CommandsMenu)
    for host_menu in (bpy.types.VIEW3D_MT_object, bpy.types.VIEW3D_MT_edit_mesh):
        host_menu.append(offer)


def unregister() -> None:
    for host_menu in (bpy.types.VIEW3D_MT_object, bpy.types.VIEW3D_MT_edit_mesh):
        host_menu.remove(offer)
    bpy.utils.unregister_class(CommandsMenu)
