"""Case folders: what is written is read back, and whatever is wrong in one is named by its key.

Formats and exit codes are this project's own contract; the numbers are invented.
"""

from __future__ import annotations

import copy
import json
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from cases import metal
from fluxface.solver.case import (
    Accuracy,
    Case,
    Contact,
    Convection,
    Part,
    Radiation,
    Tag,
    read_case,
    write_case,
)
from fluxface.solver.command_line import main
from fluxface.solver.materials import Material, Table, library
from shapes import assembly, box, facing, tagged

AXES = ((0.6, 0.8, 0.0), (-0.8, 0.6, 0.0), (0.0, 0.0, 1.0))


def full_case() -> Case:
    """One of everything that a case can hold."""
    one = box((0.02, 0.03, 0.01))
    for number, direction in enumerate(("+x", "-x", "+y", "-y")):
        one = tagged(one, number, facing(direction))
    parts = (
        Part("body", metal(Table((300.0, 500.0), (20.0, 12.5))), heat=1.5),
        Part("chip", Material("invented fibre", (1.0, Table((1.0, 2.0), (3.0, 4.0)), 5.0), AXES), heat_density=2.5e4),
    )
    tags = (
        Tag("pad", heat=12.0, heat_flux=-3.25, size=0.0005),
        Tag("fins", convection=Convection(298.15, 8.0), radiation=Radiation(0.85, 290.0)),
        Tag("cold end", temperature=293.15),
        Tag(
            "vent",
            convection=Convection(300.0, correlation="fin_channel", length=0.02, gap=0.004, fluid="air"),
        ),
    )
    return Case(
        surface=assembly(one, box((0.02, 0.03, 0.01), at=(0, 0, 0.01))),
        parts=parts,
        tags=tags,
        untagged=Tag("untagged", convection=Convection(290.0, 5.0)),
        contacts=(Contact((0, 1), 2.0e4, 1e-5),),
        gravity=(0.6, 0.0, -0.8),
        accuracy=Accuracy(1, 0.004, 50_000),
        title="Harbour lamp — Rev. C, 25 °C",
    )


def test_what_is_written_is_read_back(tmp_path: Path) -> None:
    case = full_case()
    write_case(case, tmp_path / "deep" / "case")
    read = read_case(tmp_path / "deep" / "case")
    for name in ("parts", "tags", "untagged", "contacts", "accuracy", "title"):
        assert getattr(read, name) == getattr(case, name)
    assert read.gravity == pytest.approx(case.gravity, rel=1e-15)
    for name, array in vars(case.surface).items():
        np.testing.assert_array_equal(getattr(read.surface, name), array)
        assert getattr(read.surface, name).dtype == (np.float64 if name == "vertices" else np.int32)


def test_bonded_contact_is_read_back(tmp_path: Path) -> None:
    case = Case(**{**vars(full_case()), "contacts": (Contact((1, 0), None),)})
    write_case(case, tmp_path)
    assert read_case(tmp_path).contacts == case.contacts


# The document of a sound case, and what may go wrong in it ------------------------------------------------------------

DOCUMENT: dict[str, Any] = {
    "format": "fluxface.case/1",
    "title": "Harbour lamp",
    "parts": [
        {"name": "body", "material": {"name": "alloy", "conductivity": 167.0, "density": 2700.0}, "heat": 0.0},
        {"name": "chip", "material": {"name": "laminate", "conductivity": [5.0, 5.0, 1.0]}, "heat": 2.0},
    ],
    "tags": [
        {"name": "pad", "heat": 12.0},
        {
            "name": "fins",
            "convection": {"coefficient": 8.0, "ambient": 298.15},
            "radiation": {"emissivity": 0.85, "ambient": 298.15},
        },
        {"name": "cold end", "temperature": 293.15},
    ],
    "untagged": {},
    "contacts": [{"parts": ["body", "chip"], "conductance": 2.0e4}],
    "gravity": [0, 0, -2],
    "time": None,
    "accuracy": {"order": 2, "size": None, "kelvin": None, "max_nodes": 2000000},
}
GONE = object()


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    write_case(full_case(), tmp_path)
    write_document(tmp_path, DOCUMENT)
    with np.load(tmp_path / "surface.npz") as arrays:
        surface = dict(arrays)
    surface["tag"] = np.minimum(surface["tag"], 2)
    np.savez(tmp_path / "surface.npz", **surface)
    return tmp_path


