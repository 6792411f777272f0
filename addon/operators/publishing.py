"""What leaves the file: the picture and the report."""

from __future__ import annotations

from pathlib import Path

import bpy
from bpy.props import StringProperty

from .. import language, report, study, view
from ..report import PICTURE, REPORT
from .seeing import members_with_result
from .telling import TellsTrouble


class _Publishes(TellsTrouble):
    """Asks where to, and proposes ``file_name`` in the folder of the run that is shown."""

    file_name = ""

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return members_with_result(cls, context)

    def invoke(self, context: bpy.types.Context, _event: bpy.types.Event) -> set[str]:
        self.filepath = self.filepath or str(study.run_folder(context.scene, study.parts(context)) / self.file_name)
        context.window_manager.fileselect_add(self)
        return {"RUNNING_MODAL"}

    def path(self, context: bpy.types.Context) -> Path:
        given = (
            Path(bpy.path.abspath(self.filepath))
            if self.filepath
            else study.run_folder(context.scene, study.parts(context)) / self.file_name
        )
        return given.with_suffix(Path(self.file_name).suffix)


class RenderPicture(_Publishes, bpy.types.Operator):
    bl_idname = "fluxface.render_picture"
    bl_label = "Render Picture"
    bl_description = "Render the part in its temperatures with the legend, and save it as PNG"
    file_name = PICTURE

    filepath: StringProperty(
        name="Picture", description="The PNG to write; empty = beside the result", subtype="FILE_PATH"
    )
    filter_glob: StringProperty(default="*.png", options={"HIDDEN"})

    def act(self, context: bpy.types.Context) -> None:
        made = view.render_picture(context.scene, study.parts(context), self.path(context))
        self.report({"INFO"}, language.report("Picture saved as {file}", file=made))


class WriteReport(_Publishes, bpy.types.Operator):
    bl_idname = "fluxface.write_report"
    bl_label = "Write Report"
    bl_description = "One page on what was solved and what came of it: a single HTML file that prints to one A4"
    file_name = REPORT

    filepath: StringProperty(
        name="Report", description="The HTML to write; empty = beside the result", subtype="FILE_PATH"
    )
    filter_glob: StringProperty(default="*.html", options={"HIDDEN"})

    def act(self, context: bpy.types.Context) -> None:
        made = report.report_of(context.scene, study.parts(context), self.path(context))
        self.report({"INFO"}, language.report("Report saved as {file}", file=made))
        if not bpy.app.background:
            bpy.ops.wm.url_open(url=made.as_uri())


register, unregister = bpy.utils.register_classes_factory((RenderPicture, WriteReport))
