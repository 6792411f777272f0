"""Look at a kept run's folder, or let the run go."""

from __future__ import annotations

import shutil
from pathlib import Path

import bpy
from bpy.props import StringProperty

from ...solver.errors import Trouble
from .. import comparing, history, host, study
from ..language import report
from ..properties import KeptRun, Outcome
from ..run_log import LOG_FILE
from .seeing import members_with_result
from .telling import TellsTrouble


def chosen(context: bpy.types.Context) -> tuple[Outcome, KeptRun] | None:
    """What is left of the present study and the run that is chosen in its list."""
    try:
        left = study.outcome(context.scene, study.parts(context))
    except Trouble:
        return None
    return (left, left.runs[left.active_run]) if left.active_run < len(left.runs) else None


class _OfRun(TellsTrouble):
    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        if chosen(context) is None:
            cls.poll_message_set("No run is kept yet")
            return False
        return True


class OpenRunFolder(_OfRun, bpy.types.Operator):
    bl_idname = "fluxface.run_folder"
    bl_label = "Open Its Folder"
    bl_description = "Open the folder that holds the chosen run: its case, what came of it, and its pictures"

    def act(self, context: bpy.types.Context) -> None:
        _, run = chosen(context)
        if not Path(run.folder).is_dir():
            raise Trouble(
                "case",
                report("The folder {folder} is not there any more.", folder=run.folder),
                "Put it back, or run again.",
            )
        bpy.ops.wm.path_open(filepath=run.folder)


class ShowRunLog(_OfRun, bpy.types.Operator):
    bl_idname = "fluxface.run_log"
    bl_label = "Show Its Log"
    bl_description = "Open what the solver did and said in the chosen run: sizes, seconds, mending and warnings"

    def act(self, context: bpy.types.Context) -> None:
        _, run = chosen(context)
        file = Path(run.folder) / LOG_FILE
        if not file.is_file():
            raise Trouble("case", f"There is no log in {run.folder}.", "Put the folder back, or run again.")
        log = bpy.data.texts.new(f"Log of {history.when(run)}")
        log.write(file.read_text("utf-8"))
        log.cursor_set(0)
        host.show_text(log)


class ForgetRun(_OfRun, bpy.types.Operator):
    bl_idname = "fluxface.run_forget"
    bl_label = "Delete This Run"
    bl_description = "Delete the chosen run's folder from the disk; what is shown on the part stays"

    def invoke(self, context: bpy.types.Context, event: bpy.types.Event) -> set[str]:
        return context.window_manager.invoke_confirm(self, event)

    def act(self, context: bpy.types.Context) -> None:
        left, run = chosen(context)
        case = Path(run.folder).parent.parent
        try:
            shutil.rmtree(run.folder)
        except FileNotFoundError:
            pass
        except OSError as error:
            raise Trouble(
                "case",
                report("The run cannot be deleted: {reason}.", reason=error.strerror),
                report("Look at {folder}.", folder=run.folder),
            ) from error
        history.refresh(left, case)
        comparing.share_range(context.scene, left)


NOW = "NOW"


class CompareRun(_OfRun, bpy.types.Operator):
    bl_idname = "fluxface.run_compare"
    bl_label = "Compare with This Run"
    bl_description = "Show how much hotter or colder each place is than in the chosen run"
    bl_options = {"REGISTER", "UNDO"}

    later: StringProperty(
        name="Later run", description="The folder of the run that is compared with the chosen one; NOW = what is shown",
        default=NOW, options={"SKIP_SAVE"},
    )  # fmt: skip

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        return super().poll(context) and members_with_result(cls, context)

    def act(self, context: bpy.types.Context) -> None:
        left, run = chosen(context)
        later = None if self.later == NOW else left.runs.get(self.later)
        if later is None and self.later != NOW:
            raise Trouble("case", report("There is no run '{name}'.", name=self.later), "Choose one of the list.")
        comparing.compare(context.scene, study.parts(context), run, later)


class EndComparison(TellsTrouble, bpy.types.Operator):
    bl_idname = "fluxface.end_comparison"
    bl_label = "Show Temperatures Again"
    bl_description = "Leave the comparison and show the result's own temperatures"
    bl_options = {"REGISTER", "UNDO"}

    @classmethod
    def poll(cls, context: bpy.types.Context) -> bool:
        left = chosen(context)
        if left is None or not left[0].comparison:
            cls.poll_message_set("Nothing is compared")
            return False
        return True

    def act(self, context: bpy.types.Context) -> None:
        comparing.end(context.scene, chosen(context)[0])


register, unregister = bpy.utils.register_classes_factory(
    (OpenRunFolder, ShowRunLog, ForgetRun, CompareRun, EndComparison)
)
