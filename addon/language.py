"""Composed text in the designer's language: whole sentences with named places in them, translated and then filled in.

What the host shows as it stands (labels, names, tooltips) it translates by itself.
"""

from __future__ import annotations

from bpy.app.translations import pgettext_iface, pgettext_rpt


def label(sentence: str, /, **values: object) -> str:
    """For panels, as in ``label("Part: {name}", name=part.name)``."""
    return pgettext_iface(sentence).format(**values)


def report(sentence: str, /, **values: object) -> str:
    """For reports, the status bar and warnings."""
    return pgettext_rpt(sentence).format(**values)
