"""What Fluxface stores in a file: tags and study settings on the scene, material and heat on each part.

Temperatures are kelvin and lengths scene units, both shown in the scene's units by the host. Watts are stored as watts
in plain numbers: the host multiplies its own power fields by the square of the unit scale.
"""

from __future__ import annotations

from collections.abc import Callable

import bpy
from bpy.props import (
    BoolProperty,
    CollectionProperty,
    EnumProperty,
    FloatProperty,
    FloatVectorProperty,
    IntProperty,
    PointerProperty,
    StringProperty,
)

from . import history, materials

ROOM = 298.15

FILMS = (
    ("COEFFICIENT", "Coefficient", "A film coefficient that you give"),
    ("natural", "Still fluid, any face", "Natural convection, chosen for each face from its slope against gravity"),
    ("vertical_plate", "Still fluid, upright wall", "Natural convection on a vertical plate"),
    ("horizontal_plate", "Still fluid, level face", "Natural convection on a horizontal plate, facing up or down"),
    ("inclined_plate", "Still fluid, sloping face", "Natural convection on an inclined plate"),
    ("horizontal_cylinder", "Still fluid, level cylinder", "Natural convection around a horizontal cylinder"),
    ("sphere", "Still fluid, sphere", "Natural convection around a sphere"),
    ("fin_channel", "Still fluid, between fins", "Natural convection in vertical channels between fins"),
    ("flat_plate_flow", "Flow along a face", "Forced convection along a flat plate"),
    ("cylinder_crossflow", "Flow across a cylinder", "Forced convection across a cylinder"),
)

FLUIDS = (
    ("air", "Air", "At the pressure of the atmosphere"),
    ("water", "Water", ""),
    ("engine oil", "Engine oil", "Unused"),
)


# Who is told when a load's value or the mesh size changes: what follows them stands above what they are stored in.
load_followers: list[Callable[[bpy.types.Context], object]] = []
size_followers: list[Callable[[bpy.types.Context], object]] = []


def _tell_followers(_settings: bpy.types.PropertyGroup, context: bpy.types.Context) -> None:
    for follower in load_followers:
        follower(context)


def _tell_of_size(_settings: bpy.types.PropertyGroup, context: bpy.types.Context) -> None:
    for follower in size_followers:
        follower(context)


def _keep_name_unique(tag: TagDefinition, _context: bpy.types.Context) -> None:
    """Results are told by tag name, and 'untagged' is what they call the rest."""
    taken = {other.name for other in tag.id_data.fluxface.tags if other.uid != tag.uid} | {"untagged"}
    free = next_free_name(tag.name.strip() or "tag", taken)
    if tag.name != free:
        tag.name = free


def next_free_name(name: str, taken: set[str]) -> str:
    """``name``, or the first of name 2, name 3, ... that is not taken."""
    numbered = (f"{name} {number}" for number in range(2, len(taken) + 3))
    return name if name not in taken else next(candidate for candidate in numbered if candidate not in taken)


