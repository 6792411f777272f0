"""Files of any origin never hurt: they are refused in a sentence, soon, and without taking memory or running code.

Every random choice is seeded; a failure names its case and comes again.
"""

from __future__ import annotations

import copy
import io
import json
import struct
import time
import zipfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from cases import case_of, run
from fluxface.solver import pipeline
from fluxface.solver.case import Case, Contact, Convection, Radiation, Tag, write_case
from fluxface.solver.command_line import main
from fluxface.solver.errors import EXIT_CODES, Trouble
from fluxface.solver.result import Field, hot_skin, read_field, read_skin, read_summary, write_result, write_skin
from shapes import assembly, box, facing, tagged

SECONDS = 1.0  # of processor time, for any refusal; a fiftieth of it is usual
SEED = 20_261_201


def sound_case() -> Case:
    one = tagged(tagged(box((0.02, 0.03, 0.01)), 0, facing("-z")), 1, facing("+x"))
    return case_of(
        assembly(one, box((0.02, 0.03, 0.01), at=(0, 0, 0.01))),
        [Tag("pad", heat=2.0, size=0.004), Tag("wall", temperature=300.0)],
        untagged=Tag("untagged", convection=Convection(290.0, 5.0), radiation=Radiation(0.9, 290.0)),
        contacts=(Contact((0, 1), 2.0e4, 1e-5),),
        size=0.01,
    )


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    write_case(sound_case(), tmp_path)
    return tmp_path


