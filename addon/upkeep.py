"""What follows the designer's edits: tags that appended parts bring, areas and shapes of parts, copies on meshes."""

from __future__ import annotations

import hashlib
import json
from contextlib import suppress

import bpy
import numpy as np
from bpy.app.handlers import persistent

from ..solver.errors import Trouble
from . import history, host, inspection, jobs, live, study, tags
from .glance import glance
from .inspection import inspector
from .overlay import tag_colours
from .parts import modelled, placed, world_matrix
from .properties import size_followers
from .recovery import definitions, memory
from .units import metres_per_unit

# Long enough that dragging a vertex does not measure the part at every move.
QUIET_SECONDS = 0.3


def measure(part: bpy.types.Object, depsgraph: bpy.types.Depsgraph) -> None:
    """Keep with the part what its evaluated geometry comes to: areas of its tags, volume, extent, and digests."""
    if part.library is not None:
        return
    try:
        surface = modelled(part, depsgraph)
    except Trouble:
        return
    tag_colours.take(part, surface)
    settings, metres = part.fluxface, metres_per_unit(bpy.context.scene)
    world = placed(surface, world_matrix(part), metres)
    shape = _digest(surface.vertices, surface.triangles, surface.uid)
    scale = np.linalg.norm(world_matrix(part)[:3, :3], axis=0) * metres
    # Walls are thin against the mesh size, so that what is found depends on it as well.
    size = np.array([bpy.context.scene.fluxface.size], np.float32)
    body = _digest(size, scale.astype(np.float32), surface.vertices, surface.triangles)
    areas = {uid: area / metres**2 for uid, area in world.area_by_tag().items()}
    tagged = json.dumps({uid: area for uid, area in areas.items() if uid})
    if (settings.areas, settings.shape, settings.body) == (tagged, shape, body):
        return
    reshaped = settings.body != body
    settings.areas, settings.shape, settings.body = tagged, shape, body
    settings.volume, settings.surface = abs(world.volume()), metres**2 * sum(areas.values())
    settings.untagged = metres**2 * areas.get(0, 0.0)
    settings.untagged_faces = len(np.unique(surface.face[surface.uid == 0]))
    settings.extent = np.ptp(world.vertices, axis=0) if len(world.vertices) else (0.0, 0.0, 0.0)
    if reshaped:
        inspection.keep(part, glance(world, part.name), "")


def _digest(*arrays: np.ndarray) -> str:
    """A short text that changes with what the arrays hold."""
    digest = hashlib.blake2b(digest_size=12)
    for array in arrays:
        digest.update(array.tobytes())
    return digest.hexdigest()


def refresh() -> None:
    """Bring everything up to date for the parts of the study that are in sight; hidden ones cannot be edited."""
    context = bpy.context
    study.restore_tags(context.scene)
    definitions.keep(context.scene)
    try:
        members = study.parts(context)
    except Trouble:
        return
    for part in members:
        memory.follow(context.scene, part)
    depsgraph = context.evaluated_depsgraph_get()
    for part in members:
        if part.visible_get():
            measure(part, depsgraph)
    if not bpy.app.background:
        inspector.follow()
    live.loads_changed(context)  # after an undo the settings are other ones, and nobody was told
    host.redraw()


@persistent
def on_change(_scene: bpy.types.Scene, depsgraph: bpy.types.Depsgraph) -> None:
    """After edits, and when another part becomes the active one, refresh once things are quiet."""
    changes = [update for update in depsgraph.updates if isinstance(update.id, bpy.types.Object)]
    for update in changes:
        if update.is_updated_geometry:
            tag_colours.drop(update.id)
    part = study.active_part(bpy.context)
    changed = any(update.is_updated_geometry or update.is_updated_transform for update in changes)
    if changed or (part is not None and not tag_colours.knows(part)):
        refresh_once_quiet(bpy.context)


@persistent
def after_undo(scene: bpy.types.Scene, _depsgraph: bpy.types.Depsgraph | None = None) -> None:
    definitions.give_back(scene)


def refresh_once_quiet(_context: bpy.types.Context) -> None:
    if not bpy.app.background:
        _stop_waiting()
        bpy.app.timers.register(refresh, first_interval=QUIET_SECONDS)


@persistent
def before_save(_file: str) -> None:
    """Let every mesh hold its tags' definitions as they are now."""
    for scene in bpy.data.scenes:
        for mesh in study.meshes([thing for thing in scene.objects if thing.type == "MESH"]):
            if mesh.library is None and tags.is_tagged(mesh):
                # A foreign attribute of that name is told of when a run starts, and does not spoil saving.
                with suppress(Trouble):
                    tags.keep_copies(scene, mesh)


@persistent
def before_load(_file: str) -> None:
    """A run belongs to the file that is being left, and so do the tags that are drawn."""
    jobs.stop_all()
    bpy.context.window_manager.fluxface.running = False
    host.tell_status(None)
    tag_colours.forget()
    memory.forget()
    definitions.forget()
    inspector.stop()


@persistent
def follow_file(_file: str) -> None:
    """Results stand beside the file: where it went, they are found or brought."""
    for owner in (*bpy.data.objects, *bpy.data.collections):
        if owner.library is None:
            history.follow(owner.fluxface.outcome, study.folder_of(owner))


HANDLERS = (
    ("depsgraph_update_post", on_change),
    ("undo_post", after_undo),
    ("redo_post", after_undo),
    ("save_pre", before_save),
    ("save_post", follow_file),
    ("load_pre", before_load),
    ("load_post", follow_file),
)


def _stop_waiting() -> None:
    if bpy.app.timers.is_registered(refresh):
        bpy.app.timers.unregister(refresh)


def register() -> None:
    for moment, handler in HANDLERS:
        getattr(bpy.app.handlers, moment).append(handler)
    size_followers.append(refresh_once_quiet)


def unregister() -> None:
    for moment, handler in HANDLERS:
        getattr(bpy.app.handlers, moment).remove(handler)
    size_followers.remove(refresh_once_quiet)
    _stop_waiting()
    memory.forget()
    definitions.forget()
