"""The evaluated geometry of modelled objects, with its tags, in metres and world axes."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from functools import cached_property

import bpy
import numpy as np

from ..solver.errors import Trouble
from . import tags
from .nearest import nearest_uids

# Below this share of what the extent allows, a volume is rounding and not thickness. Common practice, no source.
FLATNESS = 1e-9


@dataclass(frozen=True)
class Skin:
    """One part's evaluated surface, outward as modelled.

    vertices: (V, 3). triangles: (F, 3). uid: (F,) tag ids. face: (F,) polygon numbers of the evaluated mesh.
    """

    vertices: np.ndarray
    triangles: np.ndarray
    uid: np.ndarray
    face: np.ndarray

    @cached_property
    def area_vectors(self) -> np.ndarray:
        """(F, 3): along each triangle's normal, as long as its area."""
        # Coordinate by coordinate: several times quicker than a cross product of rows.
        places = np.ascontiguousarray(self.vertices.T)
        a, b, c = (np.take(places, self.triangles[:, corner], axis=1) for corner in range(3))
        (ux, uy, uz), (vx, vy, vz) = b - a, c - a
        return 0.5 * np.stack([uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx], axis=1)

    @cached_property
    def areas(self) -> np.ndarray:
        """(F,) of each triangle."""
        return np.sqrt(np.einsum("fi,fi->f", self.area_vectors, self.area_vectors))

    def volume(self) -> float:
        """Enclosed, by the divergence theorem."""
        centred = self.vertices - self.vertices.mean(axis=0)
        return float(np.einsum("fi,fi->", centred[self.triangles[:, 0]], self.area_vectors) / 3.0)

    def area_by_tag(self) -> dict[int, float]:
        """Area of each tag that has faces; the untagged ones are 0's."""
        uids, inverse = np.unique(self.uid, return_inverse=True)
        sums = np.bincount(inverse.ravel(), weights=self.areas, minlength=len(uids))
        return dict(zip(uids.tolist(), sums.tolist(), strict=True))


@contextmanager
def in_sight(context: bpy.types.Context, parts: Sequence[bpy.types.Object]) -> Iterator[bpy.types.Depsgraph]:
    """The evaluated scene with the parts in it: the host does not evaluate what is hidden, as parts under results are.

    Raises Trouble of kind "case" when a part is not in the view layer at all.
    """
    for part in parts:
        if part.name not in context.view_layer.objects:
            raise Trouble(
                "case",
                f"The part '{part.name}' is in a collection that is switched off.",
                "Switch its collection on in the outliner.",
            )
    hidden = [(part, part.hide_get(), part.hide_viewport) for part in parts if not part.visible_get()]
    for part, _, _ in hidden:
        part.hide_set(False)
        part.hide_viewport = False
    try:
        yield context.evaluated_depsgraph_get()
    finally:
        for part, by_eye, in_viewports in hidden:
            part.hide_set(by_eye)
            part.hide_viewport = in_viewports


def modelled(part: bpy.types.Object, depsgraph: bpy.types.Depsgraph) -> Skin:
    """The part as its modifiers leave it, in its own axes and scene units.

    Raises Trouble when the tag attribute is not one of ours.
    """
    evaluated = part.evaluated_get(depsgraph)
    mesh = evaluated.to_mesh()
    try:
        vertices, triangles, face = triangulated(mesh)
        uid = _uids(part.data, mesh)[face]
    finally:
        evaluated.to_mesh_clear()
    return Skin(vertices.astype(np.float64), triangles, uid, face)


def triangulated(mesh: bpy.types.Mesh) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Vertices (V, 3) float32, triangles (F, 3) and the polygon of each (F,), of a mesh in object mode."""
    mesh.calc_loop_triangles()
    vertices = np.empty((len(mesh.vertices), 3), np.float32)
    corners = np.empty(len(mesh.loops), np.int32)
    triangles = np.empty((len(mesh.loop_triangles), 3), np.int32)
    face = np.empty(len(mesh.loop_triangles), np.int32)
    # What the host hands out in one piece is had many times quicker than what it asks each element for.
    if len(vertices):
        mesh.attributes["position"].data.foreach_get("vector", vertices.ravel())
    if len(triangles):
        mesh.attributes[".corner_vert"].data.foreach_get("value", corners)
        mesh.loop_triangles.foreach_get("loops", triangles.ravel())
        mesh.loop_triangle_polygons.foreach_get("value", face)
    return vertices, corners[triangles], face


def placed(surface: Skin, matrix: np.ndarray, metres: float) -> Skin:
    """A skin moved by a world matrix (4, 4) and scaled by ``metres`` in a scene unit."""
    world = surface.vertices @ matrix[:3, :3].T + matrix[:3, 3]
    mirrored = np.linalg.det(matrix[:3, :3]) < 0
    # A mirroring scale turns the surface inside out.
    triangles = surface.triangles[:, ::-1] if mirrored else surface.triangles
    return replace(surface, vertices=world * metres, triangles=triangles)


def world_matrix(part: bpy.types.Object) -> np.ndarray:
    return np.array(part.matrix_world, dtype=np.float64)


def _uids(base: bpy.types.Mesh, evaluated: bpy.types.Mesh) -> np.ndarray:
    """(F,) tag ids of the evaluated faces; where a modifier dropped them, those of the nearest modelled face."""
    if tags.ATTRIBUTE in evaluated.attributes or not len(evaluated.polygons):
        return tags.read(evaluated)
    modelled = tags.read(base)
    if not modelled.any() or len(modelled) != len(base.polygons):
        return np.zeros(len(evaluated.polygons), np.int32)
    vertices, triangles, face = triangulated(base)
    return nearest_uids(vertices, triangles, modelled[face], evaluated)


def check_real(part: bpy.types.Object, depsgraph: bpy.types.Depsgraph) -> None:
    """Find that the part is its mesh alone.

    Raises Trouble of kind "geometry" when its geometry nodes leave instances, which are seen and have no faces.
    """
    if not any(modifier.type == "NODES" and modifier.show_viewport for modifier in part.modifiers):
        return
    if any(seen.is_instance and seen.parent.original == part for seen in depsgraph.object_instances):
        raise Trouble(
            "geometry",
            f"The geometry nodes of '{part.name}' make instances, which are not solved.",
            "End them with the node Realize Instances.",
        )


def check_solid(part: bpy.types.Object, surface: Skin) -> None:
    """Find the part to be a body.

    Raises Trouble of kind "geometry" when the part is scaled to nothing, empty or flat."""
    scale = np.linalg.norm(world_matrix(part)[:3, :3], axis=0)
    if scale.min() <= FLATNESS * max(scale.max(), 1e-30):
        axes = ", ".join(axis for axis, size in zip("XYZ", scale, strict=True) if size <= FLATNESS * scale.max())
        raise Trouble(
            "geometry", f"The part '{part.name}' is scaled to zero along {axes}.", "Give it a scale other than zero."
        )
    if not len(surface.triangles):
        raise Trouble("geometry", f"The part '{part.name}' has no faces.", "Model a closed body.")
    extent = float(np.linalg.norm(np.ptp(surface.vertices, axis=0)))
    if abs(surface.volume()) <= FLATNESS * extent**3:
        raise Trouble(
            "geometry", f"The part '{part.name}' is flat: it encloses no volume.", "Model a closed body with thickness."
        )
