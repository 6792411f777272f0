"""The result object: the solved boundary of a part as a mesh of its own, child of the part."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import bpy
import numpy as np

from ...solver.errors import Trouble
from ...solver.result import Field, HotSkin, hot_skin, read_field, skin_nodes
from ..units import metres_per_unit
from .lines import CREASE
from .material import KNOWN, SHOWN, UNKNOWN
from .scale import Scale

# What is a result, what is left of it by a cut, the empty that cuts it, and arrows on it: each is a child of its part.
MARK, CUT, PLANE, ARROWS = "fluxface_result", "fluxface_cut", "fluxface_plane", "fluxface_arrows"
# Kept with a result: its part's number in the case, and the (4, 4) matrix from the world in metres to its own axes.
NUMBER, PLACED = "fluxface_part", "fluxface_placed"
TEMPERATURE = "temperature"
COLOUR = "temperature_colour"
# W/m2, in the axes of the result as an arrow of so many metres would be.
FLUX = "heat_flux"


def result_of(part: bpy.types.Object) -> bpy.types.Object | None:
    """The part's result object, or None."""
    return next((child for child in part.children if child.get(MARK)), None)


def cut_of(part: bpy.types.Object) -> bpy.types.Object | None:
    """What a cut leaves of the part's result, or None."""
    return next((child for child in part.children if child.get(CUT)), None)


def arrows_of(part: bpy.types.Object) -> bpy.types.Object | None:
    """The part's arrows along the heat flux, or None."""
    return next((child for child in part.children if child.get(ARROWS)), None)


def shown_of(part: bpy.types.Object) -> bpy.types.Object | None:
    """What shows the part's temperatures: its result, or what a cut leaves of it; None where there is none."""
    return cut_of(part) or result_of(part)


def part_of(object_: bpy.types.Object) -> bpy.types.Object:
    """The part whose result, cut, cutting plane or arrows ``object_`` is, or ``object_`` itself if it is none."""
    is_ours = any(object_.get(mark) for mark in (MARK, CUT, PLANE, ARROWS))
    return object_.parent if is_ours and object_.parent else object_


def placing(result: bpy.types.Object) -> tuple[int, np.ndarray]:
    """The part's number in the case, and the matrix (4, 4) from the world in metres, as solved, to its own axes."""
    return result[NUMBER], np.reshape(result[PLACED], (4, 4))


def world_box(part: bpy.types.Object) -> np.ndarray:
    """(8, 3) corners of the part's bounding box in the world."""
    matrix = np.array(part.matrix_world)
    return np.array(part.bound_box) @ matrix[:3, :3].T + matrix[:3, 3]


def results_in(scene: bpy.types.Scene) -> list[bpy.types.Object]:
    return [object_ for object_ in scene.objects if object_.get(MARK) and object_.parent]


def shown_in(scene: bpy.types.Scene) -> list[bpy.types.Object]:
    return [shown_of(result.parent) for result in results_in(scene)]


def settle(scene: bpy.types.Scene) -> None:
    """Let objects be where they have been put; until then their matrices tell where they were."""
    for layer in scene.view_layers:
        layer.update()


def build_results(
    scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], folder: Path, material: bpy.types.Material
) -> list[bpy.types.Object]:
    """One result object for each part, in their order, lying exactly on it; an older one takes the new mesh.

    Raises Trouble when the result cannot be read or does not fit the parts; nothing is changed then.
    """
    field = read_field(folder)
    _check(field, len(parts))
    settle(scene)
    skin, flux = hot_skin(field), field.heat_flux[skin_nodes(field)[0]]
    return [
        _build_result(scene, part, index, *_surface_of(skin, flux, index), material) for index, part in enumerate(parts)
    ]