class Terms:
    """What a set of faces carries; the terms in use add up."""

    insulated: BoolProperty(
        name="Insulated", description="No heat crosses these faces, and that is meant: the other terms are left out"
    )  # fmt: skip
    use_heat: BoolProperty(name="Heat", description="Watts that enter through these faces, spread over their area")
    heat: FloatProperty(
        name="Heat (W)", description="Total heat into the part through all faces of the tag; negative draws heat out",
        default=1.0, step=10, precision=3, update=_tell_followers,
    )  # fmt: skip
    use_heat_flux: BoolProperty(name="Heat flux", description="Watts per square metre that enter through these faces")
    heat_flux: FloatProperty(
        name="Heat flux (W/m²)", description="Heat into the part per area; negative draws heat out",
        default=1000.0, step=1000, precision=1, update=_tell_followers,
    )  # fmt: skip
    use_convection: BoolProperty(name="Convection", description="Air or a liquid that carries heat off these faces")
    film: EnumProperty(name="Film", items=FILMS, description="Where the film coefficient comes from")
    coefficient: FloatProperty(
        name="Film coefficient (W/m²K)",
        description="Heat per area and degree. Still air 3 to 10 and moving air 10 to 100 are common practice",
        default=8.0, min=0.0, step=100, precision=2,
    )  # fmt: skip
    ambient: FloatProperty(
        name="Fluid at", description="Temperature of the air or liquid away from the part",
        default=ROOM, min=0.0, unit="TEMPERATURE", step=100, update=_tell_followers,
    )  # fmt: skip
    fluid: EnumProperty(name="Fluid", description="Fluid of the film correlation", items=FLUIDS)
    length: FloatProperty(
        name="Length", description="Height of the wall or run of the flow; 0 = measured on the tag",
        min=0.0, unit="LENGTH", precision=4,
    )  # fmt: skip
    diameter: FloatProperty(
        name="Diameter", description="0 = measured on the tag", min=0.0, unit="LENGTH", precision=4
    )  # fmt: skip
    gap: FloatProperty(
        name="Gap between fins", description="Clear distance from fin to fin", min=0.0, unit="LENGTH", precision=4
    )
    speed: FloatProperty(name="Speed (m/s)", description="Speed of the flow away from the part", min=0.0, default=1.0)
    use_radiation: BoolProperty(name="Radiation", description="Heat these faces radiate to their surroundings")
    emissivity: FloatProperty(
        name="Emissivity", description="Black 1; paint about 0.9 and bare metal 0.05 to 0.3 are common practice",
        default=0.9, min=0.0, max=1.0, subtype="FACTOR",
    )  # fmt: skip
    surroundings: FloatProperty(
        name="Surroundings at", description="Temperature of the walls that these faces see",
        default=ROOM, min=0.0, unit="TEMPERATURE", step=100,
    )  # fmt: skip
    use_temperature: BoolProperty(
        name="Held temperature", description="These faces stay at one temperature; excludes every other term"
    )
    temperature: FloatProperty(
        name="Held at", description="Temperature of these faces",
        default=ROOM, min=0.0, unit="TEMPERATURE", step=100, update=_tell_followers,
    )  # fmt: skip


def carries_heat(terms: Terms) -> bool:
    """Whether any term is in force."""
    switches = (terms.use_heat, terms.use_heat_flux, terms.use_convection, terms.use_radiation, terms.use_temperature)
    return any(switches) and not terms.insulated


class TagDefinition(Terms, bpy.types.PropertyGroup):
    """A named set of faces; faces refer to it by ``uid``, which never changes."""

    uid: IntProperty()
    name: StringProperty(name="Name", description="What these faces are", update=_keep_name_unique)
    colour: FloatVectorProperty(
        name="Colour", description="Colour that marks the tag's faces", subtype="COLOR_GAMMA", min=0.0, max=1.0
    )
    size: FloatProperty(
        name="Mesh size here", description="Mean edge length of the mesh on the tag's faces; 0 = as the part",
        min=0.0, unit="LENGTH", precision=4,
    )  # fmt: skip


class UntaggedTerms(Terms, bpy.types.PropertyGroup):
    """What every face without a tag carries."""


class TablePoint(bpy.types.PropertyGroup):
    temperature: FloatProperty(
        name="At", description="Temperature that the row is for", default=ROOM, min=0.0, unit="TEMPERATURE", step=1000
    )
    value: FloatProperty(name="Value", description="At the temperature of the row", default=1.0, precision=3)


class MaterialProperty(bpy.types.PropertyGroup):
    """One property: a number, or a table over temperature."""

    value: FloatProperty(name="Value", description="At every temperature", precision=3)
    tabulated: BoolProperty(name="Over temperature", description="Give a table over temperature in place of one number")
    points: CollectionProperty(type=TablePoint)
    active_point: IntProperty()


def _materials_to_choose(_values: MaterialValues, _context: bpy.types.Context, _typed: str) -> list[tuple[str, str]]:
    return [(name, materials.label_of(material)) for name, material in materials.at_hand().items()]


def _take_values(values: MaterialValues, _context: bpy.types.Context) -> None:
    """A name that is known brings its values along; any other names the values as they are."""
    material = materials.at_hand().get(values.name)
    if material is not None:
        materials.fill(values, material)


