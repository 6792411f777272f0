"""Composed text in the designer's language: whole sentences with named places in them, translated and then filled in.

What the host shows as it stands (labels, names, tooltips, reasons of a poll) it translates by itself.
"""

from __future__ import annotations

from bpy.app.translations import pgettext_iface, pgettext_rpt


def label(sentence: str, /, **values: object) -> str:
    """For panels, as in ``label("Part: {name}", name=part.name)``; without values it may hold braces of its own."""
    return _filled(pgettext_iface(sentence), values)


def report(sentence: str, /, **values: object) -> str:
    """For reports, the status bar and warnings."""
    return _filled(pgettext_rpt(sentence), values)


def _filled(sentence: str, values: dict[str, object]) -> str:
    return sentence.format(**values) if values else sentence
