"""Two runs compared: how much hotter or colder each place, and each tag, is than it was in an earlier one."""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import bpy
import numpy as np

from ..solver.errors import Trouble
from ..solver.result import HotSkin, Summary, read_skin, read_summary
from . import cutting, history, study, view
from .nearest import nearest_values
from .properties import KeptRun, Outcome
from .view.result_object import local_surface, temperatures

# Of the part's extent: a place farther from the earlier surface has nothing to be compared with.
FAR = 0.02


def compare(
    scene: bpy.types.Scene, members: Sequence[bpy.types.Object], run: KeptRun, later: KeptRun | None = None
) -> None:
    """Show on the parts how much hotter each place is in the ``later`` run, or now, than in ``run``; a cut is closed.

    Raises Trouble when a run cannot be read, or when no place of the parts lies on its surface.
    """
    left = study.outcome(scene, members)
    before = _read(run)
    after = _read(later) if later else None
    change = [
        (_carried(part, *after) if after else temperatures(view.result_of(part))) - _carried(part, *before)
        for part in members
    ]
    known = float(np.mean(np.isfinite(np.concatenate(change))))
    if not known:
        raise Trouble(
            "case",
            "Nothing of the parts is where it was in that run.",
            "Parts that were moved or renamed since cannot be compared place by place; look at the tables.",
        )
    cutting.close(scene)
    since = history.when(run)
    view.show_difference(scene, members, change, f"{since} until {history.when(later)}" if later else since)
    told = {"since": since, "until": history.when(later) if later else "", "note": run.note, "known": known}
    left.comparison = json.dumps(told | {"rows": _rows(before[0], after[0] if after else study.summary(left))})


def _read(run: KeptRun) -> tuple[Summary, HotSkin]:
    return read_summary(Path(run.folder)), read_skin(Path(run.folder))


def end(scene: bpy.types.Scene, left: Outcome) -> None:
    """Show temperatures again."""
    left.comparison = ""
    view.end_difference(scene)


def _carried(part: bpy.types.Object, summary: Summary, skin: HotSkin) -> np.ndarray:
    """(P,) K of a run at the vertices of the part's result; NaN where the surface of that run is far."""
    result = view.result_of(part)
    places, _ = local_surface(result.data)
    placed = np.linalg.inv(view.placing(result)[1])
    places = places @ placed[:3, :3].T + placed[:3, 3]
    names = [row["name"] for row in summary["parts"]]
    mine = skin.triangles[skin.part == names.index(part.name)] if part.name in names else skin.triangles[:0]
    if not len(mine):
        return np.full(len(places), np.nan)
    then, apart = nearest_values(skin.places, mine, skin.temperature, places)
    return np.where(apart <= FAR * np.ptp(places, axis=0).max(), then, np.nan)


def _rows(before: Summary, after: Summary) -> list[dict[str, Any]]:
    """The hottest place and each tag that both runs have: name, then and now, K; tags by their means."""
    were = {row["name"]: row["mean"] for row in before["tags"]}
    rows = [{"name": "Hottest", "then": before["hottest"]["temperature"], "now": after["hottest"]["temperature"]}]
    rows += [
        {"name": row["name"], "then": were[row["name"]], "now": row["mean"]}
        for row in after["tags"]
        if row["mean"] is not None and were.get(row["name"]) is not None
    ]
    return rows


def share_range(scene: bpy.types.Scene, left: Outcome) -> None:
    """Let the colours be able to span all kept runs."""
    ends = [end for run in left.runs for end in (run.coldest, run.hottest)]
    view.share_range(scene, min(ends, default=0.0), max(ends, default=0.0))
