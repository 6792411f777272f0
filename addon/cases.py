"""From the parts' geometry and the settings of the scene to a case."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import bpy
import numpy as np

from ..solver.case import Accuracy, Case, Contact, Convection, Part, Radiation, Surface, Tag
from ..solver.errors import Trouble
from ..solver.materials import Material
from . import tags
from .materials import material_of
from .parts import Skin, check_real, check_solid, modelled, placed, world_matrix
from .properties import ContactSettings, StudySettings, TagDefinition, Terms
from .units import as_typed, metres_per_unit

# The settings that each film correlation takes besides its fluid; 0 leaves a length to be measured on the tag.
FILM_NEEDS = {
    "vertical_plate": ("length",),
    "horizontal_plate": ("length",),
    "inclined_plate": ("length",),
    "horizontal_cylinder": ("diameter",),
    "sphere": ("diameter",),
    "fin_channel": ("gap", "length"),
    "flat_plate_flow": ("speed", "length"),
    "cylinder_crossflow": ("speed", "diameter"),
}


def build_case(scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], depsgraph: bpy.types.Depsgraph) -> Case:
    """The study of ``parts`` as it stands now.

    Raises Trouble of kind "case" or "geometry" that says what the designer should change.
    """
    settings, metres = scene.fluxface, metres_per_unit(scene)
    _check_instancers(scene, parts)
    skins = _skins(scene, parts, depsgraph)
    used = _used_tags(scene, parts, skins)
    untagged = _tag(settings.untagged, "untagged", metres)
    if not used and untagged == Tag("untagged"):
        names = " and ".join(f"'{part.name}'" for part in parts)
        raise Trouble("case", f"No faces of {names} are tagged.", "Select faces in edit mode and press New Tag.")
    names = [part.name for part in parts]
    contacts = settings.contacts if settings.collection else ()
    return Case(
        surface=_joined(skins, [tag.uid for tag in used]),
        parts=tuple(_part(part) for part in parts),
        tags=tuple(_sized_tag(tag, metres) for tag in used),
        untagged=untagged,
        contacts=tuple(_contact(contact, names, metres) for contact in contacts),
        gravity=_gravity(settings),
        accuracy=accuracy(scene),
        title=names[0] if settings.collection is None else settings.collection.name,
    )


def build_shapes(scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], depsgraph: bpy.types.Depsgraph) -> Case:
    """The parts' shapes and tags alone, of a stand-in material and in air all over, to be looked at and never solved.

    Raises Trouble of kind "geometry" when a part is no body.
    """
    stand_in, air = Material("stand-in", (1.0,)), Convection(ambient=300.0, coefficient=1.0)
    skins = _skins(scene, parts, depsgraph)
    present = set(np.unique(np.concatenate([surface.uid for surface in skins])).tolist()) - {0}
    names = {tag.uid: tag.name for tag in scene.fluxface.tags}
    return Case(
        surface=_joined(skins, sorted(present)),
        parts=tuple(Part(part.name, stand_in) for part in parts),
        tags=tuple(Tag(names.get(uid, f"tag {uid}"), convection=air) for uid in sorted(present)),
        untagged=Tag("untagged", convection=air),
    )


def _check_instancers(scene: bpy.types.Scene, parts: Sequence[bpy.types.Object]) -> None:
    """Find that nothing in the study shows copies of objects, which would be seen and not solved."""
    collection = scene.fluxface.collection
    for thing in parts if collection is None else collection.all_objects:
        if thing.instance_type != "NONE":
            raise Trouble(
                "case",
                f"'{thing.name}' shows instances, which are not solved.",
                "Make them real (Object, Apply, Make Instances Real), or take it out of the collection of the parts.",
            )


def _skins(scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], depsgraph: bpy.types.Depsgraph) -> list[Skin]:
    metres = metres_per_unit(scene)
    for part in parts:
        check_real(part, depsgraph)
    skins = [placed(modelled(part, depsgraph), world_matrix(part), metres) for part in parts]
    for part, surface in zip(parts, skins, strict=True):
        check_solid(part, surface)
    return skins


def _used_tags(scene: bpy.types.Scene, parts: Sequence[bpy.types.Object], skins: Sequence[Skin]) -> list[TagDefinition]:
    """The tags on the parts, in the scene's order."""
    present = set(np.unique(np.concatenate([surface.uid for surface in skins])).tolist()) - {0}
    used = [tag for tag in scene.fluxface.tags if tag.uid in present]
    if len(used) < len(present):
        raise Trouble(
            "case",
            "Some faces carry a tag that this scene does not know.",
            "Give those faces to a tag again, or take them out of all tags.",
        )
    others = [thing for thing in scene.objects if thing.type == "MESH" and thing not in list(parts)]
    elsewhere = set(np.concatenate([[0], *(np.unique(tags.read(mesh)) for mesh in {t.data for t in others})]).tolist())
    for tag in scene.fluxface.tags:
        if tag.uid not in present and tag.uid not in elsewhere:
            modelled = any((tags.read(part.data) == tag.uid).any() for part in parts)
            raise Trouble(
                "case",
                f"The tag '{tag.name}' has no faces" + (" left after the modifiers." if modelled else "."),
                "Give it the faces it is meant for, or delete it.",
            )
    return used


