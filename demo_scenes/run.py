"""Build a demo scene from nothing, tag it, solve it, render its picture and print what came out.

    python3 demo_scenes/run.py                      the work lamp
    python3 demo_scenes/run.py --scene pan_handle   another one
    python3 demo_scenes/run.py --list               what there is

Needs Python and pip, nothing else; the first run installs the rest into .venv beside pyproject.toml.
"""

from __future__ import annotations

import argparse
import ast
import importlib
import sys
from pathlib import Path

import environment

HERE = Path(__file__).resolve().parent
SCENES = ("work_lamp", "pan_handle", "led_module")


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--scene", choices=SCENES, default=SCENES[0], help="which scene (default: %(default)s)")
    parser.add_argument("--list", action="store_true", help="list the scenes and stop")
    parser.add_argument("--out", type=Path, default=HERE / "out", help="folder for what is made (default: %(default)s)")
    options = parser.parse_args()
    if options.list:
        print(*(f"{name:12} {_about(name)}" for name in SCENES), sep="\n")
        return 0
    environment.enter(__file__)
    if trouble := environment.host_trouble(sys.executable):
        print(trouble, file=sys.stderr)
        return 1
    return importlib.import_module("production").produce(options.scene, options.out.resolve())


def _about(scene: str) -> str:
    """The first line of a scene's docstring, read without running it: that would take the 3D suite."""
    tree = ast.parse((HERE / f"{scene}.py").read_text("utf-8"))
    return (ast.get_docstring(tree) or "").splitlines()[0]


if __name__ == "__main__":
    sys.exit(main())
