"""The packed extension: the two halves, the wheels that the host lacks, and a manifest, in one file to install."""

from __future__ import annotations

import subprocess
import sys
import tempfile
import zipfile
from pathlib import Path

from . import __version__
from .errors import Trouble

# What each of the host's Pythons is given: 3.11 up to 4.5 LTS, 3.13 from 5.1 on. NumPy comes with the host; SciPy 1.15
# is the last that takes the NumPy 1.24 of 4.2 LTS.
WHEELS = {"311": ("scipy==1.15.*", "tetgen", "pyamg"), "313": ("scipy", "tetgen", "pyamg")}
# By the host's name of a platform, the wheel tags it can take, the best first.
PLATFORMS = {
    "linux-x64": ("manylinux_2_28_x86_64", "manylinux_2_27_x86_64", "manylinux_2_17_x86_64", "manylinux2014_x86_64"),
    "windows-x64": ("win_amd64",),
    "macos-arm64": ("macosx_12_0_arm64", "macosx_11_0_arm64", "macosx_14_0_arm64"),
}
ENTRY = '''"""Fluxface: how hot a modelled part gets."""

from .addon import register, unregister

__all__ = ["register", "unregister"]
'''
MANIFEST = """schema_version = "1.0.0"
id = "fluxface"
version = "{version}"
name = "Fluxface"
tagline = "See how hot a modelled part gets, where, and why"
maintainer = "Fluxface contributors"
type = "add-on"
tags = ["3D View", "Object"]
blender_version_min = "4.2.0"
license = ["SPDX:GPL-3.0-or-later"]
platforms = ["{platform}"]
wheels = [
{wheels}
]

[permissions]
files = "Write cases, results and pictures beside the saved file"
"""


def pack(platforms: list[str], out: Path) -> list[Path]:
    """The archives, one for each of the platforms (keys of PLATFORMS), written into ``out``.

    Raises Trouble of kind "limits" when a wheel cannot be had, "case" when the add-on's source is not there.
    """
    root = Path(__file__).parent.parent
    if not (root / "addon" / "__init__.py").is_file():
        raise Trouble("case", f"There is no add-on beside {Path(__file__).parent}.", "Pack from a checkout.")
    out.mkdir(parents=True, exist_ok=True)
    return [_pack_one(root, platform, out) for platform in platforms]


def _pack_one(root: Path, platform: str, out: Path) -> Path:
    archive = out / f"fluxface-{__version__}-{platform}.zip"
    with tempfile.TemporaryDirectory(prefix="fluxface-") as folder:
        wheels = _wheels(platform, Path(folder))
        with zipfile.ZipFile(archive, "w", zipfile.ZIP_DEFLATED) as packed:
            packed.writestr("__init__.py", ENTRY)
            packed.writestr("blender_manifest.toml", _manifest(platform, wheels))
            for half in ("addon", "solver"):
                for file in sorted((root / half).rglob("*")):
                    if file.is_file() and "__pycache__" not in file.parts:
                        packed.write(file, file.relative_to(root).as_posix())
            if (root / "LICENSE").is_file():
                packed.write(root / "LICENSE", "LICENSE")
            for wheel in wheels:
                packed.write(wheel, f"wheels/{wheel.name}", zipfile.ZIP_STORED)
    return archive


def _manifest(platform: str, wheels: list[Path]) -> str:
    listed = "\n".join(f'    "./wheels/{wheel.name}",' for wheel in wheels)
    return MANIFEST.format(version=__version__, platform=platform, wheels=listed)


def _wheels(platform: str, folder: Path) -> list[Path]:
    """The unmodified wheels for all of the host's Pythons, fetched into ``folder``."""
    tags = [f"--platform={tag}" for tag in PLATFORMS[platform]]
    for python, packages in WHEELS.items():
        done = subprocess.run(
            [
                *_pip(), "download", "--quiet", "--no-deps", "--only-binary=:all:",
                f"--python-version={python}", "--implementation=cp", *tags, f"--dest={folder}", *packages,
            ],
            capture_output=True,
            text=True,
        )  # fmt: skip
        if done.returncode:
            raise Trouble(
                "limits",
                f"The wheels for {platform} and Python 3.{python[1:]} could not be had: {_last_line(done.stderr)}.",
                "Check the connection to the package index, and that pip is installed.",
            )
    return sorted(folder.glob("*.whl"))


def _pip() -> list[str]:
    """pip's command: of this Python, or of the one that its environment was made from."""
    pythons = (sys.executable, getattr(sys, "_base_executable", sys.executable))
    with_pip = [
        python for python in pythons if not subprocess.run([python, "-c", "import pip"], capture_output=True).returncode
    ]
    return [*(with_pip or [sys.executable])[:1], "-m", "pip"]


def _last_line(text: str) -> str:
    return (text.strip().splitlines() or ["pip said nothing"])[-1].rstrip(".")
