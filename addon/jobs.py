"""The solver as a subprocess: started, watched without waiting, and ended with all it started."""

from __future__ import annotations

import atexit
import contextlib
import importlib.util
import itertools
import json
import os
import queue
import shutil
import signal
import subprocess
import sys
import tempfile
import threading
from collections import deque
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import IO, Any

from ..solver import errors
from ..solver.errors import Trouble
from .preferences import threads

# What the solver imports and the host may keep where only the host's own interpreter looks.
LIBRARIES = ("numpy", "scipy", "tetgen", "pyamg")
SOLVER = Path(errors.__file__).parent
THREADS_VARIABLE = "FLUXFACE_THREADS"
STDERR_LINES = 50
SECONDS_TO_END = 5.0


@dataclass(frozen=True)
class Progress:
    """stage: a word of the contract. fraction: 0..1 of that stage."""

    stage: str
    fraction: float
    text: str


@dataclass(frozen=True)
class Ending:
    """trouble: None = it went well. cancelled: ended by us, so that there is nothing to complain of.

    said: the last line of stdout, where the answer of a command stands that gives one.
    """

    trouble: Trouble | None = None
    cancelled: bool = False
    said: str = ""


class Job:
    """One run of the solver's command line; every method returns at once."""

    def __init__(self, command: Sequence[str], environment: dict[str, str] | None = None) -> None:
        """Raises Trouble when the program cannot be started."""
        self._cancelled = False
        self._lines: queue.SimpleQueue[str] = queue.SimpleQueue()
        self._stderr: deque[str] = deque(maxlen=STDERR_LINES)
        self._said = ""
        self.progress = Progress("mesh", 0.0, "Starting")
        # What the solver leaves in its temporary folder when it is killed goes with the folder.
        self._scratch = tempfile.TemporaryDirectory(prefix="fluxface-", ignore_cleanup_errors=True)
        temporary = dict.fromkeys(("TMPDIR", "TEMP", "TMP"), self._scratch.name)
        try:
            self._process = subprocess.Popen(
                command,
                env={**(environment or os.environ), **temporary},
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=subprocess.PIPE,
                text=True,
                encoding="utf-8",
                errors="replace",
                **_own_group(),
            )
        except OSError as error:
            raise Trouble(
                "limits",
                f"The solver could not be started: {error.strerror}.",
                "Install the add-on again from its package.",
            ) from error
        _live.add(self)
        self._readers = (
            _reader(self._process.stdout, self._lines.put),
            _reader(self._process.stderr, self._stderr.append),
        )

    def poll(self) -> Ending | None:
        """Take in what the solver has said since the last call; the ending once there is one."""
        code = self._process.poll()
        ended = code is not None and not any(reader.is_alive() for reader in self._readers)
        while not self._lines.empty():
            self._take_in(self._lines.get())
        if not ended:
            return None
        with contextlib.suppress(OSError):  # a request that was not taken any more
            self._process.stdin.close()
        self._scratch.cleanup()
        _live.discard(self)
        if self._cancelled:
            return Ending(cancelled=True)
        return Ending(said=self._said) if code == 0 else Ending(_trouble(code, self._stderr))

    def _take_in(self, line: str) -> None:
        self._said = line
        self.progress = _progress(line) or self.progress

    @property
    def was_cancelled(self) -> bool:
        return self._cancelled

    def cancel(self) -> None:
        """End the solver and all it started; a second call does nothing more."""
        self._cancelled = True
        _kill(self._process)

    def wait(self) -> None:
        """Return when the solver has ended, or after SECONDS_TO_END."""
        with contextlib.suppress(subprocess.TimeoutExpired):
            self._process.wait(SECONDS_TO_END)


class Worker(Job):
    """The solver that stays: it is asked, and goes on until it is told to end or nobody asks any more."""

    def __init__(self) -> None:
        """Raises Trouble when the solver or one of its libraries is missing."""
        self.threads = threads()
        super().__init__(command("work"), environment())
        self._numbers = itertools.count(1)
        self.answers: dict[int, dict[str, Any]] = {}

    def ask(self, **request: str) -> Request:
        """Raises OSError when the worker has ended."""
        number = next(self._numbers)
        self._process.stdin.write(json.dumps({"id": number, **request}) + "\n")
        self._process.stdin.flush()
        self.progress = Progress("mesh", 0.0, "Starting")
        return Request(self, number)

    def _take_in(self, line: str) -> None:
        super()._take_in(line)
        said = _answer(line)
        if said is not None:
            self.answers[said["id"]] = said

    @property
    def has_ended(self) -> bool:
        return self._process.poll() is not None


class Request:
    """One thing asked of the worker, seen as a job of its own."""

    def __init__(self, worker: Worker, number: int) -> None:
        self._worker, self._number = worker, number

    @property
    def progress(self) -> Progress:
        return self._worker.progress

    def poll(self) -> Ending | None:
        """Take in what the worker has said since the last call; the ending of this request once there is one."""
        ended = self._worker.poll()
        answer = self._worker.answers.pop(self._number, None)
        if answer is not None and not self._worker.was_cancelled:
            return Ending() if answer["code"] == 0 else Ending(_trouble_of(answer["trouble"]))
        if ended is None:
            return None
        return ended if ended.cancelled or ended.trouble else Ending(_trouble(0, ()))

    def cancel(self) -> None:
        """End the worker with all it started: the next request starts another."""
        self._worker.cancel()

    def wait(self) -> None:
        self._worker.wait()


# The processes that must not outlive the host; no other code reads it.
_live: set[Job] = set()


@atexit.register
def stop_all() -> None:
    """End every job that still runs."""
    for job in list(_live):
        _end(job)


