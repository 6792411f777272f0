"""The command line: ``fluxface solve``, ``fluxface check``, ``fluxface mend`` and what serves the add-on."""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from .case import Case, read_case, write_case
from .errors import Trouble
from .packing import PLATFORMS, pack
from .rendering import render
from .result import Summary, write_result

BAR_LENGTH = 30
ZERO_CELSIUS = 273.15


def main(arguments: Sequence[str] | None = None) -> int:
    """The exit code; on failure the last line of stderr is JSON, as the contract gives it."""
    given = sys.argv[1:] if arguments is None else list(arguments)
    try:
        if given[:1] == ["render"]:
            return render(given[1:])
        options = _parser().parse_args(given)
        options.run(options)
    except Trouble as trouble:
        return _failed(trouble)
    except MemoryError:
        return _failed(Trouble("limits", "There is not enough memory for this case.", "Choose a larger size."))
    return 0


def _failed(trouble: Trouble) -> int:
    print(trouble.as_json(), file=sys.stderr)
    return trouble.exit_code


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(prog="fluxface", description="How hot a part gets.")
    commands = parser.add_subparsers(required=True, metavar="COMMAND")
    solving = commands.add_parser("solve", help="solve a case folder and write its result folder")
    solving.add_argument("case", type=Path, metavar="CASE", help="the case folder")
    solving.add_argument("--out", type=Path, metavar="RESULT", help="the result folder (default: CASE/result)")
    solving.add_argument("--progress", choices=PROGRESS, default="bar", help="how progress is told on stdout")
    solving.set_defaults(run=_solve)
    checking = commands.add_parser("check", help="check the geometry and inputs of a case folder, without solving")
    checking.add_argument("case", type=Path, metavar="CASE", help="the case folder")
    checking.add_argument("--json", action="store_true", help="tell the measures as JSON")
    checking.set_defaults(run=_check)
    inspecting = commands.add_parser("inspect", help="tell, as JSON, what is found amiss with each part's surface")
    inspecting.add_argument("case", type=Path, metavar="CASE", help="the case folder")
    inspecting.set_defaults(run=_inspect)
    mending = commands.add_parser("mend", help="write a case folder whose surfaces bound solids, mended where need be")
    mending.add_argument("case", type=Path, metavar="CASE", help="the case folder")
    mending.add_argument("--out", type=Path, metavar="CASE2", required=True, help="the case folder to write")
    mending.add_argument("--json", action="store_true", help="tell what was done as JSON")
    mending.set_defaults(run=_mend)
    working = commands.add_parser("work", help="stay, and answer requests on stdin, as the add-on sends them")
    working.set_defaults(run=_work)
    # Its options are the add-on's, which has its own reader of them.
    commands.add_parser("render", help="solve a .blend file and render its result, in Blender", add_help=False)
    packing_up = commands.add_parser("pack", help="build the extension to install in the 3D suite")
    packing_up.add_argument("--platform", choices=(*PLATFORMS, "all"), default="all", help="default: all")
    packing_up.add_argument("--out", type=Path, default=Path("dist"), metavar="DIR", help="where to (default: dist)")
    packing_up.set_defaults(run=_pack)
    return parser


def _solve(options: argparse.Namespace) -> None:
    case = read_case(options.case)
    # What solves is slow to import; a malformed case is told at once.
    from . import pipeline

    solved = pipeline.solve(case, PROGRESS[options.progress])
    out = options.out or options.case / "result"
    try:
        write_result(solved.summary, solved.field, out)
    except OSError as error:
        raise Trouble(
            "limits", f"The result cannot be written to {out}: {error.strerror}.", "Free some space or choose a place."
        ) from error
    PROGRESS[options.progress]("write", 1.0, f"result in {out}")
    if options.progress == "bar":
        print(_told(solved.summary))


def _check(options: argparse.Namespace) -> None:
    case = read_case(options.case)
    from . import pipeline

    with _findings_told(case, options.json):
        measures = pipeline.checked_summary(case, pipeline.check(case))
    print(json.dumps(measures) if options.json else _told_of_check(measures))


def _work(_options: argparse.Namespace) -> None:
    from .worker import work

    work()


def _inspect(options: argparse.Namespace) -> None:
    case = read_case(options.case)
    from . import pipeline

    print(json.dumps({"parts": pipeline.findings(case)}))


