"""Where the heat goes, in words and shares."""

from __future__ import annotations

from typing import Any

# A way that takes less than this share of the heat is not worth a sentence of its own.
WORTH_TELLING = 0.005


def where_heat_goes(tags: list[dict[str, Any]], parts: list[dict[str, Any]], entering: float) -> list[str]:
    """Sentences like "81 % of 14.0 W leaves through fins (convection 55 %, radiation 26 %).", the largest way first.

    tags, parts: as in the summary, heats in W. entering: W, the sum of all heat that enters. A tag through which heat
    both enters and leaves by different terms is told of by what leaves.
    """
    if entering <= 0:
        return []
    ways = []
    for tag in tags:
        leaving = {kind: -heat / entering for kind, heat in tag["split"].items() if heat < 0}
        ways.append((sum(leaving.values()), f"leaves through {tag['name']}", leaving))
    for part in parts:
        ways.append((-part["heat"] / entering, f"is taken up inside {part['name']}", {}))
    told = sorted((way for way in ways if way[0] >= WORTH_TELLING), key=lambda way: -way[0])
    sentences = [f"{_percent(share)} of {entering:.3g} W {how}{_by_kind(kinds)}." for share, how, kinds in told]
    rest = sum(share for share, _, _ in ways if 0 < share < WORTH_TELLING)
    return sentences + ([f"The rest, {_percent(rest)}, leaves elsewhere."] if rest >= WORTH_TELLING / 10 else [])


def _by_kind(leaving: dict[str, float]) -> str:
    """By which term, or the shares of several in brackets."""
    named = {"held": "held temperature", "source": "being drawn off"}
    told = [(named.get(kind, kind), share) for kind, share in leaving.items() if share >= WORTH_TELLING]
    if len(told) == 1:
        return f" by {told[0][0]}"
    return f" ({', '.join(f'{kind} {_percent(share)}' for kind, share in told)})" if told else ""


def _percent(share: float) -> str:
    return f"{100 * share:.0f} %" if share >= 0.0995 else f"{100 * share:.1f} %"
