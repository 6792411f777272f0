"""The habits of the host: what every operator, panel and property owes to whoever meets it, and to other languages."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

bpy = pytest.importorskip("bpy")

from drawn_panels import drawn  # noqa: E402
from fluxface.addon import language, words  # noqa: E402
from fluxface.addon.panels import menu  # noqa: E402
from modelled import block, lamp, select, side, tag  # noqa: E402

# What needs no undo step of its own, and why.
WITHOUT_UNDO = {
    "fluxface.run": "makes its step when the job beside has ended",
    "fluxface.mend": "makes its step when the job beside has ended",
    "fluxface.contacts_find": "makes its step when the job beside has ended",
    "fluxface.cancel": "changes no data",
    "fluxface.render_picture": "writes a file",
    "fluxface.render_turntable": "writes pictures",
    "fluxface.render_views": "writes pictures",
    "fluxface.write_report": "writes a file",
    "fluxface.material_keep": "writes to the user's own library",
    "fluxface.run_forget": "deletes a folder from the disk, which no undo brings back",
    "fluxface.run_folder": "opens a folder",
    "fluxface.run_log": "opens a text",
}


def ours(base: type) -> list[type]:
    """The registered classes of a kind that the add-on defines."""
    found = (getattr(bpy.types, name) for name in dir(bpy.types))
    return [kind for kind in found if isinstance(kind, type) and issubclass(kind, base) and _is_ours(kind)]


def _is_ours(kind: type) -> bool:
    return kind.__module__.startswith("fluxface.")


def operators() -> dict[str, type]:
    return {kind.bl_rna.identifier.replace("_OT_", ".").lower(): kind for kind in ours(bpy.types.Operator)}


def test_every_operator_has_a_tooltip(scene):
    assert len(operators()) >= 25
    for name, kind in operators().items():
        assert hasattr(kind, "description") or getattr(kind, "bl_description", ""), name
        assert not getattr(kind, "bl_description", "").endswith("."), f"{name}: the host adds the full stop"


def test_what_changes_data_can_be_undone(scene):
    without = {name for name, kind in operators().items() if "UNDO" not in getattr(kind, "bl_options", set())}
    assert without == set(WITHOUT_UNDO)


def test_panels_and_menus_have_names_and_their_place(scene):
    assert len(ours(bpy.types.Panel)) >= 15
    for panel in ours(bpy.types.Panel):
        assert panel.bl_label
        assert panel.bl_category == "Fluxface"
    assert all(menu.bl_label for menu in ours(bpy.types.Menu))


# What acts on one row of a list or one value, and stands beside it alone.
OF_A_ROW = {
    "areas_accept", "contact_remove", "emissivity_use", "finding_show", "material_choose", "notes_dismiss",
    "preset_use", "probe_remove", "run_forget", "show_place", "table_row_add", "table_row_remove", "turn_cut",
}  # fmt: skip


def test_every_command_stands_in_the_menu_that_the_hosts_search_reads(scene):
    listed = [name for group in menu.COMMANDS for name in group]
    assert len(listed) == len(set(listed))
    assert {f"fluxface.{name}" for name in {*listed, *OF_A_ROW}} == set(operators())
    for host_menu in (bpy.types.VIEW3D_MT_object, bpy.types.VIEW3D_MT_edit_mesh):
        assert menu.offer in host_menu.draw._draw_funcs


def groups_below(group: bpy.types.Struct) -> dict[str, bpy.types.Struct]:
    """A group of properties and the add-on's others that it holds."""
    found = {group.identifier: group}
    for item in group.properties:
        if item.type in ("POINTER", "COLLECTION") and item.fixed_type.base == bpy.types.PropertyGroup.bl_rna:
            found |= groups_below(item.fixed_type)
    return found


def shown_properties(scene) -> Iterator[tuple[str, bpy.types.Property]]:
    """Those with a name: what is only kept has none."""
    owners = (scene, block(), bpy.data.collections.new("parts"), bpy.context.window_manager)
    groups = groups_below(scene.fluxface_view.bl_rna)
    for owner in owners:
        groups |= groups_below(owner.fluxface.bl_rna)
    called = {name: getattr(bpy.ops.fluxface, name.partition(".")[2]).get_rna_type() for name in operators()}
    for kind, struct in (groups | called).items():
        for item in struct.properties:
            if item.is_runtime and item.name not in ("", item.identifier) and not item.is_hidden:
                yield f"{kind}.{item.identifier}", item


