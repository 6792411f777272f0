"""Mend this mesh: the solver's ladder tried on a part, and the part's mesh replaced by what it reached."""

from __future__ import annotations

import json
import tempfile
from dataclasses import dataclass
from pathlib import Path

import bmesh
import bpy
import numpy as np

from ..solver.case import Surface, read_case, write_case
from ..solver.errors import Trouble
from . import inspection, jobs, tags, upkeep
from .cases import build_shapes
from .parts import in_sight, world_matrix
from .units import metres_per_unit
from .view.result_object import add_geometry

# Radians: triangles that the mending made of one flat face become one polygon again. The host's angles between normals
# in single precision are good to half of that.
FLAT = 1e-3


@dataclass(frozen=True)
class Mending:
    """part: the host's id for the session. shape: its digest when it began. uids: of the tags of the case.

    folder: holds the case and the mended one.
    """

    job: jobs.Job
    part: int
    shape: str
    uids: tuple[int, ...]
    folder: tempfile.TemporaryDirectory


def start(context: bpy.types.Context, part: bpy.types.Object) -> Mending:
    """Start mending a part as it stands.

    Raises Trouble when it is no body or the solver is missing.
    """
    with in_sight(context, [part]) as depsgraph:
        upkeep.measure(part, depsgraph)
        case = build_shapes(context.scene, [part], depsgraph)
    uids = {tag.name: tag.uid for tag in context.scene.fluxface.tags}
    folder = tempfile.TemporaryDirectory(prefix="fluxface-", ignore_cleanup_errors=True)
    write_case(case, Path(folder.name) / "found")
    job = jobs.mend(Path(folder.name) / "found", Path(folder.name) / "mended")
    given = tuple(uids.get(tag.name, 0) for tag in case.tags)
    return Mending(job, part.session_uid, part.fluxface.shape, given, folder)


def finish(mending: Mending, ending: jobs.Ending) -> Trouble | None:
    """Replace the part's mesh and tell on the part what was done, or what kept that from happening."""
    with mending.folder as folder:
        part = next((thing for thing in bpy.data.objects if thing.session_uid == mending.part), None)
        if part is None or ending.cancelled:
            return None
        trouble = ending.trouble or _changed(mending, part)
        if trouble:
            inspection.note(part, f"{trouble.message} {trouble.mend}")
            return trouble
        measures = json.loads(ending.said)
        said = [*measures["parts"][0]["mending"], *measures["warnings"]]
        if said:
            replace_mesh(bpy.context.scene, part, read_case(Path(folder) / "mended").surface, mending.uids)
        for sentence in said or ["Nothing had to be mended."]:
            inspection.note(part, sentence)
    upkeep.refresh()
    return None


def _changed(mending: Mending, part: bpy.types.Object) -> Trouble | None:
    """What keeps an edit that was made meanwhile from being overwritten."""
    with in_sight(bpy.context, [part]) as depsgraph:
        upkeep.measure(part, depsgraph)
    if part.fluxface.shape == mending.shape:
        return None
    return Trouble(
        "case", f"'{part.name}' was changed while it was being mended, and was left as it is.", "Mend it again."
    )


def replace_mesh(scene: bpy.types.Scene, part: bpy.types.Object, surface: Surface, uids: tuple[int, ...]) -> None:
    """Give the part's mesh the faces of ``surface`` (m, world axes), with the materials, shading and tags they had."""
    was_edited = part.mode == "EDIT"
    if was_edited:
        bpy.ops.object.mode_set(mode="OBJECT")
    mesh, matrix = part.data, world_matrix(part)
    places = np.linalg.solve(matrix[:3, :3], (surface.vertices / metres_per_unit(scene) - matrix[:3, 3]).T).T
    triangles = surface.triangles[:, ::-1] if np.linalg.det(matrix[:3, :3]) < 0 else surface.triangles
    material, smooth = np.empty(len(mesh.polygons), np.int32), np.empty(len(mesh.polygons), bool)
    mesh.polygons.foreach_get("material_index", material)
    mesh.polygons.foreach_get("use_smooth", smooth)
    origin = np.clip(surface.face, 0, len(mesh.polygons) - 1)
    uid = np.array([*uids, 0], np.int32)[surface.tag]

    mesh.clear_geometry()
    add_geometry(mesh, places, triangles)
    tags.give(mesh, np.ones(len(triangles), bool), uid)
    _join_flat(mesh, material[origin], smooth[origin], uid)
    if was_edited:
        bpy.ops.object.mode_set(mode="EDIT")


def _join_flat(mesh: bpy.types.Mesh, material: np.ndarray, smooth: np.ndarray, uid: np.ndarray) -> None:
    """Make polygons of triangles in one plane, none across tags, materials or shading (each (F,)), which they keep."""
    kinds, kind = np.unique(np.stack([material, smooth, uid], axis=1), axis=0, return_inverse=True)
    # What the host keeps apart while it dissolves is the material, so for that time each kind is one.
    mesh.polygons.foreach_set("material_index", kind.ravel().astype(np.int32))
    edited = bmesh.new()
    edited.from_mesh(mesh)
    bmesh.ops.dissolve_limit(
        edited, angle_limit=FLAT, use_dissolve_boundaries=False,
        verts=edited.verts[:], edges=edited.edges[:], delimit={"MATERIAL"},
    )  # fmt: skip
    edited.to_mesh(mesh)
    edited.free()
    kept = np.empty(len(mesh.polygons), np.int32)
    mesh.polygons.foreach_get("material_index", kept)
    material, smooth, uid = kinds[kept].T
    mesh.polygons.foreach_set("material_index", material.astype(np.int32))
    mesh.polygons.foreach_set("use_smooth", smooth.astype(bool))
    tags.give(mesh, np.ones(len(mesh.polygons), bool), uid)
    mesh.update()
