"""A run: from the settings to a case, through the solver, to what is shown and said of it."""

from __future__ import annotations

import json
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import bpy

from ..solver.case import write_case
from ..solver.errors import Trouble
from ..solver.result import read_summary
from . import comparing, cutting, history, host, jobs, live, probes, study, tags, upkeep, view
from .cases import build_case
from .language import report
from .parts import in_sight
from .properties import Outcome
from .recovery import memory

STAGES = ("mesh", "assemble", "solve", "write")
SECONDS_BETWEEN_LOOKS = 0.1


@dataclass(frozen=True)
class Run:
    """scene, parts: the host's ids for the session, as it may rename, move or free what they stand for meanwhile.

    inputs: what the result will have been made from, to tell later whether it is current. areas: of its tags, m².
    """

    job: jobs.Job
    scene: int
    parts: tuple[int, ...]
    result: Path
    inputs: str
    areas: dict[int, float]


def start(context: bpy.types.Context) -> Run:
    """Write the case of the present study and start the solver on it.

    Raises Trouble, which is also kept with the study for the panel to show, when something is amiss before the solver.
    """
    scene, members = context.scene, study.parts(context)
    left = study.outcome(scene, members)
    try:
        return _start(context, scene, members)
    except Trouble as trouble:
        keep_trouble(left, trouble)
        raise


def _start(context: bpy.types.Context, scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> Run:
    study.restore_tags(scene)
    for part in members:
        memory.follow(scene, part)
    with in_sight(context, members) as depsgraph:
        for part in members:
            upkeep.measure(part, depsgraph)
            tags.keep_copies(scene, part.data)
        case = build_case(scene, members, depsgraph)
        inputs, areas = study.inputs(scene, members), study.tag_areas(scene, members)
    folder = study.folder(scene, members)
    try:
        write_case(case, folder)
    except OSError as error:
        raise Trouble(
            "limits",
            f"The case cannot be written to {folder}: {error.strerror}.",
            "Save the file in a folder that you may write to.",
        ) from error
    result = folder / "result"
    job = jobs.solve(folder, result)
    return Run(job, scene.session_uid, tuple(part.session_uid for part in members), result, inputs, areas)


def wait(job: jobs.Job) -> jobs.Ending:
    """Wait for the solver; only where there is no window to keep alive."""
    while (ending := job.poll()) is None:
        time.sleep(SECONDS_BETWEEN_LOOKS / 5)
    return ending


def watch(job: jobs.Job, finish: Callable[[jobs.Ending], object], step: str) -> None:
    """Look at the solver from time to time while the designer goes on working, and finish when it ends.

    step: what the undo history calls it.
    """
    state = bpy.context.window_manager.fluxface
    state.running, state.cancelled = True, False
    bpy.app.timers.register(look_until_over(job, finish, step))


def look_until_over(job: jobs.Job, finish: Callable[[jobs.Ending], object], step: str) -> Callable[[], float | None]:
    """What to call again after the seconds it gives, until it gives None; it never waits."""

    def look() -> float | None:
        state = bpy.context.window_manager.fluxface
        if state.cancelled:
            job.cancel()
        # A result that appears in the middle of a render would be drawn by half of it.
        if bpy.app.is_job_running("RENDER"):
            return SECONDS_BETWEEN_LOOKS
        ending = job.poll()
        state.text, state.fraction = told(job.progress)
        host.redraw()
        if ending is None:
            host.tell_status(report("{step}: {text} ({share:.0%})", step=step, text=state.text, share=state.fraction))
            return SECONDS_BETWEEN_LOOKS
        state.running = False
        host.tell_status(None)
        finish(ending)
        host.push_undo(step)
        return None

    return look


def told(progress: jobs.Progress) -> tuple[str, float]:
    """What to show of a progress: its words, and the share of all stages done."""
    stage = STAGES.index(progress.stage) if progress.stage in STAGES else 0
    return progress.text, (stage + progress.fraction) / len(STAGES)


def finish(run: Run, ending: jobs.Ending) -> Trouble | None:
    """Show what was solved, or keep what went wrong; an older result stays where a run fails or is cancelled."""
    scene = next((scene for scene in bpy.data.scenes if scene.session_uid == run.scene), None)
    objects = {thing.session_uid: thing for thing in bpy.data.objects}
    members = [objects[part] for part in run.parts if part in objects]
    if scene is None or len(members) < len(run.parts):
        # The designer deleted a part meanwhile: there is nothing left to show this result on.
        return None
    left = study.outcome(scene, members)
    if ending.cancelled or ending.trouble:
        jobs.clear_remains(run.result)
    if ending.cancelled:
        return None
    try:
        if ending.trouble:
            raise ending.trouble
        summary = read_summary(run.result)
        view.show(scene, members, run.result)
    except Trouble as trouble:
        keep_trouble(left, trouble)
        return trouble
    left.summary, left.folder, left.inputs = json.dumps(summary), str(run.result), run.inputs
    left.live = left.comparison = ""
    cutting.cutting.forget()
    cutting.follow(scene, members)
    probes.read(members, anew=True)
    live.live.prepare(scene, members, run.result.parent, summary["mesh"]["nodes"])
    left.areas, left.lost = json.dumps(run.areas), False
    for part in members:
        part.fluxface.notes = ""
    keep_trouble(left, None)
    return _kept(scene, left, run.result.parent)


def _kept(scene: bpy.types.Scene, left: Outcome, case: Path) -> Trouble | None:
    """Keep the run with those before it; a result that cannot be kept is shown all the same."""
    try:
        history.keep(case)
    except Trouble as trouble:
        keep_trouble(left, trouble)
        return trouble
    finally:
        history.refresh(left, case)
        comparing.share_range(scene, left)
    return None


def keep_trouble(left: Outcome, trouble: Trouble | None) -> None:
    left.message = trouble.message if trouble else ""
    left.mend = trouble.mend if trouble else ""
    left.faces = json.dumps([int(face) for face in trouble.faces]) if trouble else ""
    left.points = json.dumps([[float(x) for x in point] for point in trouble.points]) if trouble else ""