def _end(job: Job) -> None:
    job.cancel()
    job.wait()
    _live.discard(job)


def solve(case: Path, result: Path) -> Request:
    """Have the worker solve a case folder; one is started where none stays from an earlier run.

    Raises Trouble when it or one of its libraries is missing.
    """
    return _ask("solve", case, result)


def respond(case: Path, result: Path) -> Request:
    """Have the worker put the responses to its loads into the result folder of a case that it has solved.

    Raises Trouble when the solver or one of its libraries is missing.
    """
    return _ask("respond", case, result)


def _ask(do: str, case: Path, result: Path) -> Request:
    request = {"do": do, "case": str(case.resolve()), "out": str(result.resolve())}
    for worker in [job for job in _live if isinstance(job, Worker)]:
        if worker.threads == threads() and not worker.has_ended:
            with contextlib.suppress(OSError):
                return worker.ask(**request)
        _end(worker)
    return Worker().ask(**request)


def check(case: Path) -> Job:
    """Start the solver's check of a case folder; what it found is the ending's ``said``, as JSON.

    Raises Trouble when it or one of its libraries is missing.
    """
    return Job(command("check", str(case), "--json"), environment())


def inspect(case: Path) -> Job:
    """Start looking for what is amiss with the surfaces of a case folder; the findings are the ending's ``said``.

    Raises Trouble when the solver or one of its libraries is missing.
    """
    return Job(command("inspect", str(case)), environment())


def mend(case: Path, mended: Path) -> Job:
    """Start writing the case folder ``mended``; the measures of what was done are the ending's ``said``, as JSON.

    Raises Trouble when the solver or one of its libraries is missing.
    """
    return Job(command("mend", str(case), "--out", str(mended), "--json"), environment())


def command(*arguments: str) -> list[str]:
    """The solver's command line; -P keeps what lies in the working folder from being imported."""
    return [sys.executable, "-P", str(Path(__file__).with_name("solver_process.py")), SOLVER.name, *arguments]


def environment(libraries: Iterable[str] = LIBRARIES) -> dict[str, str]:
    """The host's environment, with the folders of the solver and of its libraries where Python looks first.

    Raises Trouble when a library is missing.
    """
    folders = [str(SOLVER.parent)]
    for library in libraries:
        found = importlib.util.find_spec(library)
        if found is None or not found.origin:
            raise Trouble(
                "limits", f"The solver's library '{library}' is missing.", "Install the add-on again from its package."
            )
        folders.append(str(Path(found.origin).parent.parent))
    inherited = os.environ.get("PYTHONPATH")
    path = os.pathsep.join(dict.fromkeys([*folders, *([inherited] if inherited else [])]))
    return {
        **os.environ,
        "PYTHONPATH": path,
        "PYTHONIOENCODING": "utf-8",
        "PYTHONDONTWRITEBYTECODE": "1",
        **({THREADS_VARIABLE: str(threads())} if threads() else {}),
    }


def clear_remains(result: Path) -> None:
    """After an end in mid-writing: put an older result back in its place and remove half-written ones."""
    for beside in result.parent.glob(f".{result.name}-*"):
        stale = beside / "stale"
        if stale.exists() and not result.exists():
            stale.rename(result)
        shutil.rmtree(beside, ignore_errors=True)


def _reader(stream: IO[str], take) -> threading.Thread:
    def read() -> None:
        for line in stream:
            take(line.rstrip("\n"))
        stream.close()

    thread = threading.Thread(target=read, daemon=True)
    thread.start()
    return thread


def _progress(line: str) -> Progress | None:
    """A line of progress; whatever a library prints among them is none."""
    try:
        said = json.loads(line)
        return Progress(str(said["stage"]), float(said["fraction"]), str(said["text"]))
    except (ValueError, KeyError, TypeError):
        return None


def _trouble(code: int, stderr: Iterable[str]) -> Trouble:
    """What the solver said on its last line; if it said nothing of the kind, that it broke off."""
    lines = [line for line in stderr if line.strip()]
    try:
        return _trouble_of(json.loads(lines[-1]))
    except (IndexError, ValueError, KeyError, TypeError):
        pass
    if lines and code > 0:
        return Trouble(
            "limits",
            f"The solver broke off with an error of its own: {lines[-1].strip()}",
            "Run again; if it happens again, report these words.",
        )
    return Trouble(
        "limits",
        "The solver was stopped before it was done.",
        "Run again; if it happens again, give a coarser mesh: memory may not suffice.",
    )


def _trouble_of(said: dict[str, Any]) -> Trouble:
    where = said["where"]
    return Trouble(said["kind"], said["message"], said["mend"], where["faces"], where["points"])


def _answer(line: str) -> dict[str, Any] | None:
    """The last line of an answer of the worker; progress and what a library prints are none."""
    try:
        said = json.loads(line)
        return said if isinstance(said, dict) and {"id", "code"} <= said.keys() else None
    except ValueError:
        return None


def _own_group() -> dict:
    if sys.platform == "win32":
        return {
            "creationflags": subprocess.CREATE_NEW_PROCESS_GROUP
            | subprocess.CREATE_NO_WINDOW
            | subprocess.BELOW_NORMAL_PRIORITY_CLASS
        }
    return {"start_new_session": True}


def _kill(process: subprocess.Popen) -> None:
    if process.poll() is not None:
        return
    if sys.platform == "win32":
        subprocess.run(["taskkill", "/T", "/F", "/PID", str(process.pid)], capture_output=True, check=False)
    else:
        with contextlib.suppress(ProcessLookupError):
            os.killpg(process.pid, signal.SIGKILL)
