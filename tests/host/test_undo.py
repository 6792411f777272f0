"""Undo: whatever is tagged, edited, undone and redone, the tags are those of the steps that stand.

A sequence drawn at random is done with undo and redo among its steps; then the steps that stand are done once more from
the beginning, without any, and the faces must be in the same tags.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

import bmesh  # noqa: E402
from fluxface.addon import tags, upkeep  # noqa: E402
from modelled import block  # noqa: E402

STEPS = 20
FACES = 4000  # an edit that would leave more is left out


@dataclass(frozen=True)
class Step:
    """What is done, and the numbers that its choices are made with; the same choices each time it is done."""

    act: str
    number: int
    draws: tuple[int, ...]


def part() -> bpy.types.Object:
    """Undo makes the host's objects anew."""
    return bpy.data.objects["block"]


def names() -> list[str]:
    """Each face's tag by name, '' without and '?' where the scene does not know it."""
    known = {tag.uid: tag.name for tag in bpy.context.scene.fluxface.tags} | {0: ""}
    return [known.get(uid, "?") for uid in tags.read(part().data).tolist()]


def choose_tag(draw: int) -> str:
    """Make one of the tags that have faces the active one; without any, nothing."""
    found = sorted(set(names()) - {""})
    if not found:
        return ""
    name = found[draw % len(found)]
    bpy.context.scene.fluxface.active_tag = bpy.context.scene.fluxface.tags.find(name)
    return name


def places() -> list[tuple[int, int, int]]:
    """The middle of each face, in hundredths of a millimetre: the order of faces in edit mode is the host's own."""
    if part().mode == "EDIT":
        # Not by way of the mesh: to bring it up to date unasked confuses the host's undo.
        faces = bmesh.from_edit_mesh(part().data).faces
        centres = np.array([face.calc_center_median() for face in faces], np.float32).reshape(-1, 3)
    else:
        centres = np.empty((len(part().data.polygons), 3), np.float32)
        part().data.polygons.foreach_get("center", centres.ravel())
    return [tuple(centre) for centre in np.round(1e5 * centres).astype(int).tolist()]


def choose_faces(seed: int) -> None:
    """Select some four in ten, by where they are."""
    mesh = part().data
    chosen = np.array([hash((seed, *place)) % 10 < 4 for place in places()])
    if mesh.is_editmode:
        bpy.context.tool_settings.mesh_select_mode = (False, False, True)
        bpy.ops.mesh.select_all(action="DESELECT")
        tags.select(mesh, chosen)
    else:
        mesh.polygons.foreach_set("select", chosen)


def done(operator: Callable, **settings) -> bool:
    """Call an operator with its undo step, as a press of its button would."""
    return operator("EXEC_DEFAULT", True, **settings) == {"FINISHED"}


def do_new(step: Step) -> bool:
    choose_faces(step.draws[0])
    return tags.selected(part().data).any() and done(bpy.ops.fluxface.tag_new, name=f"tag {step.number}")


def do_give(step: Step) -> bool:
    choose_faces(step.draws[0])
    possible = tags.selected(part().data).any() and bool(choose_tag(step.draws[1]))
    return possible and done(bpy.ops.fluxface.tag_give)


def do_take(step: Step) -> bool:
    choose_faces(step.draws[0])
    return tags.selected(part().data).any() and done(bpy.ops.fluxface.tag_take)


def do_move(step: Step) -> bool:
    other, own = choose_tag(step.draws[0]), choose_tag(step.draws[1])
    return own != other and done(bpy.ops.fluxface.tag_move, to=other)


def do_delete(step: Step) -> bool:
    return bool(choose_tag(step.draws[0])) and done(bpy.ops.fluxface.tag_delete)


def do_mode(_step: Step) -> bool:
    return done(bpy.ops.object.mode_set, mode="OBJECT" if part().mode == "EDIT" else "EDIT")


def do_edit(step: Step) -> bool:
    if part().mode != "EDIT" or len(tags.read(part().data)) > FACES // 4:
        return False
    choose_faces(step.draws[0])
    edits = (
        (bpy.ops.mesh.subdivide, {}),
        (bpy.ops.mesh.inset, {"thickness": 0.001}),
        (bpy.ops.mesh.extrude_region_move, {"TRANSFORM_OT_translate": {"value": (0.0, 0.0, 0.01)}}),
        (bpy.ops.mesh.delete, {"type": "FACE"}),
    )
    operator, settings = edits[step.draws[1] % len(edits)]
    return tags.selected(part().data).any() and done(operator, **settings)


