"""The table that a demo prints: temperatures, faces, heat, and what took how long."""

from __future__ import annotations

from collections.abc import Sequence

import bpy
from fluxface.addon import units, words
from fluxface.solver.result import Summary

WIDTH = 78


def of_result(scene: bpy.types.Scene, part: bpy.types.Object, summary: Summary, seconds: dict[str, float]) -> str:
    """The whole table as text; ``seconds`` holds what the add-on's side took, the summary what the solver took."""
    blocks = [
        _title(part, summary),
        _extremes(scene, summary),
        _tags(scene, summary),
        _balance(summary),
        summary["where_heat_goes"],
        [*(f"Note: {warning}" for warning in summary["warnings"])],
        _durations(summary, seconds),
        list(words.CAUTIONS),
    ]
    return "\n\n".join("\n".join(block) for block in blocks if block)


def _title(part: bpy.types.Object, summary: Summary) -> list[str]:
    mesh = summary["mesh"]
    kind = {1: "4-node", 2: "10-node"}[mesh["order"]]
    about = f"{part.fluxface.material.name}, {mesh['cells']:,} {kind} tetrahedra, {mesh['nodes']:,} nodes"
    return [part.name, "=" * WIDTH, about]


def _extremes(scene: bpy.types.Scene, summary: Summary) -> list[str]:
    return [
        f"{which:10}{units.temperature_text(scene, summary[which]['temperature'])}" for which in ("hottest", "coldest")
    ]


def _tags(scene: bpy.types.Scene, summary: Summary) -> list[str]:
    degrees = units.temperature_unit(scene)
    rows = [
        (
            tag["name"],
            units.area_text(scene, tag["area"]),
            *(f"{units.from_kelvin(scene, tag[which]):.1f}" for which in ("min", "mean", "max")),
            _watts(tag["heat"]),
        )
        for tag in summary["tags"]
    ]
    return _columns(("faces", "area", f"min {degrees}", f"mean {degrees}", f"max {degrees}", "heat in"), rows)


def _balance(summary: Summary) -> list[str]:
    balance = summary["balance"]
    gap = balance["relative_gap"] * balance["in"]
    return [f"in {_watts(balance['in'])}, out {_watts(balance['out'])}; the balance closes to {gap:.1e} W"]


def _durations(summary: Summary, seconds: dict[str, float]) -> list[str]:
    solver = summary["seconds"]
    inside = [(stage, solver[stage]) for stage in ("mesh", "assemble", "solve", "report")]
    handing = seconds["solver"] - sum(spent for _, spent in inside)
    steps = [
        ("build", seconds["build"]),
        ("export", seconds["export"]),
        *inside,
        ("start, read and write", handing),
        ("colours", seconds["colours"]),
        ("picture", seconds["picture"]),
    ]
    press = sum(seconds[step] for step in ("export", "solver", "colours"))
    return [
        *(f"{what:24}{spent:8.2f} s" for what, spent in steps),
        "-" * 34,
        f"{'from Run to colours':24}{press:8.2f} s",
    ]


def _watts(heat: float) -> str:
    return f"{heat:+.3f} W".replace("-", "−")


def _columns(heads: Sequence[str], rows: Sequence[Sequence[str]]) -> list[str]:
    """Rows under their heads, the first column to the left and the others to the right, across WIDTH."""
    widths = [max(map(len, column)) for column in zip(heads, *rows, strict=True)]
    space = max(2, (WIDTH - sum(widths)) // (len(widths) - 1))

    def line(cells: Sequence[str]) -> str:
        first, *others = zip(cells, widths, strict=True)
        return first[0].ljust(first[1]) + "".join(cell.rjust(width + space) for cell, width in others)

    return [line(heads), "-" * len(line(heads)), *map(line, rows)]
