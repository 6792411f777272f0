"""What the panels show of each state of the work."""

from __future__ import annotations

import json
from types import SimpleNamespace

import pytest

bpy = pytest.importorskip("bpy")

from drawn_panels import PREFERENCES, Page, drawn  # noqa: E402
from fluxface.addon import materials, running, study, upkeep, view, words  # noqa: E402
from fluxface.addon import tags as face_tags  # noqa: E402
from fluxface.addon.panels import contacts, history, part, run, shape, sidebar, tags  # noqa: E402
from fluxface.addon.panels import study as study_panels  # noqa: E402
from fluxface.solver.case import CORRELATIONS  # noqa: E402
from fluxface.solver.physics.fluids import FLUIDS  # noqa: E402
from modelled import block, lamp, side, tag  # noqa: E402


def test_an_empty_scene_says_what_to_do(scene):
    told = drawn(scene).replace("\n", " ")
    assert "Click the part to make it the active object." in told
    assert "(Run)" in told


def test_a_part_without_tags_says_what_to_do(scene):
    block()
    told = drawn(scene)
    assert "Part: block" in told
    assert "Not run yet" in told


def test_tags_show_their_area_and_what_they_carry(scene):
    part = lamp(scene)
    bpy.ops.fluxface.tag_select()
    bpy.ops.object.mode_set(mode="OBJECT")
    study_panels.study.restore_tags(scene)
    upkeep.refresh()
    told = drawn(scene, tags.TagsPanel)
    assert "12 W" in told
    assert "8 W/m²K to 25 °C" in told
    assert "48 cm²" in told
    assert "104 cm²" in told
    assert part is not None


def test_every_term_and_every_film_can_be_drawn(scene):
    lamp(scene)
    skin = scene.fluxface.tags["skin"]
    skin.use_heat = skin.use_heat_flux = skin.use_radiation = skin.use_temperature = True
    assert "A held temperature excludes" in drawn(scene, tags.TagsPanel)
    for item in skin.bl_rna.properties["film"].enum_items:
        skin.film = item.identifier
        assert "[Fluid at]" in drawn(scene, tags.TagsPanel)
    assert "aluminium 6061-T6, " in drawn(scene, tags.TagsPanel)


def test_materials_of_every_kind_can_be_drawn(scene):
    part_ = block()
    for name in materials.library():
        part_.fluxface.material.name = name
        assert "Conductivity" in (told := drawn(scene, part.MaterialPanel)) or "Along x" in told
        assert drawn(scene, part.MaterialDetailsPanel).strip()
    part_.fluxface.material.conductivity.tabulated = False
    part_.fluxface.material.conductivity.value = -1.0
    assert "must be greater than" in drawn(scene, part.MaterialPanel)


def test_every_library_material_stands_in_a_menu(scene):
    block()
    told = drawn(scene, part.MaterialPanel)
    assert all(f"({name}   " in told for name in materials.library())
    assert "(Woods)" in told


def test_a_run_shows_progress_and_how_to_cancel(scene):
    lamp(scene)
    state = bpy.context.window_manager.fluxface
    state.running, state.fraction, state.text = True, 0.5, "step 2"
    told = drawn(scene, run.RunPanel)
    state.running = False
    assert "50 % step 2" in told
    assert "(Cancel)" in told
    assert "(Run)" not in told


def test_trouble_is_shown_whole_and_goes_when_a_run_succeeds(scene):
    lamp(scene)
    scene.fluxface.tags["skin"].use_convection = False
    with pytest.raises(RuntimeError):
        bpy.ops.fluxface.run()
    told = drawn(scene, run.RunPanel).replace("\n", " ")
    assert "Nothing carries heat away from 'lamp', so its temperature is undetermined." in told
    scene.fluxface.tags["skin"].use_convection = True
    bpy.ops.fluxface.run()
    assert "Nothing carries" not in drawn(scene, run.RunPanel)


def test_the_result_is_told_in_the_scenes_units_with_its_cautions(scene):
    part_ = lamp(scene)
    scene.fluxface.tags["skin"].use_radiation = True
    bpy.ops.fluxface.run()
    told = drawn(scene)
    summary = study.summary(study.outcome(scene, [part_]))
    assert f"{summary['hottest']['temperature'] - 273.15:.1f} °C" in told
    assert "12 W in" in told
    assert "12 W out" in told
    assert "The result is current" in told
    joined = told.replace("\n", " ")
    assert "leaves through skin (convection" in joined
    assert all(caution in joined for caution in words.CAUTIONS)
    scene.unit_settings.temperature_unit = "KELVIN"
    assert f"{summary['hottest']['temperature']:.1f} K" in drawn(scene)
    scene.fluxface.tags["pad"].heat = 20.0
    assert "Changed since the last run" in drawn(scene)