def do_remesh(step: Step) -> bool:
    if part().mode == "EDIT" or len(part().data.polygons) < 6:
        return False
    part().data.remesh_voxel_size = 0.008 + 0.001 * (step.draws[0] % 3)
    return done(bpy.ops.object.voxel_remesh)


ACTS = {
    "new": do_new, "give": do_give, "take": do_take, "move": do_move, "delete": do_delete, "mode": do_mode,
    "edit": do_edit, "remesh": do_remesh,
}  # fmt: skip


def begin() -> None:
    bpy.ops.wm.read_factory_settings(use_empty=True)
    block()
    bpy.ops.ed.undo_push(message="beginning")
    upkeep.refresh()


def do(step: Step) -> bool:
    """Whether it was possible; then what a window does once things are quiet."""
    if not len(tags.read(part().data)):
        return False
    possible = ACTS[step.act](step)
    upkeep.refresh()
    return possible


@dataclass
class Story:
    """Steps that stand and those undone, and what was done in a row, for the message of a failure."""

    stand: list[Step] = field(default_factory=list)
    undone: list[Step] = field(default_factory=list)
    told: list[str] = field(default_factory=list)

    def go_on(self, act: str, number: int, draws: Sequence[int]) -> None:
        self.told.append(f"{act} {number}")
        if act == "undo" and self.stand:
            assert bpy.ops.ed.undo() == {"FINISHED"}
            upkeep.refresh()
            self.undone.append(self.stand.pop())
        elif act == "redo" and self.undone:
            assert bpy.ops.ed.redo() == {"FINISHED"}
            upkeep.refresh()
            self.stand.append(self.undone.pop())
        elif act in ACTS and do(step := Step(act, number, tuple(draws))):
            self.stand.append(step)
            self.undone.clear()


def told_at_random(seed: int, acts: Sequence[str]) -> Story:
    rng, story = np.random.default_rng(seed), Story()
    for number in range(STEPS):
        act = acts[rng.integers(len(acts))]
        story.go_on(act, number, rng.integers(0, 2**31, 2).tolist())
        assert "?" not in names(), story.told
    return story


# Some at random, and four in which a deletion in edit mode is undone.
@pytest.mark.parametrize("seed", (0, 1, 2, 3, 22, 34, 37, 56))
@pytest.mark.parametrize(
    "acts",
    [
        ("new", "give", "take", "move", "delete", "remesh", "undo", "undo", "redo"),
        ("new", "give", "take", "move", "delete", "mode", "edit", "edit", "undo", "undo", "redo"),
    ],
    ids=["object mode", "both modes"],
)
def test_tags_are_those_of_the_steps_that_stand(scene, acts, seed):
    begin()
    story = told_at_random(seed, acts)
    left = sorted(zip(places(), names(), strict=True))
    begin()
    assert all(do(step) for step in story.stand)
    assert sorted(zip(places(), names(), strict=True)) == left, story.told


def test_a_deletion_undone_in_edit_mode_brings_back_what_the_tag_carried(scene):
    begin()
    choose_faces(3)
    assert done(bpy.ops.fluxface.tag_new, name="lid")
    faces = names()
    lid = bpy.context.scene.fluxface.tags["lid"]
    lid.use_heat, lid.heat = True, 7.5
    bpy.ops.ed.undo_push(message="heat")
    assert done(bpy.ops.object.mode_set, mode="EDIT")
    assert done(bpy.ops.fluxface.tag_delete)
    assert bpy.ops.ed.undo() == {"FINISHED"}
    upkeep.refresh()
    assert names() == faces
    assert bpy.context.scene.fluxface.tags["lid"].heat == 7.5


def test_growing_a_selection_in_edit_mode_leaves_undo_as_it_was(scene):
    """What brings a mesh up to date from edit mode unasked makes the host take the edit for undone already."""
    begin()
    before = sorted(places())
    assert done(bpy.ops.object.mode_set, mode="EDIT")
    bpy.ops.mesh.select_all(action="SELECT")
    assert done(bpy.ops.mesh.subdivide)
    assert done(bpy.ops.fluxface.select_flat)
    for _ in range(3):
        assert bpy.ops.ed.undo() == {"FINISHED"}
    assert part().mode == "OBJECT"
    assert sorted(places()) == before
