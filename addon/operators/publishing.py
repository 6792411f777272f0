"""What leaves the file: the picture and the report."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import bpy
from bpy.props import StringProperty

from ...solver.errors import Trouble
from .. import language, report, study, view
from ..report import PICTURE, REPORT
from .seeing import members_with_result
from .telling import TellsTrouble

SECONDS_BETWEEN_PICTURES = 0.1


class _OfResult(TellsTrouble):
    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return members_with_result(cls, context)


class _Publishes(_OfResult):
    """Asks where to, and proposes ``file_name`` in the folder of the run that is shown."""

    file_name = ""

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


def _saved(count: int, folder: Path) -> str:
    return language.report("{count} pictures saved in {folder}", count=count, folder=folder)


class _RendersSeveral(_OfResult):
    """One picture at each tick of the window's clock, until all are made or Esc is pressed; at once from a script."""

    def pictures(self, context: bpy.types.Context, folder: Path) -> Iterator[Path]:
        raise NotImplementedError

    def count(self, context: bpy.types.Context) -> int:
        raise NotImplementedError

    def begin(self, context: bpy.types.Context) -> None:
        self._folder = study.run_folder(context.scene, study.parts(context))
        self._left, self._made = self.pictures(context, self._folder), 0

    def act(self, context: bpy.types.Context) -> None:
        self.begin(context)
        self._made = sum(1 for _ in self._left)
        self.report({"INFO"}, _saved(self._made, self._folder))

    def invoke(self, context: bpy.types.Context, _event: bpy.types.Event) -> set[str]:
        if bpy.app.background:
            return self.execute(context)
        self.begin(context)
        self._timer = context.window_manager.event_timer_add(SECONDS_BETWEEN_PICTURES, window=context.window)
        context.window_manager.modal_handler_add(self)
        return {"RUNNING_MODAL"}

    def modal(self, context: bpy.types.Context, event: bpy.types.Event) -> set[str]:
        if event.type == "ESC":
            return self._end(context, {"CANCELLED"})
        if event.type != "TIMER":
            return {"PASS_THROUGH"}
        try:
            next(self._left)
        except StopIteration:
            return self._end(context, {"FINISHED"})
        except Trouble as trouble:
            self.report({"ERROR"}, f"{trouble.message} {trouble.mend}".strip())
            return self._end(context, {"CANCELLED"})
        self._made += 1
        told = language.report(
            "Picture {number} of {count} is made; Esc stops", number=self._made, count=self.count(context)
        )
        context.workspace.status_text_set(told)
        return {"RUNNING_MODAL"}

    def _end(self, context: bpy.types.Context, ending: set[str]) -> set[str]:
        context.window_manager.event_timer_remove(self._timer)
        context.workspace.status_text_set(None)
        self.report({"INFO"}, _saved(self._made, self._folder))
        return ending


class RenderViews(_RendersSeveral, bpy.types.Operator):
    bl_idname = "fluxface.render_views"
    bl_label = "Render Views"
    bl_description = "Render the part from each of the chosen sides, in one range of colours, into the run's folder"

    def count(self, context: bpy.types.Context) -> int:
        return len(view.settings_of(context.scene).view_names)

    def pictures(self, context: bpy.types.Context, folder: Path) -> Iterator[Path]:
        chosen = [name for name in view.VIEWS if name in view.settings_of(context.scene).view_names]
        return view.render_views(context.scene, study.parts(context), folder, chosen)


class RenderTurntable(_RendersSeveral, bpy.types.Operator):
    bl_idname = "fluxface.render_turntable"
    bl_label = "Render Turntable"
    bl_description = "Render numbered pictures from all around the part, to be played as a film, into the run's folder"

    def count(self, context: bpy.types.Context) -> int:
        return view.settings_of(context.scene).turns

    def pictures(self, context: bpy.types.Context, folder: Path) -> Iterator[Path]:
        turns = view.settings_of(context.scene).turns
        return view.render_turntable(context.scene, study.parts(context), folder / "turntable", turns)


register, unregister = bpy.utils.register_classes_factory((RenderPicture, RenderViews, RenderTurntable, WriteReport))
