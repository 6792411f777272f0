"""The case: everything the solver needs to know of a modelled product, read from and written to a case folder.

A case folder holds ``surface.npz`` (the triangles and whose they are) and ``case.json`` (parts, tags, contacts).
SI units and kelvin throughout; heat into a part is positive.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from .archives import read_arrays, shaped
from .entries import Entry
from .errors import Trouble
from .materials import Material, material_as_json, read_material

FORMAT = "fluxface.case/1"
CASE_FILE = "case.json"
SURFACE_FILE = "surface.npz"
MOST_TEXT = 16 << 20  # bytes of case.json: some 100,000 tags, and a few hundred MB once read
MOST_NODES = 1_000_000_000  # nodes are numbered by 32 bits
FARTHEST = 1e6  # m from the origin, where a double still tells tenths of a nanometre

CORRELATIONS = (
    "natural",
    "vertical_plate",
    "horizontal_plate",
    "inclined_plate",
    "horizontal_cylinder",
    "sphere",
    "fin_channel",
    "flat_plate_flow",
    "cylinder_crossflow",
)
# What a correlation cannot do without; the rest is measured on the tag.
CORRELATION_NEEDS = {"fin_channel": ("gap",), "flat_plate_flow": ("speed",), "cylinder_crossflow": ("speed",)}


@dataclass(frozen=True)
class Surface:
    """The triangles that bound the parts, outward-oriented.

    vertices: (V, 3) m. triangles: (F, 3). part, tag: (F,) indices into the case's lists, tag -1 = untagged.
    face: (F,) the modeller's polygon number, for messages.
    """

    vertices: np.ndarray
    triangles: np.ndarray
    part: np.ndarray
    tag: np.ndarray
    face: np.ndarray


@dataclass(frozen=True)
class Part:
    """heat: W over the whole volume, or heat_density: W/m3."""

    name: str
    material: Material
    heat: float = 0.0
    heat_density: float = 0.0


@dataclass(frozen=True)
class Convection:
    """A film: a coefficient (W/(m2 K)), or a correlation by name with what it needs; ambient in kelvin.

    length, diameter, gap: m. speed: m/s.
    """

    ambient: float
    coefficient: float | None = None
    correlation: str | None = None
    length: float | None = None
    diameter: float | None = None
    gap: float | None = None
    speed: float | None = None
    fluid: str | None = None


@dataclass(frozen=True)
class Radiation:
    """Exchange with surroundings at ``ambient`` (K) that see nothing but this face."""

    emissivity: float
    ambient: float


@dataclass(frozen=True)
class Tag:
    """A named set of faces and the terms they carry; terms add up, a held temperature (K) excludes the others.

    heat: W over the tag's true area. heat_flux: W/m2. Both are positive into the part. size: mean edge length (m) that
    its faces shall have where that is finer than the part's.
    """

    name: str
    heat: float = 0.0
    heat_flux: float = 0.0
    convection: Convection | None = None
    radiation: Radiation | None = None
    temperature: float | None = None
    size: float | None = None


UNTAGGED = Tag("untagged")


@dataclass(frozen=True)
class Contact:
    """Where faces of two parts (indices) lie within ``gap`` (m) of each other.

    conductance: W/(m2 K), or None where the parts are bonded. gap None: 1e-4 of the pair's diagonal.
    """

    parts: tuple[int, int]
    conductance: float | None
    gap: float | None = None


@dataclass(frozen=True)
class Accuracy:
    """order: 1 or 2. size: target mean edge length (m), None = chosen. max_nodes: refuse beyond it."""

    order: int = 2
    size: float | None = None
    max_nodes: int = 2_000_000


@dataclass(frozen=True)
class Case:
    surface: Surface
    parts: tuple[Part, ...]
    tags: tuple[Tag, ...] = ()
    untagged: Tag = UNTAGGED
    contacts: tuple[Contact, ...] = ()
    gravity: tuple[float, float, float] = (0.0, 0.0, -1.0)
    accuracy: Accuracy = field(default_factory=Accuracy)
    title: str = ""


# Reading ------------------------------------------------------------------------------------------------------------


def read_case(folder: Path) -> Case:
    """The case in ``folder``.

    Raises Trouble of kind "case" that names the file or the key at fault.
    """
    document = Entry(_read_json(folder / CASE_FILE))
    document.with_keys("format", "title", "parts", "tags", "untagged", "contacts", "gravity", "time", "accuracy")
    if document["format"].value != FORMAT:
        raise document["format"].trouble(f"must be '{FORMAT}'")
    if "time" in document:
        raise document["time"].trouble("is given, and only the steady state is solved", "Set time to null.")
    parts = _unique(tuple(_read_part(entry) for entry in document["parts"].each()), "parts")
    if not parts:
        raise document["parts"].trouble("is empty; there must be at least one part")
    tag_entries = document["tags"].each() if "tags" in document else ()
    tags = _unique(tuple(_read_tag(entry, entry.with_keys(*TAG_KEYS)["name"].text()) for entry in tag_entries), "tags")
    contact_entries = document["contacts"].each() if "contacts" in document else ()
    return Case(
        surface=read_surface(folder / SURFACE_FILE, len(parts), len(tags)),
        parts=parts,
        tags=tags,
        untagged=_read_tag(document["untagged"], UNTAGGED.name) if "untagged" in document else UNTAGGED,
        contacts=tuple(_read_contact(entry, [part.name for part in parts]) for entry in contact_entries),
        gravity=_read_direction(document["gravity"]) if "gravity" in document else Case.gravity,
        accuracy=_read_accuracy(document["accuracy"]) if "accuracy" in document else Accuracy(),
        title=document["title"].text() if "title" in document else "",
    )


def _read_json(path: Path) -> Any:
    try:
        if path.stat().st_size > MOST_TEXT:
            raise Trouble("case", f"{path.name} is larger than {MOST_TEXT >> 20} MB.", "Write the case again.")
        return json.loads(path.read_text("utf-8"))
    except OSError as error:
        raise Trouble("case", f"{path.name} cannot be read: {error.strerror}.", f"Put {path.name} there.") from error
    except (ValueError, RecursionError) as error:
        raise Trouble("case", f"{path.name} is not valid JSON: {error}.", "Write the case again.") from error


def _unique(named: tuple[Any, ...], path: str) -> tuple[Any, ...]:
    seen: set[str] = set()
    for index, item in enumerate(named):
        if item.name in seen:
            raise Entry(item.name, f"{path}[{index}].name").trouble(f"is '{item.name}', a name already taken")
        seen.add(item.name)
    return named


def _read_part(entry: Entry) -> Part:
    entry.with_keys("name", "material", "heat", "heat_density")
    if (
        "heat" in entry
        and "heat_density" in entry
        and entry["heat"].number("W")
        and entry["heat_density"].number("W/m3")
    ):
        raise entry.trouble("has both heat and heat_density", "Give one of the two.")
    return Part(
        name=entry["name"].text(),
        material=read_material(entry["material"]),
        heat=entry["heat"].number("W") if "heat" in entry else 0.0,
        heat_density=entry["heat_density"].number("W/m3") if "heat_density" in entry else 0.0,
    )


TERM_KEYS = ("heat", "heat_flux", "convection", "radiation", "temperature")
TAG_KEYS = ("name", "size", *TERM_KEYS)


def _read_tag(entry: Entry, name: str) -> Tag:
    entry.with_keys(*TAG_KEYS)
    others = [key for key in TERM_KEYS if key in entry and key != "temperature"]
    if "temperature" in entry and others:
        raise Trouble(
            "case",
            f"The tag '{name}' holds a temperature and also carries {', '.join(others)}.",
            f"A held temperature excludes the other terms: remove one of them from {entry.path}.",
        )
    return Tag(
        name=name,
        heat=entry["heat"].number("W") if "heat" in entry else 0.0,
        heat_flux=entry["heat_flux"].number("W/m2") if "heat_flux" in entry else 0.0,
        convection=_read_convection(entry["convection"]) if "convection" in entry else None,
        radiation=_read_radiation(entry["radiation"]) if "radiation" in entry else None,
        temperature=_kelvin(entry["temperature"]) if "temperature" in entry else None,
        size=entry["size"].number("m", above=0) if "size" in entry else None,
    )


def _kelvin(entry: Entry) -> float:
    return entry.number("K", at_least=0)


def _read_convection(entry: Entry) -> Convection:
    entry.with_keys("coefficient", "ambient", "correlation", "length", "diameter", "gap", "speed", "fluid")
    ambient = _kelvin(entry["ambient"])
    if "correlation" not in entry:
        for key in ("length", "diameter", "gap", "speed", "fluid"):
            if key in entry:
                raise entry[key].trouble("goes with a correlation, and none is named")
        return Convection(ambient, coefficient=entry["coefficient"].number("W/(m2 K)", at_least=0))
    name = entry["correlation"].text()
    if "coefficient" in entry:
        raise entry.trouble("has both a coefficient and a correlation", "Give one of the two.")
    if name not in CORRELATIONS:
        raise entry["correlation"].trouble(f"is '{name}'; the correlations are {', '.join(CORRELATIONS)}")
    units = {"length": "m", "diameter": "m", "gap": "m", "speed": "m/s"}
    lengths = {key: entry[key].number(unit, above=0) for key, unit in units.items() if key in entry}
    for key in CORRELATION_NEEDS.get(name, ()):
        entry[key]
    fluid = entry["fluid"].text() if "fluid" in entry else "air"
    return Convection(ambient, correlation=name, fluid=fluid, **lengths)


def _read_radiation(entry: Entry) -> Radiation:
    entry.with_keys("emissivity", "ambient")
    return Radiation(entry["emissivity"].number(at_least=0, at_most=1), _kelvin(entry["ambient"]))


def _read_contact(entry: Entry, names: list[str]) -> Contact:
    entry.with_keys("parts", "conductance", "resistance", "thickness", "conductivity", "bonded", "gap")
    pair = []
    for name in entry["parts"].each(2):
        if name.text() not in names:
            raise name.trouble(f"is '{name.value}', and no part has that name; the parts are {', '.join(names)}")
        pair.append(names.index(name.value))
    if pair[0] == pair[1]:
        raise entry["parts"].trouble("names the same part twice")
    gap = entry["gap"].number("m", above=0) if "gap" in entry else None
    return Contact((pair[0], pair[1]), _read_conductance(entry), gap)


def _read_conductance(entry: Entry) -> float | None:
    """W/(m2 K), by whichever of the four ways the contact is given; None = bonded."""
    bonded = "bonded" in entry and entry["bonded"].truth()
    given = [key for key in ("conductance", "resistance", "thickness") if key in entry] + ["bonded"] * bonded
    if len(given) != 1:
        raise entry.trouble(
            f"gives {' and '.join(given) or 'no conductance'}",
            "Give exactly one of conductance, resistance, thickness with conductivity, or bonded.",
        )
    if "conductance" in entry:
        return entry["conductance"].number("W/(m2 K)", above=0)
    if "resistance" in entry:
        return 1.0 / entry["resistance"].number("m2 K/W", above=0)
    if "thickness" in entry:
        return entry["conductivity"].number("W/(m K)", above=0) / entry["thickness"].number("m", above=0)
    return None


def _read_direction(entry: Entry) -> tuple[float, float, float]:
    x, y, z = (component.number() for component in entry.each(3))
    length = float(np.linalg.norm((x, y, z)))
    if length < 1e-9:
        raise entry.trouble("is the zero vector; it must be a direction")
    return x / length, y / length, z / length


def _read_accuracy(entry: Entry) -> Accuracy:
    entry.with_keys("order", "size", "kelvin", "max_nodes")
    if "kelvin" in entry:
        raise entry["kelvin"].trouble("is given, and refinement to an error bound is not offered", "Set it to null.")
    default = Accuracy()
    return Accuracy(
        order=entry["order"].whole(at_least=1, at_most=2) if "order" in entry else default.order,
        size=entry["size"].number("m", above=0) if "size" in entry else default.size,
        max_nodes=entry["max_nodes"].whole(at_least=4, at_most=MOST_NODES)
        if "max_nodes" in entry
        else default.max_nodes,
    )


def read_surface(path: Path, parts: int, tags: int) -> Surface:
    """The surface in ``path``, its indices checked against the number of parts and tags.

    Raises Trouble of kind "case" that names the array at fault.
    """
    arrays = read_arrays(path, ("vertices", "triangles", "part", "tag"), ("face",))
    vertices = _shaped(arrays["vertices"], "vertices", (None, 3), "f")
    triangles = _shaped(arrays["triangles"], "triangles", (None, 3), "iu")
    count = len(triangles)
    part = _shaped(arrays["part"], "part", (count,), "iu")
    tag = _shaped(arrays["tag"], "tag", (count,), "iu")
    face = _shaped(arrays.get("face", np.arange(count)), "face", (count,), "iu")
    if not np.isfinite(vertices).all():
        first = int(np.flatnonzero(~np.isfinite(vertices).all(axis=1))[0])
        raise _surface_trouble(f"vertices[{first}] is not a finite position")
    if len(vertices) and max(-vertices.min(), vertices.max()) > FARTHEST:
        raise _surface_trouble(f"vertices lie farther than {FARTHEST:g} m from the origin")
    for name, values, low, high in (
        ("triangles", triangles, 0, len(vertices)),
        ("part", part, 0, parts),
        ("tag", tag, -1, tags),
        ("face", face, -(2**31), 2**31),
    ):
        if count and (values.min() < low or values.max() >= high):
            raise _surface_trouble(f"{name} holds numbers outside {low}..{high - 1}")
    if not count:
        raise _surface_trouble("it holds no triangles")
    return Surface(vertices.astype(np.float64), *(a.astype(np.int32) for a in (triangles, part, tag, face)))


def _surface_trouble(complaint: str) -> Trouble:
    return Trouble("case", f"{SURFACE_FILE}: {complaint}.", "Write the case again.")


def _shaped(array: np.ndarray, name: str, shape: tuple[int | None, ...], kinds: str) -> np.ndarray:
    if not shaped(array, shape, kinds):
        wanted = "floats" if kinds == "f" else "whole numbers"
        raise _surface_trouble(f"{name} has shape {array.shape} of {array.dtype}; it must be {wanted} of shape {shape}")
    return array


# Writing ------------------------------------------------------------------------------------------------------------


def write_case(case: Case, folder: Path) -> None:
    """Write ``case`` as a case folder; ``folder`` is made if it is not there."""
    folder.mkdir(parents=True, exist_ok=True)
    surface = case.surface
    np.savez(
        folder / SURFACE_FILE,
        vertices=surface.vertices.astype(np.float64),
        triangles=surface.triangles.astype(np.int32),
        part=surface.part.astype(np.int32),
        tag=surface.tag.astype(np.int32),
        face=surface.face.astype(np.int32),
    )
    document = {
        "format": FORMAT,
        "title": case.title,
        "parts": [_part_as_json(part) for part in case.parts],
        "tags": [{"name": tag.name, **_terms_as_json(tag)} for tag in case.tags],
        "untagged": _terms_as_json(case.untagged),
        "contacts": [_contact_as_json(contact, case.parts) for contact in case.contacts],
        "gravity": list(case.gravity),
        "time": None,
        "accuracy": _given(case.accuracy),
    }
    (folder / CASE_FILE).write_text(json.dumps(document, indent=1), "utf-8")


def _given(container: Any, without: tuple[str, ...] = ()) -> dict[str, Any]:
    """The fields of a frozen container that are set."""
    return {key: value for key, value in vars(container).items() if value is not None and key not in without}


def _part_as_json(part: Part) -> dict[str, Any]:
    heat = {"heat_density": part.heat_density} if part.heat_density else {"heat": part.heat}
    return {"name": part.name, "material": material_as_json(part.material), **heat}


def _terms_as_json(tag: Tag) -> dict[str, Any]:
    terms: dict[str, Any] = {"heat": tag.heat or None, "heat_flux": tag.heat_flux or None}
    terms["convection"] = _given(tag.convection) if tag.convection else None
    terms["radiation"] = _given(tag.radiation) if tag.radiation else None
    terms["temperature"], terms["size"] = tag.temperature, tag.size
    return {key: value for key, value in terms.items() if value is not None}


def _contact_as_json(contact: Contact, parts: tuple[Part, ...]) -> dict[str, Any]:
    crossing = {"bonded": True} if contact.conductance is None else {"conductance": contact.conductance}
    gap = {} if contact.gap is None else {"gap": contact.gap}
    return {"parts": [parts[index].name for index in contact.parts], **crossing, **gap}
