"""A case that memory will not hold is refused before it starts, with what would fit."""

from __future__ import annotations

from dataclasses import replace

import pytest
from cases import case_of
from fluxface.solver import memory, pipeline
from fluxface.solver.case import Case, Convection, Tag
from fluxface.solver.errors import Trouble
from fluxface.solver.keeping import Kept
from fluxface.solver.room import bytes_needed
from shapes import box, facing, tagged


def block(size: float) -> Case:
    surface = tagged(tagged(box((0.08, 0.05, 0.02)), 0, facing("-z")), 1, facing("+z"))
    return case_of(surface, [Tag("pad", heat=3.0), Tag("top", convection=Convection(298.0, 9.0))], size=size)


@pytest.fixture
def little(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(memory, "available", lambda: 1_000_000_000)


def test_a_case_too_large_for_memory_is_refused_before_it_is_meshed(
    little: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(pipeline, "fill", lambda *_: pytest.fail("it was meshed"))
    with pytest.raises(Trouble) as told:
        pipeline.solve(block(0.001))
    trouble = told.value
    assert trouble.exit_code == 6
    assert "1 GB are free" in trouble.message
    assert "linear elements" in trouble.mend


def test_the_size_that_is_named_fits(little: None) -> None:
    with pytest.raises(Trouble) as told:
        pipeline.solve(block(0.001))
    millimetres = float(told.value.mend.split(" mm ")[0].split()[-1])
    case = block(millimetres / 1e3)
    nodes = pipeline.expected_nodes(case.surface, case.accuracy)
    assert bytes_needed(nodes, 2) == pytest.approx(1_000_000_000, rel=0.3)
    assert bytes_needed(nodes, 2) <= 1_000_000_000


def test_what_a_fine_tag_asks_for_is_counted_once_it_is_meshed(monkeypatch: pytest.MonkeyPatch) -> None:
    case = block(0.01)
    case = replace(case, tags=(replace(case.tags[0], size=0.001), case.tags[1]))
    monkeypatch.setattr(memory, "available", lambda: bytes_needed(10_000, 2))
    with pytest.raises(Trouble, match="GB are free"):
        pipeline.solve(case)


def test_what_is_kept_is_given_up_before_a_case_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    kept = Kept()
    pipeline.solve(block(0.006), kept=kept)
    told = iter([0, 8_000_000_000, 8_000_000_000, 8_000_000_000])
    monkeypatch.setattr(memory, "available", lambda: next(told))
    assert pipeline.solve(block(0.005), kept=kept).summary["reused"] == []


def test_the_peak_of_each_stage_is_told() -> None:
    peaks = pipeline.solve(block(0.006)).summary["memory"]
    assert list(peaks) == ["mesh", "solve", "report"]
    assert all(peak is None or peak > 1 << 20 for peak in peaks.values())
