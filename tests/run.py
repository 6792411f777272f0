"""Every check of the project: lint, format, types and tests, on each Python the 3D suite is released for.

    python3 tests/run.py                  all of it
    python3 tests/run.py --quick          without the slow tests
    python3 tests/run.py --this-python    on one Python only, the running one if it serves

Needs Python and pip, nothing else; the first run installs the rest into .venv beside pyproject.toml.
"""

from __future__ import annotations

import argparse
import subprocess
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
sys.path.insert(0, str(ROOT / "demo_scenes"))

import environment  # noqa: E402

# What depends on the Python and on its host; the figures of the published cases do not.
ON_EVERY_PYTHON = ["tests/unit", "tests/host"]
NO_TESTS = 5  # pytest's exit code when a selection holds none


@dataclass(frozen=True)
class Check:
    name: str
    command: list[str]
    fine: tuple[int, ...] = (0,)


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--quick", action="store_true", help="leave the slow tests out")
    parser.add_argument("--this-python", action="store_true", help="do not test on a second Python")
    options = parser.parse_args()
    first = environment.chosen_interpreter()
    others = [] if options.this_python else [item for item in environment.interpreters().items() if item != first]
    outcomes = [run(check) for check in code_checks(environment.ready(*first))]
    outcomes += [run(check) for check in test_checks(*first, options.quick, [])]
    for other in others:
        outcomes += [run(check) for check in test_checks(*other, options.quick, ON_EVERY_PYTHON)]
    return report(outcomes, missing=[v for v in environment.VERSIONS if v not in dict([first, *others])])


def code_checks(python: Path) -> Iterator[Check]:
    yield Check("lint", [str(python), "-m", "ruff", "check", "."])
    yield Check("format", [str(python), "-m", "ruff", "format", "--check", "."])
    yield Check("types", [str(python), "-m", "mypy"])


def test_checks(version: str, interpreter: str, quick: bool, folders: list[str]) -> Iterator[Check]:
    """The tests in ``folders``, or all of them when none is named."""
    python = environment.ready(version, interpreter)
    if trouble := environment.host_trouble(python):
        print(trouble, file=sys.stderr)
    # Without the host its tests are skipped, which must not pass for a success.
    yield Check(f"host, Python {version}", [str(python), "-c", "import bpy; print(bpy.app.version_string)"])
    pytest = [str(python), "-m", "pytest", *folders]
    yield Check(f"tests, Python {version}", [*pytest, "-m", "not slow"])
    if not quick:
        yield Check(f"slow tests, Python {version}", [*pytest, "-m", "slow"], fine=(0, NO_TESTS))


def run(check: Check) -> tuple[str, bool, float]:
    """Run one check, its output going to the terminal; name, whether it passed, seconds."""
    print(f"\n== {check.name}", flush=True)
    start = time.perf_counter()
    code = subprocess.run(check.command, cwd=ROOT, stdin=subprocess.DEVNULL).returncode
    return check.name, code in check.fine, time.perf_counter() - start


def report(outcomes: list[tuple[str, bool, float]], missing: list[str]) -> int:
    """Print what came of each check; the exit code."""
    print()
    for name, passed, seconds in outcomes:
        print(f"{'passed' if passed else 'FAILED':8}{name:28}{seconds:7.1f} s")
    for version in missing:
        print(f"{'-':8}Python {version} was not tested")
    failed = sum(not passed for _, passed, _ in outcomes)
    print(f"checks: {len(outcomes) - failed} passed, {failed} failed")
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