def _check(field: Field, parts: int) -> None:
    solved = int(field.boundary_part.max(initial=-1)) + 1
    if solved != parts:
        raise Trouble("case", f"The result has {solved} parts and {parts} are to be shown.", "Run again.")
    if field.boundary.min(initial=0) < 0 or field.boundary.max(initial=-1) >= len(field.nodes):
        raise Trouble("case", "The result's boundary names nodes that are not there.", "Run again.")
    if not (np.isfinite(field.nodes).all() and np.isfinite(field.temperature).all()):
        raise Trouble("case", "The result holds temperatures or places that are not numbers.", "Run again.")


def _surface_of(skin: HotSkin, flux: np.ndarray, part: int) -> tuple[np.ndarray, ...]:
    """The part's own boundary: places (P, 3) m, triangles (T, 3), temperature (P,) K, heat flux (P, 3) W/m2."""
    used, triangles = np.unique(skin.triangles[skin.part == part], return_inverse=True)
    return skin.places[used], triangles.reshape(-1, 3), skin.temperature[used], flux[used]


def _build_result(
    scene: bpy.types.Scene,
    part: bpy.types.Object,
    number: int,
    places: np.ndarray,
    triangles: np.ndarray,
    temperature: np.ndarray,
    flux: np.ndarray,
    material: bpy.types.Material,
) -> bpy.types.Object:
    matrix = np.array(part.matrix_world)
    placed = np.linalg.inv(matrix) @ np.diag([1 / metres_per_unit(scene)] * 3 + [1.0])
    local = places @ placed[:3, :3].T + placed[:3, 3]
    if np.linalg.det(matrix[:3, :3]) < 0:  # a mirrored part turns its faces over, and these are outward in the world
        triangles = triangles[:, ::-1]
    mesh = mesh_of(f"{part.name} temperature", local, triangles)
    for name in (TEMPERATURE, SHOWN):
        write_kelvin(mesh, name, temperature)
    write_vectors(mesh, FLUX, flux @ placed[:3, :3].T)
    mesh.set_sharp_from_angle(angle=CREASE)
    mesh.materials.append(material)
    result = result_of(part) or new_child(part, mesh, MARK)
    result[NUMBER], result[PLACED] = number, placed.ravel().tolist()
    stale, result.data = result.data, mesh
    _drop(stale)
    return result


def mesh_of(name: str, places: np.ndarray, triangles: np.ndarray) -> bpy.types.Mesh:
    """A mesh of ``places`` (P, 3) in the host's units and ``triangles`` (T, 3)."""
    mesh = bpy.data.meshes.new(name)
    add_geometry(mesh, places, triangles)
    return mesh


def add_geometry(mesh: bpy.types.Mesh, places: np.ndarray, triangles: np.ndarray) -> None:
    """Give an empty mesh ``places`` (P, 3) in the host's units and ``triangles`` (T, 3)."""
    mesh.vertices.add(len(places))
    mesh.vertices.foreach_set("co", places.astype(np.float32).ravel())
    mesh.loops.add(triangles.size)
    mesh.loops.foreach_set("vertex_index", triangles.astype(np.int32).ravel())
    mesh.polygons.add(len(triangles))
    mesh.polygons.foreach_set("loop_start", np.arange(0, triangles.size, 3, dtype=np.int32))
    mesh.update(calc_edges=True)


def write_kelvin(mesh: bpy.types.Mesh, name: str, temperature: np.ndarray) -> None:
    """Give the mesh's vertices temperatures (P,) in kelvin, as the attribute ``name``."""
    mesh.attributes.new(name, "FLOAT", "POINT").data.foreach_set("value", temperature.astype(np.float32))


def write_vectors(mesh: bpy.types.Mesh, name: str, vectors: np.ndarray) -> None:
    """Give the mesh's vertices vectors (P, 3), as the attribute ``name``."""
    mesh.attributes.new(name, "FLOAT_VECTOR", "POINT").data.foreach_set("vector", vectors.astype(np.float32).ravel())


