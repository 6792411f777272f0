"""An empty scene with the add-on registered: the host's state is global, so every test starts from the factory's."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

bpy = pytest.importorskip("bpy")

from fluxface import addon  # noqa: E402


@pytest.fixture
def scene() -> Iterator[bpy.types.Scene]:
    bpy.ops.wm.read_factory_settings(use_empty=True)
    addon.register()
    bpy.context.scene.unit_settings.temperature_unit = "CELSIUS"
    yield bpy.context.scene
    addon.unregister()
