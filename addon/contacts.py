"""Contacts found by themselves: the solver tells which parts touch, and each pair that no contact names gets one."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import bpy

from ..solver.case import write_case
from ..solver.errors import Trouble
from . import jobs, study
from .cases import build_shapes
from .parts import in_sight


@dataclass(frozen=True)
class Search:
    """scene: the host's id for the session. folder: holds the case while it is looked at."""

    job: jobs.Job
    scene: int
    folder: tempfile.TemporaryDirectory


def start(context: bpy.types.Context) -> Search:
    """Start looking for parts that touch.

    Raises Trouble when a part is no body or the solver is missing.
    """
    members = study.parts(context)
    with in_sight(context, members) as depsgraph:
        case = build_shapes(context.scene, members, depsgraph)
    folder = tempfile.TemporaryDirectory(prefix="fluxface-", dir=bpy.app.tempdir)
    write_case(case, Path(folder.name))
    return Search(jobs.check(Path(folder.name)), context.scene.session_uid, folder)


def finish(search: Search, ending: jobs.Ending) -> Trouble | None:
    """Add a contact for each new pair, and keep with each contact the area over which its parts touch."""
    search.folder.cleanup()
    scene = next((scene for scene in bpy.data.scenes if scene.session_uid == search.scene), None)
    if scene is None or ending.cancelled:
        return None
    if ending.trouble:
        return ending.trouble
    touching = {frozenset(pair["parts"]): pair["area"] for pair in json.loads(ending.said)["touching"]}
    for contact in scene.fluxface.contacts:
        contact.area = touching.pop(frozenset(_names(contact)), 0.0)
    for pair, area in touching.items():
        _add(scene, sorted(pair), area)
    return None


def _names(contact: bpy.types.PropertyGroup) -> list[str]:
    return [side.name if side else "" for side in (contact.first, contact.second)]


def _add(scene: bpy.types.Scene, names: Sequence[str], area: float) -> None:
    contact = scene.fluxface.contacts.add()
    contact.first, contact.second = (bpy.data.objects.get(name) for name in names)
    contact.area = area
