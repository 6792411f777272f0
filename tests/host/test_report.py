"""The report stands alone, says what was solved and not what was changed since, and bounds what it shows."""

from __future__ import annotations

import base64
import re
from html.parser import HTMLParser
from pathlib import Path

import bpy
import pytest
from fluxface.addon import report
from fluxface.addon.operators.publishing import PICTURE
from fluxface.addon.report import rows
from modelled import lamp

DOT = base64.b64decode(
    "iVBORw0KGgoAAAANSUhEUgAAAAEAAAABCAYAAAAfFcSJAAAADUlEQVR42mNk+M9QDwADhgGAWjR9awAAAABJRU5ErkJggg=="
)


@pytest.fixture
def run(scene, tmp_path: Path) -> Path:
    """The folder of a kept run of a lamp, with a stand-in for its picture."""
    part = lamp(scene)
    part.name = "Lamp <left> & right"
    bpy.ops.wm.save_as_mainfile(filepath=str(tmp_path / "lamp.blend"))
    bpy.ops.fluxface.run()
    folder = Path(part.fluxface.outcome.runs[0].folder)
    (folder / PICTURE).write_bytes(DOT)
    return folder


class Words(HTMLParser):
    """The text of a page, and the addresses that it would fetch."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.text, self.addresses = "", []
        self.feed(page)

    def handle_data(self, data: str) -> None:
        self.text += data

    def handle_starttag(self, _tag: str, attributes: list) -> None:
        self.addresses += [value for name, value in attributes if name in ("src", "href")]


def test_the_page_says_what_was_solved_and_what_came_of_it(scene, run: Path) -> None:
    scene.fluxface.tags["pad"].heat = 99.0
    page = Words(report.page(scene, run, run / PICTURE, "a note of mine"))
    for said in ("Lamp <left> & right", "lamp.blend", "a note of mine", "12 W", "8 W/m²K to 25 °C", "167 W/mK"):
        assert said in page.text
    assert "99" not in page.text
    assert "aluminium 6061-T6" in page.text
    assert re.search(r"12 W\s?in", page.text) and re.search(r"12 W\s?out", page.text)
    assert "licensed practice" in page.text
    assert "$" not in page.text


def test_the_page_fetches_nothing(scene, run: Path) -> None:
    page = Words(report.page(scene, run, run / PICTURE, ""))
    assert [address.partition(",")[0] for address in page.addresses] == ["data:image/png;base64"]
    assert base64.b64decode(page.addresses[0].partition(",")[2]) == DOT


def test_temperatures_are_in_the_unit_of_the_scene(scene, run: Path) -> None:
    celsius = Words(report.page(scene, run, run / PICTURE, "")).text
    scene.unit_settings.system, scene.unit_settings.temperature_unit = "IMPERIAL", "FAHRENHEIT"
    fahrenheit = Words(report.page(scene, run, run / PICTURE, "")).text
    hottest = [float(re.search(r"Hottest, on.*?([\d.]+) °[CF]", text, re.S)[1]) for text in (celsius, fahrenheit)]
    assert hottest[1] == pytest.approx(1.8 * hottest[0] + 32, abs=0.2)


def test_of_many_rows_the_rest_is_counted() -> None:
    shown = rows._shown([(str(number), "x") for number in range(30)], 9)
    assert len(shown) == 10
    assert shown[-1] == ("and 21 more", "")
    assert rows._some(["a", "b"], 2) == ["a", "b"]


def test_the_button_writes_it_beside_the_run(scene, run: Path, tmp_path: Path) -> None:
    bpy.ops.fluxface.write_report()
    assert "Lamp &lt;left&gt; &amp; right" in (run / "report.html").read_text("utf-8")
    with pytest.raises(RuntimeError, match="The report cannot be written"):
        (tmp_path / "file").write_text("")
        bpy.ops.fluxface.write_report(filepath=str(tmp_path / "file" / "report.html"))