def test_contacts_are_listed_with_how_heat_crosses(scene):
    scene.fluxface.collection = bpy.data.collections.new("assembly")
    first, second = block("chip"), block("sink")
    bpy.ops.fluxface.contact_add()
    contact = scene.fluxface.contacts[0]
    contact.first, contact.second = first, second
    for item in contact.bl_rna.properties["crossing"].enum_items:
        contact.crossing = item.identifier
        told = drawn(scene, contacts.ContactsPanel)
        assert "chip / sink" in told
        assert words.crossing(scene, contact) in told
    bpy.ops.fluxface.contact_remove()
    assert "until a contact says how" in drawn(scene, contacts.ContactsPanel).replace("\n", " ")


def test_what_is_left_out_of_a_collection_is_told(scene):
    parts = bpy.data.collections.new("parts")
    parts.objects.link(lamp(scene))
    scene.fluxface.collection = parts
    assert "Left out" not in drawn(scene, study_panels.StudyPanel)
    parts.objects.link(bpy.data.objects.new("badge", bpy.data.curves.new("badge", "FONT")))
    told = drawn(scene, study_panels.StudyPanel).replace("\n", " ")
    assert "Left out, as no meshes: badge." in told and "Part: lamp" in told


def test_no_line_is_longer_than_the_sidebar(scene):
    context = SimpleNamespace(region=SimpleNamespace(width=280), preferences=PREFERENCES)
    page = Page(context, [])
    sidebar.paragraph(context, page, "word " * 50, "INFO")
    assert len(page.lines) > 5
    assert max(map(len, page.lines)) * sidebar.LETTER <= 280


def test_what_a_tag_carries(scene):
    part_ = block()
    fins = tag(scene, part_, "fins", side(part_, "+z"))
    assert words.carries(scene, fins) == ""
    fins.use_temperature, fins.temperature = True, 313.15
    assert words.carries(scene, fins) == "held at 40 °C"
    fins.use_temperature = False
    fins.use_heat, fins.heat = True, -0.25
    assert words.carries(scene, fins) == "−250 mW"
    fins.use_convection = fins.use_radiation = True
    assert words.carries(scene, fins) == "−250 mW, 8 W/m²K, ε 0.9 to 25 °C"
    fins.film, fins.surroundings = "natural", 283.15
    assert words.carries(scene, fins) == "−250 mW, still air to 25 °C, ε 0.9 to 10 °C"


def test_films_and_fluids_are_those_of_the_solver(scene):
    offered = scene.fluxface.untagged.bl_rna.properties
    films = {item.identifier for item in offered["film"].enum_items}
    assert films == {"COEFFICIENT", *CORRELATIONS}
    assert {item.identifier for item in offered["fluid"].enum_items} == set(FLUIDS)


@pytest.mark.parametrize(("watts", "text"), [(12.0, "12 W in"), (-3.0, "3 W out"), (0.0, "0 W"), (-1e-13, "0 W")])
def test_the_direction_of_heat_is_in_words(watts, text):
    assert words.heat_through(watts) == text


def test_progress_counts_all_stages():
    from fluxface.addon.jobs import Progress

    assert running.told(Progress("solve", 0.5, "step 2")) == ("step 2", 0.625)


def test_the_result_of_another_part_is_not_shown(scene):
    lamp(scene)
    bpy.ops.fluxface.run()
    block("other", at=(1, 0, 0))
    assert "Hottest" not in drawn(scene)
    assert view.has_result(bpy.data.objects["lamp"])


def test_what_is_amiss_with_the_shape_and_the_tags_is_told(scene):
    part_ = lamp(scene)
    bpy.ops.fluxface.run()
    view.settings_of(scene).showing = "PART"
    finding = {"message": "It is open.", "mend": "Fill it.", "severity": "error", "faces": [1], "points": []}
    part_.fluxface.findings = json.dumps([finding])
    part_.fluxface.inspected = part_.fluxface.body
    told = drawn(scene, shape.ShapePanel)
    assert "It is open.\nFill it.\n(Show It)\n(Mend This Mesh)" in told
    assert "80 mm × 60 mm × 20 mm" in told
    assert "96 cm³" in told
    part_.fluxface.inspected = ""
    assert "being looked at" in drawn(scene, shape.ShapePanel).lower()
    face_tags.give(part_.data, side(part_, "-z"), 0)
    upkeep.refresh()
    assert "'pad' has no faces any more" in drawn(scene, tags.TagsPanel).replace("\n", " ")
    assert "(Select Untagged Faces)" in drawn(scene, tags.UntaggedPanel)


def test_kept_runs_are_listed(scene):
    part_ = lamp(scene)
    bpy.ops.fluxface.run()
    told = drawn(scene, history.RunsPanel)
    assert "12 W" in told
    part_.fluxface.outcome.lost = True
    assert "not where it was" in drawn(scene, history.RunsPanel).replace("\n", " ")
