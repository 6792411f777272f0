"""The 3D suite's side of Fluxface: what it registers, and nothing else."""

from __future__ import annotations

import atexit

from . import (
    auto_run,
    cutting,
    inspection,
    jobs,
    live,
    operators,
    overlay,
    panels,
    preferences,
    probe_labels,
    properties,
    tag_names,
    unattended,
    upkeep,
    view,
)

ROOMS = (
    preferences, properties, view, operators, panels, overlay, tag_names, probe_labels, inspection, live, cutting,
    upkeep, auto_run, unattended,
)  # fmt: skip


def register() -> None:
    for room in ROOMS:
        room.register()
    # The host as a module does not disable its add-ons when Python ends, and hangs over what is still registered.
    atexit.register(unregister)


def unregister() -> None:
    atexit.unregister(unregister)
    jobs.stop_all()
    for room in reversed(ROOMS):
        room.unregister()