def write_document(folder: Path, document: Any) -> None:
    (folder / "case.json").write_text(json.dumps(document), "utf-8")


def changed(path: str, value: Any) -> dict[str, Any]:
    """The document with the value at ``path`` replaced, added, or (GONE) removed."""
    document = copy.deepcopy(DOCUMENT)
    *way, last = [int(key) if key.isdigit() else key for key in re.findall(r"\w+", path)]
    place: Any = document
    for key in way:
        place = place[key]
    if value is GONE:
        del place[last]
    elif isinstance(last, int) and last == len(place):
        place.append(value)
    else:
        place[last] = value
    return document


def refused(folder: Path, capsys: pytest.CaptureFixture[str]) -> str:
    """What is said of a case that must be refused as one: its message and what to do about it."""
    assert main(["solve", str(folder), "--progress", "none"]) == 2
    streams = capsys.readouterr()
    assert streams.out == ""
    trouble = json.loads(streams.err.splitlines()[-1])
    assert trouble["kind"] == "case" and set(trouble) == {"kind", "message", "where", "mend"}
    assert trouble["message"].endswith(".") and trouble["mend"].endswith(".")
    assert not (folder / "result").exists()
    return f"{trouble['message']} {trouble['mend']}"


def test_the_document_itself_is_sound(folder: Path) -> None:
    case = read_case(folder)
    assert [part.name for part in case.parts] == ["body", "chip"]
    assert case.tags[1].radiation == Radiation(0.85, 298.15)
    assert case.accuracy == Accuracy(2, None, 2_000_000) and case.untagged == Tag("untagged")
    assert case.contacts == (Contact((0, 1), 2.0e4),) and case.gravity == (0.0, 0.0, -1.0)


def test_only_format_and_parts_are_needed(folder: Path) -> None:
    write_document(folder, {key: DOCUMENT[key] for key in ("format", "parts", "tags")})
    assert read_case(folder).contacts == ()


def test_a_material_may_be_given_by_name_alone(folder: Path) -> None:
    name = next(iter(library()))
    write_document(folder, changed("parts[0].material", {"name": name}))
    assert read_case(folder).parts[0].material == library()[name].material


@pytest.mark.parametrize(
    ("contact", "conductance"),
    [
        ({"conductance": 5.0}, 5.0),
        ({"resistance": 0.25}, 4.0),
        ({"thickness": 0.5, "conductivity": 3.0}, 6.0),
        ({"bonded": True}, None),
        ({"bonded": False, "conductance": 7.0}, 7.0),
    ],
)
def test_ways_to_give_a_contact(folder: Path, contact: dict[str, Any], conductance: float | None) -> None:
    write_document(folder, changed("contacts[0]", {"parts": ["chip", "body"], **contact}))
    assert read_case(folder).contacts == (Contact((1, 0), conductance),)