def read_vectors(mesh: bpy.types.Mesh, name: str) -> np.ndarray:
    """(P, 3) at the vertices, from the attribute ``name``."""
    vectors = np.empty(3 * len(mesh.vertices), dtype=np.float32)
    mesh.attributes[name].data.foreach_get("vector", vectors)
    return vectors.reshape(-1, 3)


def new_child(part: bpy.types.Object, mesh: bpy.types.Mesh, mark: str) -> bpy.types.Object:
    """A child at the part's own place, so that it goes where the part goes and nowhere else."""
    result = bpy.data.objects.new(mesh.name, mesh)
    result[mark] = True
    part.users_collection[0].objects.link(result)
    result.parent = part
    result.lock_location = result.lock_rotation = result.lock_scale = (True, True, True)
    return result


def remove_result(result: bpy.types.Object) -> None:
    mesh = result.data
    bpy.data.objects.remove(result)
    _drop(mesh)


def _drop(mesh: bpy.types.Mesh) -> None:
    if mesh.users == 0:
        bpy.data.meshes.remove(mesh)


def temperatures(result: bpy.types.Object) -> np.ndarray:
    """(P,) kelvin at the vertices of a result object."""
    return read_kelvin(result.data, TEMPERATURE)


def shown_values(result: bpy.types.Object) -> np.ndarray:
    """(P,) what is shown at the vertices: kelvin, or kelvin more than in another run; NaN where nothing is known."""
    values = read_kelvin(result.data, SHOWN)
    return np.where(values > KNOWN, values, np.nan)


def write_shown(result: bpy.types.Object, values: np.ndarray) -> None:
    """Show values (P,), NaN where nothing is known."""
    known = np.where(np.isnan(values), UNKNOWN, values)
    result.data.attributes[SHOWN].data.foreach_set("value", known.astype(np.float32))


def read_kelvin(mesh: bpy.types.Mesh, name: str) -> np.ndarray:
    """(P,) kelvin at the vertices, from the attribute ``name``."""
    values = np.empty(len(mesh.vertices), dtype=np.float32)
    mesh.attributes[name].data.foreach_get("value", values)
    return values


def local_surface(mesh: bpy.types.Mesh) -> tuple[np.ndarray, np.ndarray]:
    """Places (P, 3) and triangles (T, 3) of a mesh of triangles, in its own axes."""
    places = np.empty(3 * len(mesh.vertices), dtype=np.float32)
    mesh.vertices.foreach_get("co", places)
    triangles = np.empty(len(mesh.loops), dtype=np.int32)
    mesh.loops.foreach_get("vertex_index", triangles)
    return places.reshape(-1, 3).astype(np.float64), triangles.reshape(-1, 3)


def places_and_triangles(result: bpy.types.Object) -> tuple[np.ndarray, np.ndarray]:
    """World places (P, 3) in the host's units and outward triangles (T, 3) of a result object."""
    places, triangles = local_surface(result.data)
    matrix = np.array(result.matrix_world)
    world = places @ matrix[:3, :3].T + matrix[:3, 3]
    return world, triangles if np.linalg.det(matrix[:3, :3]) > 0 else triangles[:, ::-1]


def colour(result: bpy.types.Object, scale: Scale) -> None:
    """Give the vertices the scale's colours, which is what Solid shading shows."""
    write_colours(result.data, scale.colours(shown_values(result)))
    result.data.update()


def write_colours(mesh: bpy.types.Mesh, linear: np.ndarray) -> None:
    """Give the vertices colours (P, 3) in linear light, and have them shown where vertices' colours are."""
    attribute = mesh.color_attributes.get(COLOUR) or mesh.color_attributes.new(COLOUR, "FLOAT_COLOR", "POINT")
    colours = np.ones((len(mesh.vertices), 4), dtype=np.float32)
    colours[:, :3] = linear
    attribute.data.foreach_set("color", colours.ravel())
    mesh.color_attributes.active_color = attribute
