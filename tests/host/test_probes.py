"""Temperatures read at a place: by probes that stay, and along a line of sight; on a field that is known."""

from __future__ import annotations

import numpy as np
import pytest

bpy = pytest.importorskip("bpy")

from fluxface.addon import probes, view  # noqa: E402
from fluxface.addon.panels.probes import told  # noqa: E402
from mathutils import Vector  # noqa: E402
from modelled import COLD, HOT, ready, wall  # noqa: E402


@pytest.fixture(name="turned")
def solved_wall(scene) -> bpy.types.Object:
    """Turned and moved."""
    part = wall("x", at=(2.0, -1.0, 0.5))
    part.rotation_euler = (0.3, 0.2, 0.5)
    bpy.context.view_layer.update()
    assert bpy.ops.fluxface.run() == {"FINISHED"}
    return part


def world(part: bpy.types.Object, *share: float) -> Vector:
    """A place by its shares of the block's size, -0.5 to 0.5."""
    return part.matrix_world @ Vector(np.multiply(share, (0.08, 0.06, 0.02)).tolist())


def test_a_probe_reads_where_it_stands_and_goes_through_runs(scene, turned):
    probe = probes.put(turned, world(turned, 0.25, 0.1, 0.5), "above the coil")
    off = probes.put(turned, world(turned, 0.0, 0.0, 3.0))
    assert probes.reading(probe) == pytest.approx(337.5, abs=1e-2) and probes.reading(off) is None
    assert (told(scene, probe), told(scene, off)) == ("64.3 °C", "off the surface")
    scene.fluxface.tags[0].temperature = HOT + 10.0
    turned.location.x += 1.0
    bpy.context.view_layer.update()
    bpy.ops.fluxface.run()
    assert probes.reading(probe) == pytest.approx(345.0, abs=1e-2)
    assert probes.change(probe) == pytest.approx(7.5, abs=1e-2) and told(scene, probe) == "71.8 °C (+7.5 °C)"
    ready()
    scene.fluxface.tags[0].temperature = HOT + 30.0  # dragged, not run
    assert probes.reading(probe) == pytest.approx(360.0, abs=1e-2)
    assert bpy.ops.fluxface.probe_remove(name="above the coil") == {"FINISHED"}
    assert probes.probes([turned]) == [off]


def test_a_probe_is_put_at_the_cursor_and_kept_in_the_file(scene, turned, tmp_path):
    scene.cursor.location = world(turned, -0.5, 0.0, 0.0)
    assert bpy.ops.fluxface.probe_put(name="cold end") == {"FINISHED"}
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "kept.blend"))
    bpy.ops.wm.open_mainfile(filepath=str(tmp_path / "kept.blend"))
    (probe,) = probes.probes([bpy.data.objects["wall"]])
    assert probe.name == "cold end" and probes.reading(probe) == pytest.approx(COLD, abs=1e-2)


def test_a_line_of_sight_reads_what_it_meets_first(scene, turned):
    eye, at = world(turned, -0.1, 0.2, 8.0), world(turned, -0.1, 0.2, 0.5)
    part, place, kelvin = probes.under([turned], eye, (at - eye).normalized())
    assert part == turned and (place - at).length < 1e-5
    assert kelvin == pytest.approx(COLD + 0.4 * (HOT - COLD), abs=1e-2)
    assert probes.under([turned], eye, Vector((0.0, 0.0, 1.0))) is None
    bpy.ops.fluxface.cut_open()
    bpy.ops.fluxface.turn_cut(axis="Z")
    _, behind, _ = probes.under([turned], eye, (at - eye).normalized())
    assert (behind - at).length > 1e-3  # what is cut away is not met
    view.settings_of(scene).showing = "PART"
    assert probes.under([turned], eye, (at - eye).normalized()) is None