CONDUCTIVITY = "parts[0].material.conductivity"
TABLE = {"temperature": [300.0, 400.0], "value": [5.0, 6.0]}
WRONG: list[tuple[str, Any]] = [
    # The value is wrong at the path itself, which the message must name.
    ("format", "fluxface.case/2"),
    ("format", GONE),
    ("title", 5),
    ("time", {"end": 60.0}),
    ("parts", GONE),
    ("parts", []),
    ("parts", {"name": "body"}),
    ("parts[0]", "body"),
    ("parts[0].name", GONE),
    ("parts[0].name", 7),
    ("parts[0].name", "two\nlines"),
    ("parts[0].name", "\ud800"),
    ("parts[1].name", "body"),
    ("parts[0].heat", "12"),
    ("parts[0].heat", float("nan")),
    ("parts[0].heat_density", float("inf")),
    ("parts[0].material", GONE),
    ("parts[0].material", "copper"),
    ("parts[0].material.name", GONE),
    ("parts[0].material.density", 0),
    ("parts[0].material.heat_capacity", -1.0),
    (CONDUCTIVITY, -3.0),
    (CONDUCTIVITY, 0),
    (CONDUCTIVITY, True),
    (CONDUCTIVITY, "low"),
    (CONDUCTIVITY, float("nan")),
    (CONDUCTIVITY, float("-inf")),
    (CONDUCTIVITY, 10**400),
    (CONDUCTIVITY, 1e300),
    (CONDUCTIVITY, 1e-300),
    (CONDUCTIVITY, [1.0, 2.0]),
    (CONDUCTIVITY, []),
    (f"{CONDUCTIVITY}", {"temperature": [300.0, 400.0]}),
    ("parts[1].material.conductivity[2]", 0.0),
    ("parts[0].material.axes", [[1, 0, 0], [1, 1, 0], [0, 0, 1]]),
    ("parts[0].material.axes", [[1, 0, 0], [0, 1, 0]]),
    ("tags", "pad"),
    ("tags[0]", 3),
    ("tags[0].name", GONE),
    ("tags[1].name", "pad"),
    ("tags[0].heat", [12.0]),
    ("tags[0].heat_flux", float("inf")),
    ("tags[2].temperature", -1.0),
    ("tags[2].temperature", "cold"),
    ("tags[1].size", 0.0),
    ("tags[1].convection", 8.0),
    ("tags[1].convection.ambient", GONE),
    ("tags[1].convection.ambient", -0.01),
    ("tags[1].convection.coefficient", GONE),
    ("tags[1].convection.coefficient", -8.0),
    ("tags[1].convection.length", 0.1),
    ("tags[1].radiation.emissivity", 1.01),
    ("tags[1].radiation.emissivity", -0.1),
    ("tags[1].radiation.emissivity", GONE),
    ("tags[1].radiation.ambient", -300.0),
    ("untagged", []),
    ("contacts[0].parts", ["body"]),
    ("contacts[0].parts", ["body", "body"]),
    ("contacts[0].parts[1]", "lid"),
    ("contacts[0].parts[1]", 1),
    ("contacts[0].conductance", -1.0),
    ("contacts[0].gap", 0.0),
    ("contacts[0].resistance", 1.0),
    ("contacts[0].conductance", GONE),
    ("contacts[0].bonded", "yes"),
    ("gravity", [0, 0, 0]),
    ("gravity", [0, -1]),
    ("gravity[0]", None),
    ("accuracy", 2),
    ("accuracy.order", 3),
    ("accuracy.order", 1.5),
    ("accuracy.size", 0.0),
    ("accuracy.size", "fine"),
    ("accuracy.max_nodes", 3),
    ("accuracy.max_nodes", 10**12),
    ("accuracy.kelvin", 0.5),
    # A key that the contract does not know, at every depth.
    ("tag", []),
    ("parts[0].watts", 3.0),
    ("parts[0].material.colour", "red"),
    ("tags[0].power", 12.0),
    ("tags[1].convection.h", 8.0),
    ("tags[1].radiation.view", 1.0),
    ("untagged.name2", "x"),
    ("contacts[0].h", 1.0),
    ("accuracy.tolerance", 1e-9),
]


@pytest.mark.parametrize(("path", "value"), WRONG, ids=[f"{path} {str(value)[:20]}" for path, value in WRONG])
def test_a_wrong_value_is_named_by_its_path(
    folder: Path, capsys: pytest.CaptureFixture[str], path: str, value: Any
) -> None:
    write_document(folder, changed(path, value))
    said = refused(folder, capsys)
    # A contact given twice or not at all is a fault of the contact, as is an odd number of parts.
    named = re.sub(r"(contacts\[0\])\.(resistance|conductance)$", r"\1", path)
    assert named in said


