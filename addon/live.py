"""Live loads: after a run of a linear case, other watts and ambients are shown while the mouse still moves.

The solver leaves the responses to each load beside the result; what is shown is their sum with the values that the
settings have now. It is always made from the settings, never from what was shown before, so that undo is no matter.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import bpy
import numpy as np

from ..solver.case import read_case
from ..solver.errors import Trouble
from ..solver.result import Responses, read_field, read_responses, skin_nodes
from . import comparing, cutting, host, jobs, probes, study, view
from .properties import Outcome, load_followers
from .units import as_typed

# The next run shall not have to wait: one that follows at once is waited for.
SECONDS_BETWEEN_LOOKS, SECONDS_IDLE = 0.1, 1.0
# The responses of larger cases take long to make and much room to hold.
MOST_NODES = 300_000


@dataclass(frozen=True)
class Held:
    """Responses of one result. nodes: (P,) of each part's result object. tagged: those on each tag of the summary."""

    responses: Responses
    loads: tuple[dict[str, str], ...]
    nodes: tuple[np.ndarray, ...]
    tagged: tuple[np.ndarray, ...]
    part_of_node: np.ndarray


def why_not(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> str:
    """What keeps loads from being live, in words; empty when nothing does."""
    present = study.tag_areas(scene, members)
    for tag in [tag for tag in scene.fluxface.tags if tag.uid in present] + [scene.fluxface.untagged]:
        name = getattr(tag, "name", "untagged")
        if tag.use_radiation:
            return f"'{name}' radiates"
        if tag.use_convection and tag.film != "COEFFICIENT":
            return f"the film of '{name}' follows its temperature"
    for part in members:
        values = part.fluxface.material
        if any(item.tabulated for item in (values.conductivity, values.along_y, values.along_z)):
            return f"the conductivity of '{part.name}' follows its temperature"
    return ""


class Live:
    """What is held of the study that was last run or dragged, and the request for it while it is being made."""

    def __init__(self) -> None:
        self._held: Held | None = None
        self._folder = ""
        self._request: jobs.Request | None = None
        self._case: Path | None = None

    def prepare(self, scene: bpy.types.Scene, members: Sequence[bpy.types.Object], case: Path, nodes: int) -> None:
        """Have the responses of a case made that was just solved, where it is linear, once the solver is idle."""
        self.forget()
        if nodes <= MOST_NODES and not why_not(scene, members):
            self._case = case
            if not bpy.app.background:
                bpy.app.timers.register(wait, first_interval=SECONDS_IDLE)

    def ask(self) -> jobs.Request | None:
        """The request for what was prepared, made now."""
        if self._case is not None:
            self._request, self._case = jobs.respond(self._case, self._case / "result"), None
        return self._request

    def look(self) -> float | None:
        """What the host's clock calls until it is told that there is nothing to wait for."""
        if bpy.context.window_manager.fluxface.running:  # a run comes first, and brings responses of its own
            self._case = None
        request = self.ask()
        if request is None or request.poll() is not None:
            self._request = None
            return None
        return SECONDS_BETWEEN_LOOKS

    def forget(self) -> None:
        if bpy.app.timers.is_registered(wait):
            bpy.app.timers.unregister(wait)
        self._held, self._folder, self._request, self._case = None, "", None, None

    def held(self, folder: str) -> Held | None:
        """The responses that lie in a result folder, if any do."""
        if self._folder != folder:
            try:
                self._held = _read(Path(folder))
            except Trouble:
                return None
            self._folder = folder
        return self._held


# One for the session: what it holds is as large as the result that is worked on.
live = Live()
wait = live.look  # one and the same object each time, by which the host knows what it calls


def _read(folder: Path) -> Held:
    responses, field = read_responses(folder), read_field(folder)
    if responses.temperature.shape != (len(responses.values), len(field.nodes)):
        raise Trouble("case", f"The responses in {folder} are not those of the result.", "Run again.")
    nodes, triangles, part = skin_nodes(field)
    parts = range(int(part.max()) + 1)
    part_of_node = np.empty(len(field.nodes), np.int32)
    part_of_node[field.cells] = field.cell_part[:, None]
    tags = len(responses.tag_mean[0])
    numbers = [*range(len(read_case(folder.parent).tags)), -1][:tags]
    return Held(
        responses=responses,
        loads=tuple(json.loads(responses.loads.tobytes())),
        nodes=tuple(nodes[np.unique(triangles[part == index])] for index in parts),
        tagged=tuple(np.unique(field.boundary[field.boundary_tag == number]) for number in numbers),
        part_of_node=part_of_node,
    )


def follow(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> bool:
    """Show what the loads come to now; whether they are live, and other than those of the run."""
    left = study.outcome(scene, members)
    if not left.summary or left.inputs == study.inputs(scene, members):
        return _back(scene, members, left)
    if study.without_loads(left.inputs) != study.without_loads(study.inputs(scene, members)):
        return _back(scene, members, left)
    held = live.held(left.folder)
    values = held and _values(scene, members, held.loads)
    if values is None:
        return _back(scene, members, left)
    temperature = values @ held.responses.temperature
    left.live = json.dumps(_summary(json.loads(left.summary), held, values, temperature))
    _show(scene, members, held, temperature)
    return True


def loads_changed(context: bpy.types.Context) -> None:
    """Follow the loads of the present study, if there is one with a result."""
    if context.window_manager.fluxface.running:
        return
    try:
        follow(context.scene, study.parts(context))
    except Trouble:
        return


def _back(scene: bpy.types.Scene, members: Sequence[bpy.types.Object], left: Outcome) -> bool:
    """The run's own temperatures again, where others were shown."""
    if left.live:
        left.live = ""
        held = live.held(left.folder)
        if held is not None:
            _show(scene, members, held, held.responses.values @ held.responses.temperature)
    return False


def _show(scene: bpy.types.Scene, members: Sequence[bpy.types.Object], held: Held, temperature: np.ndarray) -> None:
    comparing.end(scene, study.outcome(scene, members))
    view.settings_of(scene).live = bool(study.outcome(scene, members).live)
    view.recolour(scene, members, [temperature[nodes] for nodes in held.nodes])
    cutting.recolour(scene, members, temperature)
    probes.read(members)
    host.redraw()


def _values(
    scene: bpy.types.Scene, members: Sequence[bpy.types.Object], loads: Sequence[dict[str, str]]
) -> np.ndarray | None:
    """(L,) the loads as the settings have them now; None where they have become others than were solved."""
    owners = {("tag", tag.name): tag for tag in scene.fluxface.tags}
    owners |= {("part", part.name): part.fluxface for part in members}
    owners["untagged", "untagged"] = scene.fluxface.untagged
    found = [owners.get((load["owner"], load["name"])) for load in loads]
    if any(owner is None for owner in found):
        return None
    return np.array([as_typed(getattr(owner, load["key"])) for owner, load in zip(found, loads, strict=True)])


def _summary(run: dict, held: Held, values: np.ndarray, temperature: np.ndarray) -> dict:
    """The summary of the run with what the loads change in it."""
    tag_mean, tag_heat, part_mean, part_heat = (
        (values @ array).tolist()
        for array in (
            held.responses.tag_mean, held.responses.tag_heat, held.responses.part_mean, held.responses.part_heat,
        )
    )  # fmt: skip
    for row, mean, heat, nodes in zip(run["tags"], tag_mean, tag_heat, held.tagged, strict=True):
        row["heat"] = heat
        if row["mean"] is not None:
            on_tag = temperature[nodes]
            row |= {"mean": mean, "min": float(on_tag.min()), "max": float(on_tag.max())}
    for index, row in enumerate(run["parts"]):
        inside = temperature[held.part_of_node == index]
        row |= {"mean": part_mean[index], "min": float(inside.min()), "max": float(inside.max())}
        row["heat"] = part_heat[index]
    for end, node in (("hottest", int(temperature.argmax())), ("coldest", int(temperature.argmin()))):
        run[end] |= {"temperature": float(temperature[node]), "part": run["parts"][held.part_of_node[node]]["name"]}
    heats = np.array([*tag_heat, *part_heat])
    run["balance"] |= {"in": float(heats[heats > 0].sum()), "out": float(heats[heats < 0].sum())}
    # These are told of the run alone.
    return {**run, "where_heat_goes": [], "contacts": [], "warnings": []}


def register() -> None:
    load_followers.append(loads_changed)


def unregister() -> None:
    load_followers.remove(loads_changed)
    live.forget()
