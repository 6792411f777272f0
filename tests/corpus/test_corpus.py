"""Surfaces that nobody here made, run whole: solved to the right volume and areas, or refused with a place.

Where they come from, their licences, volumes and classes stand in manifest.json.
"""

from __future__ import annotations

import sys
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import pytest

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE))

from measure import measured, read_manifest  # noqa: E402

ENTRIES = {entry["file"]: entry for entry in read_manifest(HERE)}

pytestmark = [
    pytest.mark.slow,
    pytest.mark.skipif(not find_spec("manifold3d"), reason="needs the libraries of the extra 'mend'"),
]


@pytest.mark.parametrize("entry", ENTRIES.values(), ids=ENTRIES)
def test_surface_is_solved_rightly_or_refused_with_a_place(entry: dict[str, Any]) -> None:
    outcome = measured(HERE, entry)
    assert not outcome.silently_wrong and outcome.located, outcome
    assert outcome.solved == (entry["expected_class"] != "open"), outcome
    assert outcome.state == "solved" or entry["expected_class"] != "clean", outcome
