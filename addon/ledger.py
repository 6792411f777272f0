"""The ledger of tags: the area of each against the last run's, so that an edit that cost a tag its faces is seen."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence

import bpy

from ..solver.errors import Trouble
from . import study
from .language import report
from .units import area_text

# A tag is told of when its area changed by this or more; scaling the whole part is no loss of a tag.
FACTOR, ROUNDING = 2.0, 1e-3


def of_present(context: bpy.types.Context) -> list[str]:
    """What is to be said of the present study's tags; nothing before its first run."""
    try:
        members = study.parts(context)
    except Trouble:
        return []
    before = {int(uid): area for uid, area in json.loads(study.outcome(context.scene, members).areas or "{}").items()}
    return changes(context.scene, before, study.tag_areas(context.scene, members)) if before else []


def changes(scene: bpy.types.Scene, before: Mapping[int, float], now: Mapping[int, float]) -> list[str]:
    """A sentence for each tag of the scene that vanished, halved or doubled; areas in m² by uid."""
    scaled = _scaling(before, now)
    told = []
    for tag in scene.fluxface.tags:
        was, is_now = before.get(tag.uid, 0.0), now.get(tag.uid, 0.0)
        if not was:
            continue
        if not is_now:
            told.append(
                report(
                    "'{name}' has no faces any more; in the last run it had {area}.",
                    name=tag.name,
                    area=area_text(scene, was),
                )
            )
        elif abs(math.log(is_now / (was * scaled))) >= math.log(FACTOR) - ROUNDING:
            areas = {"now": area_text(scene, is_now), "area": area_text(scene, was)}
            told.append(report("'{name}' has {now} now; in the last run it had {area}.", name=tag.name, **areas))
    return told


def accept(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> None:
    """Let later areas be compared with the present ones."""
    study.outcome(scene, members).areas = json.dumps(study.tag_areas(scene, members))


def _scaling(before: Mapping[int, float], now: Mapping[int, float]) -> float:
    """The one factor by which all areas changed, as when the part is scaled; 1 where there is none."""
    factors = [now.get(uid, 0.0) / area for uid, area in before.items() if area]
    alike = len(factors) > 1 and min(factors) > 0 and max(factors) <= (1 + ROUNDING) * min(factors)
    return factors[0] if alike else 1.0
