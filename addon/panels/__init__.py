"""The sidebar of the 3D view: what is shown of parts, tags, runs and results."""

from __future__ import annotations

from . import contacts, history, look, menu, part, probes, result, run, shape, study, tags

# In the order of the work.
ROOMS = (menu, study, shape, part, tags, contacts, run, look, result, probes, history)


def register() -> None:
    for room in ROOMS:
        room.register()


def unregister() -> None:
    for room in reversed(ROOMS):
        room.unregister()