class MaterialValues(bpy.types.PropertyGroup):
    """conductivity: W/(m K), along three directions if ``directional``; density: kg/m³; heat_capacity: J/(kg K)."""

    name: StringProperty(
        name="Material", description="What the part is made of: search the library, or name your own",
        search=_materials_to_choose, search_options={"SORT", "SUGGESTION"}, update=_take_values,
    )  # fmt: skip
    conductivity: PointerProperty(type=MaterialProperty)
    directional: BoolProperty(
        name="Differs by direction", description="As in wood, circuit boards and printed plastics"
    )
    along_y: PointerProperty(type=MaterialProperty)
    along_z: PointerProperty(type=MaterialProperty)
    axes: PointerProperty(
        name="Along the axes of", type=bpy.types.Object,
        description="The object whose local axes are the material's; none = the part's own",
    )  # fmt: skip
    density: FloatProperty(
        name="Density (kg/m³)",
        description="Gives the mass of the part; a steady temperature does not depend on it",
        min=0.0,
        precision=1,
    )
    heat_capacity: PointerProperty(type=MaterialProperty)


def _note_run(run: KeptRun, _context: bpy.types.Context) -> None:
    history.write_note(run)


class KeptRun(bpy.types.PropertyGroup):
    """A run whose folder is kept; name: of the folder, and when it was. hottest, coldest: K. heat: W that came in."""

    folder: StringProperty(subtype="DIR_PATH")
    note: StringProperty(name="Note", description="What was changed for this run", update=_note_run)
    hottest: FloatProperty()
    coldest: FloatProperty()
    heat: FloatProperty()


class Outcome(bpy.types.PropertyGroup):
    """What the last run left: a result, and the trouble of a run that failed after it.

    folder: of the result. lost: it is not there any more. runs: those that are kept, the latest first. areas: m² of
    each tag by uid at the last run, as JSON.
    """

    folder: StringProperty(subtype="DIR_PATH")
    lost: BoolProperty()
    runs: CollectionProperty(type=KeptRun)
    active_run: IntProperty()
    areas: StringProperty()
    summary: StringProperty()
    comparison: StringProperty(description="What is told of the run that is compared with, as JSON")
    live: StringProperty(description="The summary of other loads than the run had, while they are shown")
    inputs: StringProperty()
    message: StringProperty()
    mend: StringProperty()
    faces: StringProperty()
    points: StringProperty()


class PartSettings(bpy.types.PropertyGroup):
    """On each object. What follows is kept up to date from the evaluated geometry.

    areas: of its tags by uid, in square scene units, as JSON. shape: a digest of surface and tags. body: a digest of
    the surface as it stands in metres. volume, surface, untagged: cubic and square metres. findings: what is amiss,
    and finding_faces: the faces of each, as JSON. inspected: the digest of the body that the solver found them on,
    empty when they were seen at a glance.
    """

    material: PointerProperty(type=MaterialValues)
    heat_kind: EnumProperty(
        name="Heat released in the volume",
        description="Given for the whole part, or for each cubic metre",
        items=(("TOTAL", "Total (W)", "Watts over the whole part"), ("DENSITY", "Per volume (W/m³)", "")),
    )
    heat: FloatProperty(
        name="Heat in the volume (W)", description="Released evenly in the whole part", step=10, update=_tell_followers
    )  # fmt: skip
    heat_density: FloatProperty(
        name="Heat per volume (W/m³)", description="Released evenly in the whole part", update=_tell_followers
    )
    areas: StringProperty()
    shape: StringProperty()
    body: StringProperty()
    volume: FloatProperty()
    surface: FloatProperty()
    untagged: FloatProperty()
    extent: FloatVectorProperty(description="Metres along the world's axes")
    findings: StringProperty()
    inspected: StringProperty()
    finding_faces: StringProperty()
    untagged_faces: IntProperty()
    notes: StringProperty(description="What was done to the part, a sentence a line, until it is dismissed")
    outcome: PointerProperty(type=Outcome)


class CollectionSettings(bpy.types.PropertyGroup):
    """On each collection: the outcome of the study whose parts it holds."""

    outcome: PointerProperty(type=Outcome)


CROSSINGS = (
    ("CONDUCTANCE", "Conductance", "Contact conductance that you give"),
    ("RESISTANCE", "Resistance", "Contact resistance that you give"),
    ("FILLER", "Filler", "A layer of paste, pad or glue: its thickness and conductivity"),
    ("BONDED", "Bonded", "As if the two parts were one piece"),
)


def _is_mesh(_settings: bpy.types.PropertyGroup, candidate: bpy.types.Object) -> bool:
    return candidate.type == "MESH"


