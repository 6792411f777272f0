"""Arrows along the heat flux, evenly over what is shown of the results, as long as the flux is large.

They stand before the surface: an arrow ends on it where heat goes in, and begins on it elsewhere.
"""

from __future__ import annotations

import bpy
import numpy as np

from ..units import metres_per_unit
from .colours import linear_from_srgb
from .material import paint_plain
from .result_object import (
    ARROWS,
    FLUX,
    add_geometry,
    arrows_of,
    mesh_of,
    new_child,
    places_and_triangles,
    read_vectors,
    remove_result,
    results_in,
    shown_of,
    write_colours,
)  # fmt: skip

# Light and saturated enough to be told from every colour of the maps and from light and dark grounds.
COLOUR = tuple(linear_from_srgb(np.array((0.03, 0.66, 0.66))).tolist())
MATERIAL = "Heat flow"

# The longest, in mean distances between arrows; its half width in its own lengths; where its head begins.
LONGEST, HALF_WIDTH, NECK = 1.2, 0.018, 0.7
HEAD = 3.0  # half widths
# What is shorter than this share of the longest is left out.
LEAST = 0.03
SIDES = 8


def refresh(scene: bpy.types.Scene) -> None:
    """Bring the arrows in line with what is shown. There are none where none are wanted or no flux is known.

    Of loads that are live, and of a comparison, no flux is known.
    """
    settings = scene.fluxface_view
    shown = {result.parent: shown_of(result.parent) for result in results_in(scene)}
    known = all(FLUX in object_.data.attributes for object_ in shown.values())
    if not (settings.arrows and shown and known and not settings.compared and not settings.live):
        remove_all(scene)
        return
    surfaces = [_flux_at_triangles(scene, object_) for object_ in shown.values()]
    middles, areas, normals = (np.concatenate([surface[i] for surface in surfaces]) for i in (0, 2, 3))
    chosen, apart = spread(middles, areas, normals, settings.arrow_count)
    size = np.linalg.norm(np.concatenate([surface[1] for surface in surfaces]), axis=1)
    longest = settings.arrow_longest = float(size[chosen].max(initial=0.0))
    start = 0
    for part, (places, flux, _, normals) in zip(shown, surfaces, strict=True):
        mine = chosen[(chosen >= start) & (chosen < start + len(places))] - start
        mine = mine[np.linalg.norm(flux[mine], axis=1) > LEAST * longest]
        start += len(places)
        _show(part, *arrows(places[mine], flux[mine], normals[mine], LONGEST * apart, longest))


def remove_all(scene: bpy.types.Scene) -> None:
    scene.fluxface_view.arrow_longest = 0.0
    for result in [object_ for object_ in scene.objects if object_.get(ARROWS)]:
        remove_result(result)


def legend_line(scene: bpy.types.Scene) -> str:
    """What the longest arrow stands for; empty where there are none."""
    longest = scene.fluxface_view.arrow_longest
    return f"Longest arrow {longest:,.0f} W/m²".replace(",", " ") if longest else ""


def _flux_at_triangles(scene: bpy.types.Scene, shown: bpy.types.Object) -> tuple[np.ndarray, ...]:
    """In the world: middles (T, 3), flux W/m2 (T, 3), areas (T,), unit normals (T, 3), outward."""
    places, triangles = places_and_triangles(shown)
    flux = read_vectors(shown.data, FLUX) @ np.array(shown.matrix_world)[:3, :3].T * metres_per_unit(scene)
    corners = places[triangles]
    vectors = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    twice = np.linalg.norm(vectors, axis=1)
    normals = vectors / np.maximum(twice, 1e-300)[:, None]
    return corners.mean(axis=1), flux[triangles].mean(axis=1), 0.5 * twice, normals


