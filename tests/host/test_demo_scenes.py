"""The demo scenes: sound solids with their tags in place, and the lamp's story told to its end.

A longer fin of the same kind runs cooler: Incropera & DeWitt, Fundamentals of Heat and Mass Transfer, section 3.6.
"""

from __future__ import annotations

import importlib
import json
from pathlib import Path

import numpy as np
import pytest
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

bpy = pytest.importorskip("bpy")
import bmesh  # noqa: E402
from fluxface.addon import study, tags  # noqa: E402

SCENES = ("work_lamp", "pan_handle", "led_module")


@pytest.fixture(autouse=True)
def demo_scenes(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.syspath_prepend(str(Path(__file__).resolve().parents[2] / "demo_scenes"))


def measured(mesh: bpy.types.Mesh) -> tuple[bool, float]:
    """Whether every edge lies between two polygons that agree on what is outside; the volume, cubic scene units."""
    shape = bmesh.new()
    shape.from_mesh(mesh)
    closed = all(edge.is_manifold and edge.is_contiguous for edge in shape.edges)
    volume = shape.calc_volume(signed=True)
    shape.free()
    return closed, volume


def bodies(mesh: bpy.types.Mesh) -> int:
    """How many pieces of surface the mesh has that no edge joins."""
    pairs = np.zeros(2 * len(mesh.edges), np.int32)
    mesh.edges.foreach_get("vertices", pairs)
    pairs, count = pairs.reshape(-1, 2), len(mesh.vertices)
    graph = coo_array((np.ones(len(pairs)), pairs.T), shape=(count, count))
    return connected_components(graph, directed=False)[0]


@pytest.mark.parametrize("name", SCENES)
def test_the_part_is_one_closed_body(scene, name):
    part = importlib.import_module(name).prepare()
    closed, volume = measured(part.data)
    assert closed
    assert volume > 0
    assert bodies(part.data) == 1


@pytest.mark.parametrize("fin_height", [20.0, 30.0, 45.0])
def test_the_lamp_stays_closed_when_its_fins_are_lengthened(scene, fin_height):
    lamp = importlib.import_module("work_lamp").build(fin_height)
    closed, volume = measured(lamp.data)
    assert closed
    assert volume > 0


@pytest.mark.parametrize("name", SCENES)
def test_every_tag_has_faces_and_carries_a_term(scene, name):
    importlib.import_module(name).prepare()
    settings = bpy.context.scene.fluxface
    uids = np.concatenate([tags.read(part.data) for part in study.parts(bpy.context)])
    assert len(settings.tags) >= 2
    for tag in settings.tags:
        assert (uids == tag.uid).any()
        assert tag.use_heat or tag.use_heat_flux or tag.use_convection or tag.use_temperature


@pytest.mark.slow
def test_longer_fins_run_cooler_and_all_heat_leaves_through_them(scene, tmp_path):
    lamp = importlib.import_module("work_lamp")
    hottest, fins = [], []
    for fin_height in (20.0, 40.0):
        part = lamp.prepare(fin_height)
        bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / f"lamp {fin_height:g}.blend"))
        bpy.ops.fluxface.run()
        summary = json.loads(study.outcome(bpy.context.scene, [part]).summary)
        tags = {tag["name"]: tag for tag in summary["tags"]}
        hottest.append(summary["hottest"]["temperature"])
        fins.append(tags["fins"]["area"])
        assert tags["LED pad"]["heat"] == pytest.approx(12.0, rel=1e-12)
        assert tags["fins"]["heat"] == pytest.approx(-12.0, rel=1e-9)
        # A film on one tag alone: its mean temperature follows from the area, whatever the shape.
        assert tags["fins"]["mean"] == pytest.approx(298.15 + 12.0 / (8.0 * tags["fins"]["area"]), abs=1e-6)
    assert fins[1] > fins[0]
    assert hottest[1] < hottest[0] - 5.0
