"""The project's own Python environment: a ``.venv`` beside pyproject.toml, made at first use and kept from then on.

Standard library alone, since nothing else is there yet.
"""

from __future__ import annotations

import hashlib
import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
VERSIONS = ("3.11", "3.13")  # those that the 3D suite's module is released for
# What the libraries to measure against ask of NumPy, the host cannot do with.
EXTRAS = {"": "host,test", "bench": "test"}
# Those that are installed if they can be, one by one.
OPTIONAL = {"bench": "bench"}
RUNNING = f"{sys.version_info.major}.{sys.version_info.minor}"
STAMP = "fluxface-environment"
SYSTEM_LIBRARIES = "libx11-6 libxi6 libxfixes3 libxrender1 libxkbcommon0 libsm6 libice6 libgl1"


def enter(script: str, purpose: str = "") -> None:
    """Go on with ``script`` and its arguments inside the environment; returns when already there.

    purpose: one of EXTRAS; each but the usual one has an environment of its own.
    """
    python = ready(*chosen_interpreter(), purpose)
    if Path(sys.prefix).resolve() == python.parent.parent:
        return
    command = [str(python), script, *sys.argv[1:]]
    if os.name == "nt":  # there, exec returns to the shell before the new process has ended
        sys.exit(subprocess.run(command).returncode)
    os.execv(python, command)


def chosen_interpreter() -> tuple[str, str]:
    """Version and executable: the running interpreter if its version serves, else the first one found.

    Exits with one sentence when there is none.
    """
    found = interpreters()
    if not found:
        wanted = " or ".join(VERSIONS)
        sys.exit(f"Fluxface needs Python {wanted}, and this is {RUNNING}. Install Python {wanted} and run this again.")
    return next(iter(found.items()))


def interpreters() -> dict[str, str]:
    """A working executable for each version of VERSIONS on this machine, the running one first."""
    found = {RUNNING: getattr(sys, "_base_executable", sys.executable)} if RUNNING in VERSIONS else {}
    for version in VERSIONS:
        working = (path for path in _candidates(version) if _version_of(path) == version)
        if version not in found and (path := next(working, None)):
            found[version] = path
    return found


def _candidates(version: str) -> Iterator[str]:
    name = f"python{version}"
    for folder in os.get_exec_path():
        if path := shutil.which(name, path=folder):
            yield path
    yield from map(str, sorted(Path.home().glob(f".pyenv/versions/{version}.*/bin/python")))


def _version_of(python: str) -> str | None:
    """None when it does not run: a version manager's shim can be on the path without a Python behind it."""
    question = "import sys, venv; print(f'{sys.version_info.major}.{sys.version_info.minor}')"
    try:
        answer = subprocess.run([python, "-c", question], capture_output=True, text=True, timeout=30)
    except (OSError, subprocess.TimeoutExpired):
        return None
    return answer.stdout.strip() if answer.returncode == 0 else None


def ready(version: str, interpreter: str, purpose: str = "") -> Path:
    """The Python of an environment that holds what pyproject.toml asks for; made, remade or brought up to date first.

    Exits with one sentence when it cannot be made.
    """
    folder = _folder_for(version, purpose)
    python = folder / ("Scripts/python.exe" if os.name == "nt" else "bin/python")
    wanted = _stamp(version)
    if _read_stamp(folder) == wanted:
        return python
    try:
        if _made_for(folder) != version:
            _create(folder, version, interpreter)
        else:
            print(f"Bringing {folder.name} up to date with pyproject.toml.", flush=True)
        (folder / STAMP).write_text("unfinished\n", "utf-8")
        _install(python, interpreter, "--editable", f"{ROOT}[{EXTRAS[purpose]}]")
        _install_some(python, interpreter, OPTIONAL.get(purpose))
    except (OSError, subprocess.CalledProcessError) as error:
        sys.exit(f"{folder.name} could not be made: {error}. Mend what the lines above say and run this again.")
    except KeyboardInterrupt:
        sys.exit(f"{folder.name} is half made; the next run makes it anew.")
    (folder / STAMP).write_text(wanted, "utf-8")
    return python


def _folder_for(version: str, purpose: str) -> Path:
    """``.venv`` for the version it was first made for, ``.venv-X.Y`` for any other; ``.venv-PURPOSE`` for a purpose."""
    if purpose:
        return ROOT / f".venv-{purpose}"
    first = ROOT / ".venv"
    return first if _made_for(first) in (None, version) else ROOT / f".venv-{version}"


def _stamp(version: str) -> str:
    """What a finished environment was made for and from; an environment cannot be moved, so its place counts too."""
    contents = hashlib.sha256((ROOT / "pyproject.toml").read_bytes() + str(ROOT).encode()).hexdigest()
    return f"{version}\n{contents}\n"


def _read_stamp(folder: Path) -> str | None:
    try:
        return (folder / STAMP).read_text("utf-8")
    except OSError:
        return None


def _made_for(folder: Path) -> str | None:
    """The Python version of a finished environment, None when it is half made or not there."""
    first = (_read_stamp(folder) or "").partition("\n")[0]
    return first if first in VERSIONS else None


def _create(folder: Path, version: str, interpreter: str) -> None:
    if folder.exists() and _read_stamp(folder) is None:
        sys.exit(f"{folder} is there and was not made by this command. Move it away and run this again.")
    print(f"Making {folder.name} for Python {version}: some 400 MB to fetch, a few minutes, only once.", flush=True)
    shutil.rmtree(folder, ignore_errors=True)
    folder.mkdir()
    (folder / STAMP).write_text("unfinished\n", "utf-8")
    # Pip is not copied in: Debian leaves out the module that would do it.
    subprocess.run([interpreter, "-m", "venv", "--without-pip", str(folder)], check=True)


def _install(python: Path, interpreter: str, *what: str) -> None:
    pip = [interpreter, "-m", "pip", "--python", str(python), "--disable-pip-version-check", "-qq"]
    subprocess.run([*pip, "install", *what], check=True, stdin=subprocess.DEVNULL)


def _install_some(python: Path, interpreter: str, extra: str | None) -> None:
    """What can be had of an extra; what cannot is told and left out."""
    if extra is None:
        return
    import tomllib  # not in every Python that starts a command of ours

    project = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]
    for requirement in project["optional-dependencies"][extra]:
        try:
            _install(python, interpreter, requirement)
        except subprocess.CalledProcessError:
            print(f"Left out, as it could not be installed: {requirement}", flush=True)


def host_trouble(python: str | Path) -> str | None:
    """Why the 3D suite's module does not load in ``python``, in one sentence; None when it does."""
    tried = subprocess.run([python, "-c", "import bpy"], capture_output=True, text=True)
    if tried.returncode == 0:
        return None
    reason = (tried.stderr.strip().splitlines() or [f"it ended with code {tried.returncode}"])[-1]
    advice = f" On Debian and Ubuntu: apt-get install {SYSTEM_LIBRARIES}." if ".so" in reason else ""
    return f"The 3D suite's module bpy does not load: {reason}.{advice}"
