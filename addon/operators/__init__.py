"""What the designer can do: each operator calls plain functions and tells what went wrong."""

from __future__ import annotations

from . import choosing, contacts, history, materials, probing, publishing, running, seeing, shape, tagging

ROOMS = (tagging, choosing, shape, materials, contacts, running, seeing, probing, publishing, history)


def register() -> None:
    for room in ROOMS:
        room.register()


def unregister() -> None:
    for room in reversed(ROOMS):
        room.unregister()
