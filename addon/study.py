"""The study: which objects are its parts, where its folder is, and whether its result is current."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path

import bpy
import numpy as np

from ..solver.errors import Trouble
from ..solver.result import Summary
from . import groups, tags, view
from .properties import Outcome
from .units import metres_per_unit

# World positions below this share of a unit are rounding of the host's single-precision matrices.
PLACE_DIGITS = 6
# Objects with a surface of their own that is no mesh.
SHAPED = {"CURVE", "SURFACE", "META", "FONT"}
# What of a tag the temperatures are proportional to.
LOADS = ("heat", "heat_flux", "ambient", "temperature")


def parts(context: bpy.types.Context) -> list[bpy.types.Object]:
    """The mesh objects to solve: those of the chosen collection, or else the active one.

    Raises Trouble of kind "case" when there is none.
    """
    collection = context.scene.fluxface.collection
    if collection is not None:
        found = [thing for thing in collection.all_objects if thing.type == "MESH" and view.part_of(thing) == thing]
        if not found:
            raise Trouble("case", f"The collection '{collection.name}' holds no mesh object.", "Put the parts into it.")
        return sorted(found, key=lambda thing: thing.name)
    part = active_part(context)
    if part is None:
        raise Trouble("case", "No mesh object is active.", "Click the part to make it the active object.")
    return [part]


def left_out(scene: bpy.types.Scene) -> list[str]:
    """Names of what has a shape in the chosen collection and is no mesh, so that it is not among the parts."""
    collection = scene.fluxface.collection
    if collection is None:
        return []
    return sorted(thing.name for thing in collection.all_objects if thing.type in SHAPED)


def active_part(context: bpy.types.Context) -> bpy.types.Object | None:
    """The part that is active, or whose result is."""
    thing = context.view_layer.objects.active
    part = None if thing is None else view.part_of(thing)
    return part if part is not None and part.type == "MESH" else None


def outcome(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> Outcome:
    """What the last run of this study left; it is kept with the chosen collection or with the one part."""
    return (scene.fluxface.collection or members[0]).fluxface.outcome


def folder(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> Path:
    """The case folder: beside the saved file, or in the session's temporary folder."""
    return folder_of(scene.fluxface.collection or members[0])


def folder_of(owner: bpy.types.Object | bpy.types.Collection) -> Path:
    """The case folder of the study whose outcome is kept with ``owner``."""
    name = bpy.path.clean_name(owner.name)
    if not bpy.data.filepath:
        return Path(bpy.app.tempdir) / "fluxface" / name
    file = Path(bpy.data.filepath)
    return file.with_name(f"{file.stem}.fluxface") / name


def run_folder(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> Path:
    """The folder of the run that is shown, or of its case where no run is kept."""
    runs = outcome(scene, members).runs
    return Path(runs[0].folder) if runs else folder(scene, members)


def summary(left: Outcome) -> Summary | None:
    """The summary of what is shown: of the last run that was solved, or of other loads than it had."""
    shown = left.live or left.summary
    return json.loads(shown) if shown else None


def tag_areas(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> dict[int, float]:
    """m² of each tag by uid, on all parts together, as last measured."""
    total: dict[int, float] = {}
    square = metres_per_unit(scene) ** 2
    for part in members:
        for uid, area in json.loads(part.fluxface.areas or "{}").items():
            total[int(uid)] = total.get(int(uid), 0.0) + square * area
    return total


def is_current(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> bool:
    """Whether there is a result and nothing it depends on has changed since."""
    left = outcome(scene, members)
    return bool(left.summary) and left.inputs == inputs(scene, members)


def changes(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> list[str]:
    """What has changed since the last run, in words; empty where its result is current or there is none."""
    left = outcome(scene, members)
    if not left.inputs:
        return []
    before, now = json.loads(left.inputs), json.loads(inputs(scene, members))
    if [part[0] for part in before["parts"]] != [part[0] for part in now["parts"]]:
        return ["parts"]
    kinds = {
        "shape": [[part[1:3] for part in told["parts"]] for told in (before, now)],
        "tags": [[told["tags"], told["untagged"]] for told in (before, now)],
        "materials": [[part[3:5] for part in told["parts"]] for told in (before, now)],
        "heat in the volume": [[part[5:] for part in told["parts"]] for told in (before, now)],
        "contacts": [told["contacts"] for told in (before, now)],
        "mesh and units": [told["study"] for told in (before, now)],
    }
    return [kind for kind, (was, is_now) in kinds.items() if was != is_now]


def inputs(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> str:
    """Everything a result depends on, as text to compare: settings, shapes, and how the parts lie to each other."""
    settings = scene.fluxface
    present = {int(uid) for part in members for uid in json.loads(part.fluxface.areas or "{}")}
    origin = members[0].matrix_world.translation
    document = {
        "tags": [groups.as_json(tag) for tag in settings.tags if tag.uid in present],
        "untagged": groups.as_json(settings.untagged),
        "contacts": [groups.as_json(contact) for contact in settings.contacts] if settings.collection else [],
        "study": [*settings.gravity, settings.order, settings.size, scene.unit_settings.scale_length],
        "parts": [_inputs_of(part, origin) for part in members],
    }
    return json.dumps(document)


def without_loads(told: str) -> str:
    """Inputs, as told, without the values of their loads."""
    document = json.loads(told)
    for terms in (*document["tags"], document["untagged"]):
        for key in LOADS:
            terms[key] = None
    for part in document["parts"]:
        part[-2:] = (None, None)
    return json.dumps(document)


def _inputs_of(part: bpy.types.Object, origin: np.ndarray) -> list:
    settings = part.fluxface
    axes = settings.material.axes
    return [
        part.name,
        settings.shape,
        _pose(part, origin),
        groups.as_json(settings.material),
        _pose(axes, axes.matrix_world.translation) if axes else None,
        settings.heat_kind,
        settings.heat,
        settings.heat_density,
    ]


def _pose(part: bpy.types.Object, origin: np.ndarray) -> list[float]:
    matrix = np.array(part.matrix_world, dtype=float)
    matrix[:3, 3] -= np.array(origin, dtype=float)
    return np.round(matrix[:3], PLACE_DIGITS).ravel().tolist()


def meshes(members: Sequence[bpy.types.Object]) -> list[bpy.types.Mesh]:
    return list({part.data.name_full: part.data for part in members}.values())


def restore_tags(scene: bpy.types.Scene) -> None:
    """Give the scene the tags that its objects bring along from elsewhere."""
    tags.restore(scene, meshes([thing for thing in scene.objects if thing.type == "MESH"]))