def spread(middles: np.ndarray, areas: np.ndarray, normals: np.ndarray, count: int) -> tuple[np.ndarray, float]:
    """About ``count`` of the places (T, 3), evenly over the areas (T,), and how far they are apart.

    One in each cube of a grid for each of the six ways that surfaces of ``normals`` (T, 3) look there, as both sides of
    a fin and a cut between them do: the nearest to the cube's middle. The cubes are made larger or smaller a few times,
    as it is not known beforehand how many the surface passes.
    """
    apart = float(np.sqrt(areas.sum() / count))
    places, chosen = middles[areas > 0], np.flatnonzero(areas > 0)
    lowest = places.min(axis=0)
    axis = np.abs(normals[chosen]).argmax(axis=1)
    way = 2 * axis + (np.take_along_axis(normals[chosen], axis[:, None], axis=1)[:, 0] > 0)
    for _ in range(4):
        cubes = np.floor((places - lowest) / apart + 0.5)
        off = np.linalg.norm((places - lowest) / apart - cubes, axis=1)
        numbers = 6 * (cubes.astype(np.int64) @ np.array((1, 2**20, 2**40), np.int64)) + way
        order = np.lexsort((off, numbers))
        first = np.concatenate([[True], np.diff(numbers[order]) != 0])
        found = order[first]
        if abs(len(found) - count) < 0.1 * count:
            break
        apart *= float(np.sqrt(len(found) / count))
    return np.sort(chosen[found]), apart


def arrows(
    places: np.ndarray, flux: np.ndarray, normals: np.ndarray, length: float, longest: float
) -> tuple[np.ndarray, np.ndarray]:
    """Places (P, 3) and triangles (T, 3) of arrows at ``places`` (A, 3) along ``flux`` (A, 3), none of it nothing.

    normals: (A, 3) of the surface. length: of an arrow for a flux of size ``longest``; the width is that of this one.
    """
    size = np.linalg.norm(flux, axis=1)
    along = flux / size[:, None]
    reach = length * size / longest
    radius = np.minimum(HALF_WIDTH * length, 0.1 * reach)
    helper = np.eye(3)[np.abs(along).argmin(axis=1)]
    across = np.cross(along, helper)
    across /= np.linalg.norm(across, axis=1)[:, None]
    sideways = np.cross(along, across)
    angle = 2 * np.pi * np.arange(SIDES) / SIDES
    circle = np.cos(angle)[:, None] * across[:, None] + np.sin(angle)[:, None] * sideways[:, None]  # (A, SIDES, 3)
    inward = (along * normals).sum(axis=1) < -0.1
    foot = places + normals * (HEAD * radius)[:, None] - along * (reach * inward)[:, None]
    rings = [
        foot[:, None] + along[:, None] * (at * reach)[:, None, None] + circle * (wide * radius)[:, None, None]
        for at, wide in ((0.0, 0.0), (0.0, 1.0), (NECK, 1.0), (NECK, HEAD), (1.0, 0.0))
    ]
    points = np.stack(rings, axis=1).reshape(-1, 3)
    here, there = np.arange(SIDES), np.roll(np.arange(SIDES), -1)
    band = np.concatenate([np.stack([here, there, there + SIDES], 1), np.stack([here, there + SIDES, here + SIDES], 1)])
    one = np.concatenate([band + ring * SIDES for ring in range(len(rings) - 1)])
    starts = len(rings) * SIDES * np.arange(len(places))
    return points, (starts[:, None, None] + one).reshape(-1, 3)


def _show(part: bpy.types.Object, places: np.ndarray, triangles: np.ndarray) -> None:
    """Give the part's arrows this form, in the world. The mesh stays the same one while a plane is moved."""
    object_ = arrows_of(part)
    if object_ is None:
        object_ = new_child(part, mesh_of(f"{part.name} heat flow", np.zeros((0, 3)), np.zeros((0, 3), int)), ARROWS)
        object_.data.materials.append(_material())
        object_.hide_select = True
        object_.visible_shadow = False
        object_.hide_render = shown_of(part).hide_render
        for layer in (layer for scene in part.users_scene for layer in scene.view_layers):
            layer.update()
            object_.hide_set(shown_of(part).hide_get(view_layer=layer), view_layer=layer)
    inverse = np.linalg.inv(np.array(part.matrix_world))
    mesh = object_.data
    mesh.clear_geometry()
    add_geometry(mesh, places @ inverse[:3, :3].T + inverse[:3, 3], triangles)
    write_colours(mesh, np.tile(COLOUR, (len(places), 1)))


def _material() -> bpy.types.Material:
    found = bpy.data.materials.get(MATERIAL)
    if found is None:
        found = bpy.data.materials.new(MATERIAL)
        paint_plain(found, COLOUR)
    return found
