"""Results cut open by a plane: an empty that the designer moves and turns, its arrow at what is taken away."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import bpy
import numpy as np
from bpy.app.handlers import persistent
from mathutils import Matrix, Vector

from ..solver.errors import Trouble
from ..solver.result import Field, read_field
from . import study, view
from .view import cut_object
from .view.section import Section, Solid, section, solid_of

# Of the parts' extent: how large the arrow is drawn.
ARROW = 0.35
SAME_WAY = 0.9999  # cosine
AXES = {"X": (1.0, 0.0, 0.0), "Y": (0.0, 1.0, 0.0), "Z": (0.0, 0.0, 1.0)}


@dataclass
class Held:
    """What a result is cut from, its temperature (N,) K as it is shown, and how it was cut last.

    flux: (N, 3) as results hold it.
    """

    solid: Solid
    temperature: np.ndarray
    flux: np.ndarray
    cut: Section | None = None


class Cutting:
    """Reads what fills the parts when it is first cut, and keeps it until there is another result.

    at: the plane's matrix (4, 4) when it was last followed.
    """

    def __init__(self) -> None:
        self.forget()

    def forget(self) -> None:
        self._folder, self._held = "", dict[str, Held]()
        self.at = np.zeros((4, 4))

    def held(self, folder: str, results: Sequence[bpy.types.Object]) -> dict[str, Held]:
        """By the name of the result object. Raises Trouble when the result cannot be read any more."""
        if self._folder != folder or any(result.name not in self._held for result in results):
            field = read_field(Path(folder))
            self._held = {result.name: _held(field, *view.placing(result)) for result in results}
            self._folder = folder
        return self._held

    def recolour(self, temperature: np.ndarray) -> None:
        """Show other temperatures (N,) K at the nodes of what is held."""
        for held in self._held.values():
            held.temperature = temperature


def _held(field: Field, part: int, matrix: np.ndarray) -> Held:
    return Held(solid_of(field, part, matrix), field.temperature, field.heat_flux @ matrix[:3, :3].T)


# One for the session: what it holds is as large as the result that is worked on.
cutting = Cutting()


def plane_of(scene: bpy.types.Scene) -> bpy.types.Object | None:
    """The empty that cuts, while it stands in the scene."""
    plane = view.settings_of(scene).cut
    return plane if plane is not None and plane.name in scene.objects else None


def open_up(context: bpy.types.Context) -> bpy.types.Object:
    """Cut the results of the present study through their middle, across the world's axis nearest to the line of sight.

    Gives the plane's empty, which is made the active object. Raises Trouble when there is nothing to cut.
    """
    scene, members = context.scene, study.parts(context)
    plane = plane_of(scene) or _new_plane(scene, members)
    for thing in context.selected_objects:
        thing.select_set(False)
    plane.select_set(True)
    context.view_layer.objects.active = plane
    point(scene, members, _nearest_axis(context))
    return plane


def _new_plane(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> bpy.types.Object:
    corners = np.concatenate([view.world_box(part) for part in members])
    plane = bpy.data.objects.new("Cut", None)
    plane.empty_display_type = "SINGLE_ARROW"
    plane.empty_display_size = ARROW * float(np.ptp(corners, axis=0).max())
    plane.show_in_front = True
    members[0].users_collection[0].objects.link(plane)
    plane.parent = members[0]
    plane.matrix_parent_inverse = members[0].matrix_world.inverted_safe()
    plane.location = 0.5 * (corners.min(axis=0) + corners.max(axis=0))
    plane[view.PLANE] = True
    view.settings_of(scene).cut = plane
    view.settle(scene)
    return plane


def _nearest_axis(context: bpy.types.Context) -> Vector:
    """The world's axis that looks the most at the eye, with its sign; from the front where there is no view."""
    seen = context.region_data.view_rotation @ Vector((0, 0, 1)) if context.region_data else Vector((0.0, -1.0, 0.0))
    nearest = Vector()
    axis = int(np.abs(seen).argmax())
    nearest[axis] = np.sign(seen[axis])
    return nearest