@pytest.mark.parametrize(
    ("table", "place"),
    [
        ({**TABLE, "temperature": [400.0, 300.0]}, "temperature"),
        ({**TABLE, "temperature": [300.0, 300.0]}, "temperature"),
        ({**TABLE, "temperature": [-1.0, 300.0]}, "temperature[0]"),
        ({**TABLE, "value": [5.0, 0.0]}, "value[1]"),
        ({**TABLE, "value": [5.0, float("nan")]}, "value[1]"),
        ({**TABLE, "value": [5.0]}, "value"),
        ({**TABLE, "values": [5.0, 6.0]}, "values"),
        ({"temperature": [300.0], "value": [5.0]}, "temperature"),
        ({"temperature": [], "value": []}, "temperature"),
        ({"temperature": 300.0, "value": 5.0}, "temperature"),
    ],
)
def test_a_wrong_table_is_named_by_its_path(
    folder: Path, capsys: pytest.CaptureFixture[str], table: dict[str, Any], place: str
) -> None:
    write_document(folder, changed(CONDUCTIVITY, table))
    assert f"{CONDUCTIVITY}.{place}" in refused(folder, capsys)


@pytest.mark.parametrize(
    ("path", "value", "words"),
    [
        ("tags[0]", {"name": "pad", "heat": 1.0, "temperature": 300.0}, ("'pad'", "temperature", "heat", "tags[0]")),
        (
            "tags[0]",
            {"name": "pad", "temperature": 300.0, "convection": {"ambient": 300.0, "coefficient": 5.0}},
            ("'pad'", "convection"),
        ),
        ("parts[0]", {**DOCUMENT["parts"][0], "heat": 1.0, "heat_density": 2.0}, ("parts[0]", "heat_density")),
        ("parts[0].material", {"name": "unobtainium"}, ("parts[0].material.name", "unobtainium")),
        (
            "tags[1].convection",
            {"ambient": 300.0, "coefficient": 5.0, "correlation": "natural"},
            ("tags[1].convection", "coefficient", "correlation"),
        ),
        (
            "tags[1].convection",
            {"ambient": 300.0, "correlation": "gale"},
            ("tags[1].convection.correlation", "gale", "vertical_plate"),
        ),
        ("tags[1].convection", {"ambient": 300.0, "correlation": "fin_channel"}, ("tags[1].convection.gap",)),
        ("tags[1].convection", {"ambient": 300.0, "correlation": "flat_plate_flow"}, ("tags[1].convection.speed",)),
        (
            "tags[1].convection",
            {"ambient": 300.0, "correlation": "cylinder_crossflow", "speed": -1.0},
            ("tags[1].convection.speed",),
        ),
        ("tags[1].convection", {"ambient": 300.0, "correlation": "natural", "fluid": "syrup"}, ("syrup",)),
        ("contacts[0]", {"parts": ["body", "chip"], "thickness": 1e-3}, ("contacts[0].conductivity",)),
        ("contacts[0]", {"parts": ["body", "lid"], "bonded": True}, ("contacts[0].parts[1]", "lid", "chip")),
    ],
)
def test_terms_that_do_not_go_together(
    folder: Path, capsys: pytest.CaptureFixture[str], path: str, value: Any, words: tuple[str, ...]
) -> None:
    write_document(folder, changed(path, value))
    said = refused(folder, capsys)
    for word in words:
        assert word in said


@pytest.mark.parametrize("text", ["", "{", "[]", "null", "7", '"case"', "[" * 100_000, "\x00\x01", '{"format": }'])
def test_a_document_that_is_none(folder: Path, capsys: pytest.CaptureFixture[str], text: str) -> None:
    (folder / "case.json").write_text(text, "utf-8")
    assert "case" in refused(folder, capsys)


def test_a_document_in_another_encoding(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "case.json").write_bytes(json.dumps({**DOCUMENT, "title": "é"}, ensure_ascii=False).encode("latin-1"))
    assert "case.json" in refused(folder, capsys)


# The arrays -----------------------------------------------------------------------------------------------------------


def with_item(array: np.ndarray, value: float) -> np.ndarray:
    flat = array.copy()
    flat.ravel()[4] = value
    return flat