def told(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> int:
    """The exit code, with what is said on failure found to be the contract's one line, and soon."""
    began = time.process_time()
    code = main(arguments)
    assert time.process_time() - began < SECONDS
    said = capsys.readouterr().err
    if code:
        trouble = json.loads(said.splitlines()[-1])
        assert set(trouble) == {"kind", "message", "where", "mend"} and EXIT_CODES[trouble["kind"]] == code
        assert "Traceback" not in said and trouble["message"].endswith(".")
    return code


def refused(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert told(["solve", str(folder), "--progress", "none"], capsys) in (2, 3)
    assert not (folder / "result").exists()


# The document ---------------------------------------------------------------------------------------------------------

STRANGE: list[Any] = [
    None, True, False, 0, -1, 7, 2**31, 10**400, -(10**400), 0.5, 1e308, -1e308, 5e-324, float("nan"), float("inf"),
    "", "body", "\x00", "\ud800", "é" * 5000, "natural", "1e3", [], [[]], [None], [1.0, 2.0, 3.0], [["a"], "b"],
    {}, {"": {}}, {"name": "x"}, {"temperature": [1, 2], "value": [3, 4]}, {"coefficient": 1e308, "ambient": 1e308},
]  # fmt: skip


def places(document: Any) -> list[tuple[Any, Any]]:
    """Every container of the document with each of its keys or indices."""
    keys = document if isinstance(document, dict) else range(len(document)) if isinstance(document, list) else ()
    return [(document, key) for key in keys] + [place for key in keys for place in places(document[key])]


def mutated(document: Any, chance: np.random.Generator) -> Any:
    """The document with one to three keys dropped, replaced, doubled or added."""
    document = copy.deepcopy(document)
    for _ in range(chance.integers(1, 4)):
        some = places(document)
        container, key = some[chance.integers(len(some))]
        strange = STRANGE[chance.integers(len(STRANGE))]
        match chance.integers(4):
            case 0:
                del container[key]
            case 1:
                container[key] = strange
            case 2 if isinstance(container, list):
                container.append(copy.deepcopy(container[key]))
            case _ if isinstance(container, dict):
                container[f"{key} {chance.integers(9)}"] = strange
    return document


def test_mutated_documents(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    document = json.loads((folder / "case.json").read_text("utf-8"))
    chance, codes = np.random.default_rng(SEED), []
    for _ in range(400):
        (folder / "case.json").write_text(json.dumps(mutated(document, chance)), "utf-8")
        codes.append(told(["check", str(folder)], capsys))
    # Most changes are faults of the case, and some leave it sound: otherwise nothing would be tested.
    assert set(codes) <= {0, 2, 3, 4} and codes.count(2) > 200 and codes.count(0) > 5


@pytest.mark.parametrize(
    "text",
    ["[" * 15_000_000, '{"a":' * 2_000_000, "[[]," * 10_000_000, '{"format": ' + "9" * 5_000_000 + "}", "\x00" * 10**6],
    ids=["brackets", "braces", "too large", "long number", "zeros"],
)
def test_documents_that_would_exhaust_a_reader(folder: Path, capsys: pytest.CaptureFixture[str], text: str) -> None:
    (folder / "case.json").write_text(text, "utf-8")
    refused(folder, capsys)


@pytest.mark.parametrize("name", ["case.json", "surface.npz"])
def test_random_bytes(folder: Path, capsys: pytest.CaptureFixture[str], name: str) -> None:
    chance = np.random.default_rng(SEED)
    for length in chance.integers(0, 3000, 40).tolist():
        (folder / name).write_bytes(chance.bytes(length))
        refused(folder, capsys)


# The arrays -----------------------------------------------------------------------------------------------------------


def stored(header: str, data: bytes = b"") -> bytes:
    """An array's file with any header."""
    return b"\x93NUMPY\x01\x00" + struct.pack("<H", len(header)) + header.encode("latin-1") + data


def header_of(kind: str, shape: str) -> str:
    return f"{{'descr': '{kind}', 'fortran_order': False, 'shape': {shape}, }}\n"


def as_file(array: np.ndarray) -> bytes:
    stream = io.BytesIO()
    np.save(stream, array)
    return stream.getvalue()


def with_members(folder: Path, compression: int = zipfile.ZIP_STORED, **changed: bytes) -> None:
    """The surface's archive with some arrays' files replaced."""
    with np.load(folder / "surface.npz") as arrays:
        members = {name: as_file(arrays[name]) for name in arrays}
    with zipfile.ZipFile(folder / "surface.npz", "w", compression) as archive:
        for name, content in {**members, **changed}.items():
            archive.writestr(f"{name}.npy", content)


def places_of(change: Callable[[np.ndarray], np.ndarray]) -> bytes:
    return as_file(change(sound_case().surface.vertices))


HOSTILE = {
    "claims gigabytes": stored(header_of("<f8", "(1000000000, 3)")),
    "claims exabytes": stored(header_of("<f8", f"({10**18}, 3)")),
    "claims more than can be counted": stored(header_of("<f8", f"({2**64}, 3)")),
    "negative": stored(header_of("<f8", "(-16, -3)"), bytes(384)),
    "wide letters": stored(header_of("<U500000000", "(1,)")),
    "wide voids": stored(header_of("|V2147483647", "(16, 3)")),
    "objects": stored(header_of("|O", "(16, 3)"), b"\x80\x04N."),
    "records": stored("{'descr': [('a', '<f8')], 'fortran_order': False, 'shape': (16, 3), }\n", bytes(384)),
    "deep header": stored("(" * 5000),
    "code for a header": stored("__import__('os').abort()\n"),
    "no array": b"PK\x03\x04",
    "nothing": b"",
    "not finite": places_of(lambda places: places * np.nan),
    "infinite": places_of(lambda places: places + np.inf),
    "immense": places_of(lambda places: places * 1e300),
    "vanishing": places_of(lambda places: places * 1e-300),
    "far away": places_of(lambda places: places + 1e20),
    "complex": places_of(lambda places: places.astype(complex)),
}


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_arrays(folder: Path, capsys: pytest.CaptureFixture[str], name: str) -> None:
    with_members(folder, vertices=HOSTILE[name])
    refused(folder, capsys)


def test_an_archive_that_unpacks_to_far_more(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    zeros = stored(header_of("<f8", "(10000000, 3)"), bytes(240_000_000))
    with_members(folder, zipfile.ZIP_DEFLATED, vertices=zeros)
    refused(folder, capsys)


def test_numbers_of_the_other_byte_order_are_read(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with_members(folder, vertices=places_of(lambda places: places.astype(">f8")))
    assert told(["check", str(folder)], capsys) == 0


def test_archives_damaged_anywhere(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Cut short, or a few bytes changed: refused, or the same surface where the change was in nothing that counts."""
    whole, chance = (folder / "surface.npz").read_bytes(), np.random.default_rng(SEED)
    for _ in range(150):
        damaged = bytearray(whole)
        for place in chance.integers(0, len(whole), 3).tolist():
            damaged[place] = int(chance.integers(256))
        cut = len(whole) if chance.random() < 0.7 else int(chance.integers(len(whole)))
        (folder / "surface.npz").write_bytes(bytes(damaged[:cut]))
        assert told(["check", str(folder)], capsys) in (0, 2, 3)


def test_a_folder_that_is_a_file(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "case").write_text("{}")
    refused(tmp_path / "case", capsys)


def test_a_process_of_its_own_ends_as_told(folder: Path) -> None:
    """Past the interpreter's own stack and standard streams."""
    (folder / "case.json").write_text("[" * 15_000_000, "utf-8")
    ran = run("solve", folder)
    assert ran.code == 2 and ran.trouble["kind"] == "case" and "Traceback" not in ran.err


# The result -----------------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def solved() -> pipeline.Solved:
    return pipeline.solve(sound_case())


@pytest.mark.parametrize("which", ["field.npz", "skin.npz"])
def test_damaged_results(tmp_path: Path, solved: pipeline.Solved, which: str) -> None:
    folder, chance = tmp_path / "result", np.random.default_rng(SEED)
    write_result(solved.summary, solved.field, folder)
    write_skin(hot_skin(solved.field), folder)
    read = {"field.npz": read_field, "skin.npz": read_skin}[which]
    read(folder)
    whole = (folder / which).read_bytes()
    for share in (0.0, 0.01, 0.5, 0.99):
        (folder / which).write_bytes(whole[: int(share * len(whole))])
        with pytest.raises(Trouble):
            read(folder)
    for _ in range(20):
        damaged = bytearray(whole)
        for place in chance.integers(0, len(whole), 200).tolist():
            damaged[place] ^= 0xFF
        (folder / which).write_bytes(bytes(damaged))
        with pytest.raises(Trouble):
            read(folder)


FOREIGN: dict[str, Callable[[Field], dict[str, Any]]] = {
    "cells beyond the nodes": lambda field: {"cells": field.cells + len(field.nodes)},
    "boundary below zero": lambda field: {"boundary": field.boundary - len(field.nodes)},
    "five-node cells": lambda field: {"cells": field.cells[:, :5]},
    "boundary of the other order": lambda field: {"boundary": field.boundary[:, :3]},
    "a temperature too few": lambda field: {"temperature": field.temperature[1:]},
    "temperatures not finite": lambda field: {"temperature": field.temperature * np.nan},
    "words for temperatures": lambda field: {"temperature": field.temperature.astype(str)},
    "flat nodes": lambda field: {"nodes": field.nodes[:, :2]},
    "a number for nodes": lambda field: {"nodes": np.float64(3.0)},
    "parts of other cells": lambda field: {"cell_part": field.cell_part[:-1]},
}


@pytest.mark.parametrize("name", FOREIGN)
def test_foreign_results(tmp_path: Path, solved: pipeline.Solved, name: str) -> None:
    foreign = replace(solved.field, **FOREIGN[name](solved.field))
    write_result(solved.summary, foreign, tmp_path / "result")
    with pytest.raises(Trouble) as caught:
        read_field(tmp_path / "result")
    assert caught.value.kind == "case" and "field.npz" in caught.value.message


@pytest.mark.parametrize("text", ["", "[" * 100_000, "[]", '{"format": 7}', "\udcff"])
def test_foreign_summaries(tmp_path: Path, text: str) -> None:
    (tmp_path / "summary.json").write_text(text, "utf-8", "surrogateescape")
    with pytest.raises(Trouble):
        read_summary(tmp_path)