def _mend(options: argparse.Namespace) -> None:
    if options.out.resolve() == options.case.resolve():
        raise Trouble("case", "The mended case would take the place of the one given.", "Choose another --out.")
    case = read_case(options.case)
    from . import pipeline

    with _findings_told(case, options.json):
        mended, bodies = pipeline.mend(case)
    measures = pipeline.checked_summary(case, bodies)
    try:
        write_case(mended, options.out)
    except OSError as error:
        raise Trouble(
            "limits",
            f"The case cannot be written to {options.out}: {error.strerror}.",
            "Free some space or choose a place.",
        ) from error
    print(json.dumps(measures) if options.json else f"{_told_of_check(measures)}\nIt was written to {options.out}.")


@contextmanager
def _findings_told(case: Case, as_json: bool) -> Iterator[None]:
    """Where the geometry of a case is refused within, print what was found of each part, if as JSON."""
    from . import pipeline

    try:
        yield
    except Trouble as trouble:
        if as_json and trouble.kind == "geometry":
            print(json.dumps({"state": "unsound", "parts": pipeline.findings(case)}))
        raise


def _told_of_check(measures: dict[str, Any]) -> str:
    lines = []
    for part in measures["parts"]:
        size = " x ".join(f"{1e3 * extent:.4g}" for extent in part["size"])
        lines.append(f"{part['name']}: {size} mm, {1e6 * part['volume']:.4g} cm3, {1e4 * part['area']:.4g} cm2")
        lines += [f"  {finding['message']} {finding['mend']}".rstrip() for finding in part["findings"]]
        lines += [f"  Mending: {sentence}" for sentence in part["mending"]]
    lines += [f"  {tag['name']}: {1e4 * tag['area']:.4g} cm2" for tag in measures["tags"]]
    lines += [
        f"  {' and '.join(pair['parts'])} touch over {1e4 * pair['area']:.4g} cm2" for pair in measures["touching"]
    ]
    lines += [f"Note: {warning}" for warning in measures["warnings"]]
    lines.append("The case is sound." if measures["state"] == "sound" else "The case is sound once mended as told.")
    return "\n".join(lines)


def _pack(options: argparse.Namespace) -> None:
    platforms = list(PLATFORMS) if options.platform == "all" else [options.platform]
    for archive in pack(platforms, options.out):
        print(archive)


def _told(summary: Summary) -> str:
    """The result in a few lines, in degrees Celsius and watts."""
    lines = [""]
    for end in ("hottest", "coldest"):
        lines.append(f"{end:8} {summary[end]['temperature'] - ZERO_CELSIUS:8.2f} °C   on '{summary[end]['part']}'")
    lines.append(f"\n{'tag':20} {'cm2':>9} {'mean °C':>9} {'min °C':>9} {'max °C':>9} {'W in':>10}")
    for tag in summary["tags"]:
        degrees = [tag[key] - ZERO_CELSIUS if tag[key] is not None else float("nan") for key in ("mean", "min", "max")]
        shown = " ".join(f"{degree:9.2f}" for degree in degrees)
        lines.append(f"{tag['name'][:20]:20} {1e4 * tag['area']:9.3f} {shown} {tag['heat']:10.4f}")
    balance = summary["balance"]
    lines.append(f"\nin {balance['in']:.4f} W, out {-balance['out']:.4f} W, gap {balance['relative_gap']:.1e}")
    lines += summary["where_heat_goes"]
    lines += [f"Mended: {sentence}" for sentence in summary["mending"]]
    lines += [f"Note: {warning}" for warning in summary["warnings"]]
    return "\n".join(lines)


def _bar(stage: str, fraction: float, text: str) -> None:
    filled = round(BAR_LENGTH * fraction)
    print(f"{stage:9} [{'#' * filled}{'.' * (BAR_LENGTH - filled)}] {text}", flush=True)


def _json(stage: str, fraction: float, text: str) -> None:
    print(json.dumps({"stage": stage, "fraction": fraction, "text": text}), flush=True)


def _none(stage: str, fraction: float, text: str) -> None:
    pass


PROGRESS: dict[str, Callable[[str, float, str], None]] = {"bar": _bar, "json": _json, "none": _none}
