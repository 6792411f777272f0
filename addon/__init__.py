"""The 3D suite's side of Fluxface: what it registers, and nothing else."""

from __future__ import annotations

from . import jobs, operators, overlay, panels, properties, upkeep, view

ROOMS = (properties, view, operators, panels, overlay, upkeep)


def register() -> None:
    for room in ROOMS:
        room.register()


def unregister() -> None:
    jobs.stop_all()
    for room in reversed(ROOMS):
        room.unregister()
