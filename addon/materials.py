"""Materials of parts: between a part's settings, the door's Material, the built-in library and the user's own."""

from __future__ import annotations

import json
from itertools import pairwise
from pathlib import Path
from typing import TYPE_CHECKING

import bpy
import numpy as np

from ..solver.entries import Entry
from ..solver.errors import Trouble
from ..solver.materials import Material, Table, library, material_as_json, read_material
from . import host
from .units import as_typed

if TYPE_CHECKING:
    from .properties import MaterialProperty, MaterialValues

OWN_FILE = "materials.json"


def fill(values: MaterialValues, material: Material) -> None:
    """Set a part's values, but for the name, from a material; its axes stay the part's to choose."""
    along = (values.conductivity, values.along_y, values.along_z)
    values.directional = len(material.conductivity) == 3
    for target, source in zip(along, material.conductivity, strict=False):
        _fill_property(target, source)
    values.density = material.density or 0.0
    _fill_property(values.heat_capacity, material.heat_capacity or 0.0)


def _fill_property(target: MaterialProperty, source: float | Table) -> None:
    target.points.clear()
    target.tabulated = isinstance(source, Table)
    if not isinstance(source, Table):
        target.value = source
        return
    target.value = source.value[0]
    for temperature, value in zip(source.temperature, source.value, strict=True):
        point = target.points.add()
        point.temperature, point.value = temperature, value


def material_of(part: bpy.types.Object) -> Material:
    """The material that the part's settings describe.

    Raises Trouble of kind "case" that names the part and the property at fault.
    """
    values = part.fluxface.material
    if not values.name:
        raise Trouble("case", f"The part '{part.name}' has no material.", "Choose one under Material.")
    if values.directional:
        conductivity = tuple(
            _property(part, item, f"conductivity along {axis}")
            for item, axis in ((values.conductivity, "x"), (values.along_y, "y"), (values.along_z, "z"))
        )
    else:
        conductivity = (_property(part, values.conductivity, "conductivity"),)
    capacity = values.heat_capacity
    has_capacity = capacity.tabulated or capacity.value != 0.0
    return Material(
        name=values.name,
        conductivity=conductivity,
        axes=_axes(values.axes or part) if values.directional else None,
        density=as_typed(values.density) or None,
        heat_capacity=_property(part, capacity, "heat capacity") if has_capacity else None,
    )


def _property(part: bpy.types.Object, item: MaterialProperty, what: str) -> float | Table:
    where = f"The {what} of '{part.name}'"
    if not item.tabulated:
        value = as_typed(item.value)
        if value <= 0.0:
            raise Trouble("case", f"{where} is {value:g}; it must be greater than zero.", "Correct it under Material.")
        return value
    points = [(as_typed(point.temperature), as_typed(point.value)) for point in item.points]
    if len(points) < 2:
        raise Trouble("case", f"{where} is a table of fewer than two rows.", "Add rows or give one number.")
    if any(after[0] <= before[0] for before, after in pairwise(points)):
        raise Trouble("case", f"{where} has temperatures that do not increase from row to row.", "Put them in order.")
    if any(value <= 0.0 for _, value in points):
        raise Trouble("case", f"{where} has a value in its table that is not greater than zero.", "Correct that row.")
    return Table(*zip(*points, strict=True))


def _axes(thing: bpy.types.Object) -> tuple[tuple[float, float, float], ...]:
    """The local axes of an object as unit rows in world axes, at right angles even where it is sheared."""
    rotation = np.array(thing.matrix_world.to_quaternion().to_matrix(), dtype=float)
    # A rotation by quaternion is single precision: the polar factor by SVD is orthonormal to double.
    left, _, right = np.linalg.svd(rotation.T)
    return tuple(tuple(row) for row in (left @ right).tolist())


# Where materials are found --------------------------------------------------------------------------------------------


def own_materials() -> dict[str, Material]:
    """The user's own library, by name; empty when there is none yet.

    Raises Trouble of kind "case" when the file is there and cannot be read.
    """
    path = _own_path()
    if not path.exists():
        return {}
    try:
        entries = Entry(json.loads(path.read_text("utf-8")), path.name).each()
        return {material.name: material for material in map(read_material, entries)}
    except (OSError, ValueError) as error:
        raise Trouble("case", f"Your own materials in {path} cannot be read: {error}.", "Mend that file.") from error


def save_own(material: Material) -> None:
    """Put a material in the user's own library, in place of one of the same name.

    Raises Trouble of kind "case" when the library cannot be read or written.
    """
    everything = own_materials() | {material.name: material}
    path = _own_path()
    beside = path.with_suffix(".fresh")
    try:
        beside.write_text(json.dumps([material_as_json(each) for each in everything.values()], indent=1), "utf-8")
        beside.replace(path)
    except OSError as error:
        raise Trouble("case", f"{path} cannot be written: {error.strerror}.", "Free that place for writing.") from error


def _own_path() -> Path:
    return host.user_folder() / OWN_FILE


def materials_in_file() -> dict[str, Material]:
    """The materials that parts of this file are made of, those that are sound."""
    found = {}
    for thing in bpy.data.objects:
        try:
            material = material_of(thing) if thing.type == "MESH" else None
        except Trouble:
            continue
        if material is not None:
            found.setdefault(material.name, material)
    return found


def at_hand() -> dict[str, Material]:
    """Every material to choose from by name: the library's before the user's own before those of this file."""
    try:
        own = own_materials()
    except Trouble:
        own = {}
    return materials_in_file() | own | {name: row.material for name, row in library().items()}


def label_of(material: Material) -> str:
    """What a list says of a material beside its name, as in "metals, 167 W/mK"."""
    row = library().get(material.name)
    return f"{row.group if row else 'my own'}, {conductivity_text(material)}"


def conductivity_text(material: Material) -> str:
    """As in "167 W/mK", and "0.8 / 0.3 W/mK" along and across; of a table the value at its first temperature."""
    along = [value.value[0] if isinstance(value, Table) else value for value in material.conductivity]
    return f"{' / '.join(f'{value:g}' for value in dict.fromkeys(along))} W/mK"


def source_of(values: MaterialValues) -> str:
    """Where the library's values were published; empty when they have been changed or are the user's own."""
    row = library().get(values.name)
    return row.source if row is not None and _same(values, row.material) else ""


def _same(values: MaterialValues, material: Material) -> bool:
    along = (values.conductivity, values.along_y, values.along_z)
    pairs = [*zip(along, material.conductivity, strict=False), (values.heat_capacity, material.heat_capacity or 0.0)]
    return (
        values.directional == (len(material.conductivity) == 3)
        and as_typed(values.density) == (material.density or 0.0)
        and all(_same_property(item, source) for item, source in pairs)
    )


def _same_property(item: MaterialProperty, source: float | Table) -> bool:
    if not isinstance(source, Table):
        return not item.tabulated and np.float32(item.value) == np.float32(source)
    rows = [(point.temperature, point.value) for point in item.points]
    return item.tabulated and np.array_equal(
        np.array(rows, np.float32), np.array([source.temperature, source.value], np.float32).T
    )