def turn(scene: bpy.types.Scene, members: Sequence[bpy.types.Object], axis: str) -> None:
    """Let the plane's arrow point along a world axis, X, Y or Z, or against it where it does so already."""
    way = Vector(AXES[axis])
    now = plane_of(scene).matrix_world.to_quaternion() @ Vector((0, 0, 1))
    point(scene, members, -way if now.dot(way) > SAME_WAY else way)


def point(scene: bpy.types.Scene, members: Sequence[bpy.types.Object], way: Vector) -> None:
    """Let the plane's arrow point along ``way`` in the world, and cut there."""
    plane = plane_of(scene)
    place, _, size = plane.matrix_world.decompose()
    plane.matrix_world = Matrix.LocRotScale(place, way.to_track_quat("Z", "Y"), size)
    view.settle(scene)
    follow(scene, members)


def follow(scene: bpy.types.Scene, members: Sequence[bpy.types.Object]) -> None:
    """Cut the results of ``members`` where the plane now stands. Raises Trouble when their field cannot be read."""
    plane = plane_of(scene)
    if plane is None:
        close(scene)
        return
    results = {part: view.result_of(part) for part in members}
    results = {part: result for part, result in results.items() if result is not None}
    held = cutting.held(study.outcome(scene, members).folder, list(results.values()))
    at = cutting.at = np.array(plane.matrix_world)
    were_cut = all(view.shown_of(part) != result for part, result in results.items())
    for part, result in results.items():
        mine, world = held[result.name], np.array(part.matrix_world)
        normal = world[:3, :3].T @ at[:3, 2]
        origin = np.linalg.solve(world[:3, :3], at[:3, 3] - world[:3, 3])
        mine.cut = section(mine.solid, origin, normal / np.linalg.norm(normal))
        temperature, flux = mine.cut.at(mine.temperature), mine.cut.at(mine.flux)
        cut_object.show(scene, part, mine.cut.places, mine.cut.triangles, temperature, flux)
    view.refresh_cut(scene)
    if not were_cut:
        view.apply_showing(scene)


def recolour(scene: bpy.types.Scene, members: Sequence[bpy.types.Object], temperature: np.ndarray) -> None:
    """Show other temperatures (N,) K on the cut, which stays where it is."""
    cutting.recolour(temperature)
    if plane_of(scene) is not None:
        follow(scene, members)


def close(scene: bpy.types.Scene) -> None:
    """Show the results whole again, and take the plane away."""
    plane = view.settings_of(scene).cut
    part = None if plane is None else plane.parent
    view.settings_of(scene).cut = None
    if plane is not None:
        bpy.data.objects.remove(plane)
    if cut_object.remove_all(scene):
        view.apply_showing(scene)
        view.refresh_cut(scene)
    layer = bpy.context.view_layer
    if part is not None and layer.objects.active is None and part.name in layer.objects:
        layer.objects.active = view.shown_of(part) or part


@persistent
def on_change(scene: bpy.types.Scene, depsgraph: bpy.types.Depsgraph) -> None:
    """The cut goes where the plane goes, and closes when the plane is deleted."""
    plane = view.settings_of(scene).cut
    if plane is None:
        return
    gone = plane.name not in scene.objects
    moved = any(update.id.original == plane and update.is_updated_transform for update in depsgraph.updates)
    if gone and not bpy.app.background:
        bpy.app.timers.register(
            lambda: close(scene), first_interval=0.0
        )  # nothing is removed while the host looks at it
    elif gone:
        close(scene)
    elif moved:
        try:
            follow(scene, study.parts(bpy.context))
        except Trouble:
            return


@persistent
def on_load(_file: str) -> None:
    cutting.forget()


HANDLERS = (("depsgraph_update_post", on_change), ("load_post", on_load))


def register() -> None:
    for moment, handler in HANDLERS:
        getattr(bpy.app.handlers, moment).append(handler)


def unregister() -> None:
    for moment, handler in HANDLERS:
        getattr(bpy.app.handlers, moment).remove(handler)
    cutting.forget()
