"""What stands on the report's page: tables and sentences as HTML, bounded so that they fit one page."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape
from typing import Any

import bpy

from ...solver.case import Case, Part
from ...solver.materials import Property, Table
from ...solver.result import Summary
from .. import words
from ..units import area_text, difference_text, power_text, temperature_text

# So many fit on the page together with the picture; of more, the ones that move the most heat are shown.
MOST_TAGS, MOST_PARTS, MOST_CONTACTS, MOST_SENTENCES, MOST_WARNINGS = 7, 4, 3, 4, 2


def written(scene: bpy.types.Scene, case: Case, summary: Summary) -> dict[str, str]:
    """The page's places by name."""
    balance, mesh = summary["balance"], summary["mesh"]
    return {
        "hottest": temperature_text(scene, summary["hottest"]["temperature"]),
        "hottest_part": _where(summary, "hottest"),
        "coldest": temperature_text(scene, summary["coldest"]["temperature"]),
        "coldest_part": _where(summary, "coldest"),
        "heat": power_text(balance["in"]),
        "tags": table(
            ("Faces", "Carry", "Area", "Mean", "Hottest", "Heat"),
            _shown([_tag_row(scene, case, row) for row in _by_heat(summary["tags"])], MOST_TAGS),
        ),
        "parts": table(
            ("Part", "Material", "Conductivity", "Mass", "Mean", "Hottest"),
            _shown([_part_row(scene, part, row) for part, row in zip(case.parts, summary["parts"], strict=True)],
                   MOST_PARTS),
        ),
        "contacts": _contacts(scene, summary),
        "ways": items(_some(summary.get("where_heat_goes", []), MOST_SENTENCES)),
        "warnings": items(_some(summary["warnings"], MOST_WARNINGS), "warnings"),
        "balance": text(
            f"In {power_text(balance['in'])}, out {power_text(-balance['out'])}; "
            f"they agree to {balance['relative_gap']:.0e} of it."
        ),
        "mesh": text(
            f"{mesh['cells']:,} tetrahedra of order {mesh['order']}, {mesh['nodes']:,} nodes; steady state, "
            f"solved in {summary['seconds']['total']:.1f} s."
        ),
        "cautions": text(" ".join(words.CAUTIONS)),
    }  # fmt: skip


def _where(summary: Summary, end: str) -> str:
    return text(f"on {summary[end]['part']}")


def _by_heat(tags: Sequence[dict[str, Any]]) -> list[dict[str, Any]]:
    return sorted(tags, key=lambda row: -abs(row["heat"]))


def _tag_row(scene: bpy.types.Scene, case: Case, row: dict[str, Any]) -> tuple[str, ...]:
    tag = next((tag for tag in case.tags if tag.name == row["name"]), case.untagged)
    carry = words.carried(scene, tag) or "insulated"
    if row["mean"] is None:
        return row["name"], carry, "within contacts", "", "", words.heat_through(row["heat"])
    film = f" (film {row['film']:.2g} W/m²K)" if row["film"] and tag.convection and tag.convection.correlation else ""
    return (
        row["name"],
        carry + film,
        area_text(scene, row["area"]),
        temperature_text(scene, row["mean"]),
        temperature_text(scene, row["max"]),
        words.heat_through(row["heat"]),
    )


def _part_row(scene: bpy.types.Scene, part: Part, row: dict[str, Any]) -> tuple[str, ...]:
    material = part.material
    conductivity = " / ".join(_number_or_range(value) for value in material.conductivity)
    return (
        row["name"],
        material.name or "not named",
        f"{conductivity} W/mK",
        f"{1e3 * row['mass']:.3g} g" if row["mass"] else "",
        temperature_text(scene, row["mean"]),
        temperature_text(scene, row["max"]),
    )


def _number_or_range(value: Property) -> str:
    return f"{min(value.value):.3g} to {max(value.value):.3g}" if isinstance(value, Table) else f"{value:.4g}"


def _contacts(scene: bpy.types.Scene, summary: Summary) -> str:
    rows = []
    for contact in summary["contacts"]:
        first, second = contact["parts"] if contact["heat"] >= 0 else reversed(contact["parts"])
        drop = difference_text(scene, abs(contact["drop"]))
        rows.append((f"{first} to {second}", area_text(scene, contact["area"]), drop, power_text(abs(contact["heat"]))))
    return table(("Contact", "Area", "Drop", "Heat"), _shown(rows, MOST_CONTACTS)) if rows else ""


def _shown(rows: list[tuple[str, ...]], most: int) -> list[tuple[str, ...]]:
    left = len(rows) - most
    return rows if left <= 0 else [*rows[:most], (f"and {left} more", *[""] * (len(rows[0]) - 1))]


def _some(sentences: Sequence[str], most: int) -> list[str]:
    left = len(sentences) - most
    return list(sentences) if left <= 0 else [*sentences[:most], f"And {left} more."]


def table(heads: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    def line(cells: Sequence[str], kind: str) -> str:
        return "<tr>" + "".join(f"<{kind}>{text(cell)}</{kind}>" for cell in cells) + "</tr>"

    return f"<table>{line(heads, 'th')}{''.join(line(row, 'td') for row in rows)}</table>"


def items(sentences: Sequence[str], kind: str = "") -> str:
    return f'<ul class="{kind}">{"".join(f"<li>{text(s)}</li>" for s in sentences)}</ul>' if sentences else ""


def paragraph(sentence: str, kind: str) -> str:
    return f'<p class="{kind}">{text(sentence)}</p>' if sentence else ""


def text(plain: str) -> str:
    return escape(plain)
