"""What holds for every file: how much of the processor the solver may take."""

from __future__ import annotations

import bpy
from bpy.props import IntProperty

# The host knows preferences by the name of what was installed, of which this package is a part.
ADD_ON = __package__.rpartition(".")[0]


class Preferences(bpy.types.AddonPreferences):
    bl_idname = ADD_ON

    threads: IntProperty(
        name="Threads for the solver",
        description="How many of the processor's cores the solver may use; 0 = all of them, giving way to Blender. "
        "The temperatures are the same with any number",
        default=0, min=0, soft_max=32,
    )  # fmt: skip

    def draw(self, _context: bpy.types.Context) -> None:
        self.layout.use_property_split = True
        self.layout.prop(self, "threads")


def threads() -> int:
    """What the user chose; 0 where the add-on runs without being installed."""
    enabled = bpy.context.preferences.addons.get(ADD_ON)
    return enabled.preferences.threads if enabled and enabled.preferences else 0


register, unregister = bpy.utils.register_classes_factory((Preferences,))
