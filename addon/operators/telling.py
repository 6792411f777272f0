"""An operator whose trouble reaches the designer as one plain sentence."""

from __future__ import annotations

import bpy

from ...solver.errors import Trouble


class TellsTrouble:
    """Give ``act``; what it raises as Trouble is reported, and from a script it is raised as RuntimeError."""

    def act(self, context: bpy.types.Context) -> None:
        raise NotImplementedError

    def execute(self, context: bpy.types.Context) -> set[str]:
        try:
            self.act(context)
        except Trouble as trouble:
            self.report({"ERROR"}, f"{trouble.message} {trouble.mend}".strip())
            return {"CANCELLED"}
        return {"FINISHED"}