def test_every_property_that_is_shown_is_explained(scene):
    found = dict(shown_properties(scene))
    assert len(found) >= 50
    unexplained = [name for name, item in found.items() if not item.description]
    assert unexplained == [], " ".join(unexplained)


def stage_empty(_scene) -> None:
    pass


def stage_bare_part(_scene) -> None:
    block()


def stage_tagged(scene) -> None:
    lamp(scene)


def stage_edited(scene) -> None:
    part = block()
    tag(scene, part, "lid", side(part, "+z"))
    select(part, side(part, "+z"))


def stage_running(scene) -> None:
    lamp(scene)
    bpy.context.window_manager.fluxface.running = True


def stage_sculpted(scene) -> None:
    """Neither object nor edit mode."""
    lamp(scene)
    bpy.ops.object.mode_set(mode="SCULPT")


STAGES = (stage_empty, stage_bare_part, stage_tagged, stage_edited, stage_running, stage_sculpted)


@pytest.mark.parametrize("stage", STAGES)
def test_every_refusal_has_a_reason(scene, stage, monkeypatch):
    stage(scene)
    refused = 0
    for name, kind in operators().items():
        if not hasattr(kind, "poll"):
            continue
        reasons: list[str] = []
        monkeypatch.setattr(kind, "poll_message_set", reasons.append, raising=False)
        if not kind.poll(bpy.context):
            refused += 1
            assert reasons and reasons[-1].strip(), f"{name} is greyed out and does not say why"
            assert not reasons[-1].endswith("."), f"{name}: the host adds the full stop"
    bpy.context.window_manager.fluxface.running = False
    assert refused


# A language that nobody speaks.
TONGUE = {
    "Part: {name}": "Pars {name} est",
    "Part: {names}": "Pars {names} est",
    "nothing set: insulated": "nihil positum",
    "{film} to {ambient}": "ad {ambient} per {film}",
    "Faces without a tag: {carried}.": "Ceterae facies: {carried}.",
    "Choose what '{name}' is made of.": "Elige materiam rei '{name}'.",
    "Every face is in a tag": "Omnes facies notatae sunt",
    "Not run yet": "Nondum computatum",
    "No faces are selected.": "Nullae facies lectae sunt.",
    "Select faces in edit mode.": "Elige facies.",
    "'{name}' is the active tag: {carried}.": "Nota '{name}' nunc valet: {carried}.",
    "There is no other tag '{name}'.": "Nota '{name}' non est.",
    "Choose one of the scene's tags.": "Elige aliam.",
}


@pytest.fixture
def tongue(monkeypatch) -> None:
    """The bpy module is built without translations, so that they are put in its place here."""
    for name in ("pgettext_iface", "pgettext_rpt"):
        monkeypatch.setattr(language, name, lambda text: TONGUE.get(text, text))


def test_panels_speak_another_language(scene, tongue):
    part = lamp(scene)
    tag(scene, part, "empty", side(part))
    part.fluxface.material.name = ""
    told = drawn(scene).replace("\n", " ")
    for sentence in (
        "Pars lamp est", "nihil positum", "ad 25 °C per 8 W/m²K", "Ceterae facies: nihil positum.",
        "Elige materiam rei 'lamp'.", "Nondum computatum",
    ):  # fmt: skip
        assert sentence in told
    assert "nothing set" not in told


def test_reports_speak_another_language(scene, tongue):
    part = lamp(scene)
    select(part, side(part))
    with pytest.raises(RuntimeError, match=r"Nullae facies lectae sunt\. Elige facies\."):
        bpy.ops.fluxface.tag_new()
    with pytest.raises(RuntimeError, match=r"Nota 'rim' non est\. Elige aliam\."):
        bpy.ops.fluxface.tag_move(to="rim")


def test_what_is_composed_may_hold_braces(scene):
    part = block("a{b}")
    lid = tag(scene, part, "{lid}", side(part, "+z"))
    assert "Choose what 'a{b}' is made of." not in drawn(scene)
    part.fluxface.material.name = ""
    assert "Choose what 'a{b}' is made of." in drawn(scene).replace("\n", " ")
    assert words.carries_or_not(scene, lid) == "nothing set: insulated"
    bpy.ops.fluxface.tag_pick(uid=lid.uid)