WRONG_ARRAYS: list[tuple[str, Callable[[np.ndarray], np.ndarray], str]] = [
    ("vertices", lambda a: with_item(a, np.nan), "vertices[1]"),
    ("vertices", lambda a: with_item(a, np.inf), "vertices[1]"),
    ("vertices", lambda a: with_item(a, 1e30), "vertices"),
    ("vertices", lambda a: a[:, :2], "vertices"),
    ("vertices", lambda a: a.ravel(), "vertices"),
    ("vertices", lambda a: a.astype(int), "vertices"),
    ("vertices", lambda a: a.astype(str), "vertices"),
    ("vertices", lambda a: a[:3], "triangles"),
    ("triangles", lambda a: with_item(a, -1), "triangles"),
    ("triangles", lambda a: with_item(a, 10**6), "triangles"),
    ("triangles", lambda a: a.astype(float), "triangles"),
    ("triangles", lambda a: np.c_[a, a[:, 0]], "triangles"),
    ("part", lambda a: with_item(a, 2), "part"),
    ("part", lambda a: with_item(a, -1), "part"),
    ("part", lambda a: a[:-1], "part"),
    ("tag", lambda a: with_item(a, 3), "tag"),
    ("tag", lambda a: with_item(a, -2), "tag"),
    ("tag", lambda a: a.astype(float), "tag"),
    ("face", lambda a: a[:-1], "face"),
    ("face", lambda a: a[:, None], "face"),
]


@pytest.mark.parametrize(("name", "change", "named"), WRONG_ARRAYS)
def test_a_wrong_array_is_named(
    folder: Path, capsys: pytest.CaptureFixture[str], name: str, change: Callable[[np.ndarray], np.ndarray], named: str
) -> None:
    with np.load(folder / "surface.npz") as arrays:
        surface = dict(arrays)
    np.savez(folder / "surface.npz", **{**surface, name: change(surface[name])})
    said = refused(folder, capsys)
    assert "surface.npz" in said and named in said


@pytest.mark.parametrize("name", ["vertices", "triangles", "part", "tag"])
def test_a_missing_array_is_named(folder: Path, capsys: pytest.CaptureFixture[str], name: str) -> None:
    with np.load(folder / "surface.npz") as arrays:
        np.savez(folder / "surface.npz", **{key: arrays[key] for key in arrays if key != name})
    assert f"'{name}'" in refused(folder, capsys)


def test_faces_without_numbers_are_numbered(folder: Path) -> None:
    with np.load(folder / "surface.npz") as arrays:
        np.savez(folder / "surface.npz", **{key: arrays[key] for key in arrays if key != "face"})
    surface = read_case(folder).surface
    np.testing.assert_array_equal(surface.face, np.arange(len(surface.triangles)))


def test_no_triangles_at_all(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    none = np.zeros(0, np.int32)
    np.savez(
        folder / "surface.npz", vertices=np.zeros((0, 3)), triangles=none.reshape(0, 3), part=none, tag=none, face=none
    )
    assert "triangles" in refused(folder, capsys)


def test_arrays_are_never_unpickled(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    class Loud:
        def __reduce__(self) -> tuple[Any, ...]:
            return (pytest.fail, ("the array was unpickled",))

    with np.load(folder / "surface.npz") as arrays:
        surface = dict(arrays)
    np.savez(folder / "surface.npz", **{**surface, "vertices": np.array([Loud()], dtype=object)})
    assert "surface.npz" in refused(folder, capsys)


@pytest.mark.parametrize("content", [b"", b"PK\x03\x04", b"no archive", b"\x93NUMPY\x01\x00"])
def test_an_archive_that_is_none(folder: Path, capsys: pytest.CaptureFixture[str], content: bytes) -> None:
    (folder / "surface.npz").write_bytes(content)
    assert "surface.npz" in refused(folder, capsys)


@pytest.mark.parametrize("share", [0.2, 0.6, 0.98])
def test_an_archive_cut_short(folder: Path, capsys: pytest.CaptureFixture[str], share: float) -> None:
    whole = (folder / "surface.npz").read_bytes()
    (folder / "surface.npz").write_bytes(whole[: int(share * len(whole))])
    assert "surface.npz" in refused(folder, capsys)


@pytest.mark.parametrize("name", ["case.json", "surface.npz"])
def test_a_missing_file_is_named(folder: Path, capsys: pytest.CaptureFixture[str], name: str) -> None:
    (folder / name).unlink()
    assert name in refused(folder, capsys)
    (folder / name).mkdir()
    assert name in refused(folder, capsys)


def test_no_folder_at_all(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert "case.json" in refused(tmp_path / "nowhere", capsys)