def _joined(skins: Sequence[Skin], uids: Sequence[int]) -> Surface:
    starts = np.cumsum([0, *(len(surface.vertices) for surface in skins)])
    index_of_uid = {uid: index for index, uid in enumerate(uids)} | {0: -1}
    known, inverse = np.unique(np.concatenate([surface.uid for surface in skins]), return_inverse=True)
    return Surface(
        vertices=np.concatenate([surface.vertices for surface in skins]),
        triangles=np.concatenate([surface.triangles + start for surface, start in zip(skins, starts, strict=False)]),
        part=np.repeat(np.arange(len(skins), dtype=np.int32), [len(surface.triangles) for surface in skins]),
        tag=np.array([index_of_uid[uid] for uid in known.tolist()], np.int32)[inverse.ravel()],
        face=np.concatenate([surface.face for surface in skins]),
    )


def _part(part: bpy.types.Object) -> Part:
    settings = part.fluxface
    total = settings.heat_kind == "TOTAL"
    return Part(
        name=part.name,
        material=material_of(part),
        heat=as_typed(settings.heat) if total else 0.0,
        heat_density=0.0 if total else as_typed(settings.heat_density),
    )


def _sized_tag(tag: TagDefinition, metres: float) -> Tag:
    return replace(_tag(tag, tag.name, metres), size=as_typed(tag.size) * metres or None)


def _tag(terms: Terms, name: str, metres: float) -> Tag:
    """Raises Trouble when the terms exclude each other or lack something."""
    if terms.insulated:
        return as_tag(terms, name, metres)
    others = [
        words
        for words, used in (
            ("heat", terms.use_heat),
            ("a heat flux", terms.use_heat_flux),
            ("convection", terms.use_convection),
            ("radiation", terms.use_radiation),
        )
        if used
    ]
    if terms.use_temperature and others:
        raise Trouble(
            "case",
            f"The tag '{name}' holds a temperature and also carries {' and '.join(others)}.",
            "A held temperature excludes every other term: switch off one or the other.",
        )
    needed = FILM_NEEDS.get(terms.film, ()) if terms.use_convection else ()
    for key, what in (("gap", "the gap between its fins"), ("speed", "the speed of its flow")):
        if key in needed and not getattr(terms, key):
            raise Trouble("case", f"The tag '{name}' lacks {what}.", "Give it, or choose another film.")
    return as_tag(terms, name, metres)


def as_tag(terms: Terms, name: str, metres: float) -> Tag:
    """The terms that are switched on, whether or not they go together; none where it is meant to be insulated."""
    if terms.insulated:
        return Tag(name=name)
    return Tag(
        name=name,
        heat=as_typed(terms.heat) if terms.use_heat else 0.0,
        heat_flux=as_typed(terms.heat_flux) if terms.use_heat_flux else 0.0,
        convection=_convection(terms, metres) if terms.use_convection else None,
        radiation=Radiation(as_typed(terms.emissivity), as_typed(terms.surroundings)) if terms.use_radiation else None,
        temperature=as_typed(terms.temperature) if terms.use_temperature else None,
    )


def _convection(terms: Terms, metres: float) -> Convection:
    ambient = as_typed(terms.ambient)
    if terms.film == "COEFFICIENT":
        return Convection(ambient, coefficient=as_typed(terms.coefficient))
    given = {
        key: as_typed(getattr(terms, key)) * (1.0 if key == "speed" else metres) or None
        for key in FILM_NEEDS.get(terms.film, ())
    }
    return Convection(ambient, correlation=terms.film, fluid=terms.fluid, **given)


def _contact(contact: ContactSettings, names: Sequence[str], metres: float) -> Contact:
    pair = [side.name if side else "" for side in (contact.first, contact.second)]
    label = " and ".join(f"'{name}'" if name else "no part" for name in pair)
    if pair[0] == pair[1] or any(name not in names for name in pair):
        raise Trouble(
            "case", f"The contact between {label} does not name two different parts.", "Choose its parts or remove it."
        )
    crossing = {
        "CONDUCTANCE": lambda: as_typed(contact.conductance),
        "RESISTANCE": lambda: 1.0 / as_typed(contact.resistance),
        "FILLER": lambda: as_typed(contact.conductivity) / (as_typed(contact.thickness) * metres),
        "BONDED": lambda: None,
    }[contact.crossing]
    try:
        conductance = crossing()
    except ZeroDivisionError:
        conductance = 0.0
    if conductance == 0.0:
        raise Trouble(
            "case",
            f"The contact between {label} has a value of zero.",
            "Give it a value greater than zero, or make it bonded.",
        )
    return Contact((names.index(pair[0]), names.index(pair[1])), conductance, as_typed(contact.gap) * metres or None)


def accuracy(scene: bpy.types.Scene) -> Accuracy:
    settings = scene.fluxface
    return Accuracy(int(settings.order), as_typed(settings.size) * metres_per_unit(scene) or None, settings.max_nodes)


def _gravity(settings: StudySettings) -> tuple[float, float, float]:
    x, y, z = (as_typed(component) for component in settings.gravity)
    length = float(np.linalg.norm((x, y, z)))
    if length == 0.0:
        raise Trouble("case", "Gravity has no direction.", "Give it one under Study.")
    return x / length, y / length, z / length