class ContactSettings(bpy.types.PropertyGroup):
    """Where faces of two parts lie against each other."""

    first: PointerProperty(
        name="Part", description="One of the two parts that touch", type=bpy.types.Object, poll=_is_mesh
    )
    second: PointerProperty(name="and", description="The other of the two parts", type=bpy.types.Object, poll=_is_mesh)
    crossing: EnumProperty(name="Crossing", items=CROSSINGS, description="How heat crosses", default="FILLER")
    area: FloatProperty(description="m² over which the parts touch, found by the last search")
    conductance: FloatProperty(
        name="Conductance (W/m²K)",
        description="Heat across the contact per area and degree",
        default=5000.0,
        min=0.0,
        precision=1,
    )
    resistance: FloatProperty(
        name="Resistance (m²K/W)",
        description="Degrees across the contact per heat and area",
        default=2e-4,
        min=0.0,
        precision=6,
    )
    thickness: FloatProperty(
        name="Thickness",
        description="Of the layer of paste, pad or glue",
        default=2e-4,
        min=0.0,
        unit="LENGTH",
        precision=4,
    )
    conductivity: FloatProperty(
        name="Conductivity (W/mK)", description="Of the paste, pad or glue", default=1.0, min=0.0, precision=3
    )
    gap: FloatProperty(
        name="Widest gap", description="Faces within this distance count as touching; 0 = chosen from the parts' size",
        min=0.0, unit="LENGTH", precision=4,
    )  # fmt: skip


class StudySettings(bpy.types.PropertyGroup):
    """On the scene: its tags, which objects are the parts, and how finely to solve."""

    tags: CollectionProperty(type=TagDefinition)
    active_tag: IntProperty(
        name="Face tag", description="The tag that is shown below the list and that faces are given to"
    )
    untagged: PointerProperty(type=UntaggedTerms)
    show_tags: BoolProperty(
        name="Show on the Part", description="Draw the faces of each tag in its colour", default=True
    )  # fmt: skip
    show_untagged: BoolProperty(
        name="The Rest Too", description="Draw the faces without a tag in grey, hatched where nothing is set for them"
    )  # fmt: skip
    auto_run: BoolProperty(
        name="Run After Each Change", description="Run by itself, a moment after the last change, while work goes on"
    )  # fmt: skip
    collection: PointerProperty(
        name="Parts", type=bpy.types.Collection,
        description="Every mesh object of this collection is a part; none = the active object alone",
    )  # fmt: skip
    contacts: CollectionProperty(type=ContactSettings)
    active_contact: IntProperty()
    gravity: FloatVectorProperty(
        name="Gravity points along", subtype="XYZ", default=(0.0, 0.0, -1.0),
        description="Direction for natural convection, in world axes",
    )  # fmt: skip
    order: EnumProperty(
        name="Elements", description="How the temperature runs within each element of the mesh", default="2",
        items=(("1", "Linear", "Quick and coarse"), ("2", "Quadratic", "More accurate for the same mesh")),
    )  # fmt: skip
    size: FloatProperty(
        name="Mesh size", description="Mean edge length of the mesh inside the part; 0 = chosen by the solver",
        min=0.0, unit="LENGTH", precision=4, update=_tell_of_size,
    )  # fmt: skip
    max_nodes: IntProperty(
        name="Most nodes", description="A finer mesh than this is refused", default=2_000_000, min=4
    )  # fmt: skip


class RunState(bpy.types.PropertyGroup):
    """On the window manager, never saved: the run in progress."""

    running: BoolProperty()
    cancelled: BoolProperty()
    fraction: FloatProperty(min=0.0, max=1.0)
    text: StringProperty()


CLASSES = (
    TagDefinition,
    UntaggedTerms,
    TablePoint,
    MaterialProperty,
    MaterialValues,
    KeptRun,
    Outcome,
    PartSettings,
    CollectionSettings,
    ContactSettings,
    StudySettings,
    RunState,
)
PLACES = (
    (bpy.types.Scene, StudySettings),
    (bpy.types.Object, PartSettings),
    (bpy.types.Collection, CollectionSettings),
    (bpy.types.WindowManager, RunState),
)


def register() -> None:
    for group in CLASSES:
        bpy.utils.register_class(group)
    for place, group in PLACES:
        place.fluxface = PointerProperty(type=group)


def unregister() -> None:
    for place, _ in PLACES:
        del place.fluxface
    for group in reversed(CLASSES):
        bpy.utils.unregister_class(group)
