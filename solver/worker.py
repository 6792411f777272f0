"""``fluxface work``: a solver that stays, with its libraries loaded and its last case at hand.

Requests are JSON objects, one a line on stdin: ``{"id": 1, "do": "solve", "case": PATH, "out": PATH}``, or "respond"
for the responses to its loads. Each is answered on stdout by lines of progress and a last one, ``{"id": 1, "code": 0}``
or ``{"id": 1, "code": 3, "trouble": {...}}``, with the exit code and the trouble that ``fluxface solve`` would have
ended with. When stdin ends the worker ends, whatever it is at.
"""

from __future__ import annotations

import json
import os
import queue
import signal
import sys
import threading
import traceback
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from . import memory, pipeline
from .case import read_case
from .errors import Trouble
from .keeping import Kept
from .result import write_responses, write_result

# Nobody has asked for so long: the memory is of more use elsewhere.
SECONDS_IDLE = 1800.0
# What a larger case leaves behind would fill a designer's machine.
MOST_NODES_KEPT = 500_000


def work() -> None:
    """Answer requests until stdin ends or nobody asks any more."""
    requests: queue.SimpleQueue[str] = queue.SimpleQueue()
    threading.Thread(target=_listen, args=(requests,), daemon=True).start()
    kept = Kept()
    while True:
        try:
            line = requests.get(timeout=SECONDS_IDLE)
        except queue.Empty:
            return
        _say(answer(line, kept))
        memory.give_back()


def answer(line: str, kept: Kept) -> dict[str, Any]:
    """Do what a request says; the last line of its answer."""
    number = None
    try:
        request = json.loads(line)
        number = request["id"]
        do = {"solve": _solve, "respond": _respond}[request["do"]]
        case, out = Path(request["case"]), Path(request["out"])
    except (ValueError, KeyError, TypeError) as error:
        trouble = Trouble(
            "case", f"The request cannot be understood: {error!r}.", "Look at how 'fluxface work' is asked."
        )
        return _failed(number, trouble)
    try:
        do(number, case, out, kept)
    except Trouble as trouble:
        return _failed(number, trouble)
    except MemoryError:
        kept.forget()
        return _failed(number, Trouble("limits", "There is not enough memory for this case.", "Choose a larger size."))
    except Exception as error:  # whatever it is, the next request shall be answered
        kept.forget()
        traceback.print_exc()
        said = f"The solver broke off with an error of its own: {type(error).__name__}: {error}"
        return _failed(number, Trouble("limits", said, "Run again; if it happens again, report these words."))
    return {"id": number, "code": 0}


def _solve(number: Any, case: Path, out: Path, kept: Kept) -> None:
    def progress(stage: str, fraction: float, text: str) -> None:
        _say({"id": number, "stage": stage, "fraction": fraction, "text": text})

    solved = pipeline.solve(read_case(case), progress, kept)
    if len(solved.field.nodes) > MOST_NODES_KEPT:
        kept.forget()
    with _told_if_unwritten(out):
        write_result(solved.summary, solved.field, out)


def _respond(_number: Any, case: Path, out: Path, kept: Kept) -> None:
    """Put the responses of a case that was solved into its result folder."""
    made = pipeline.respond(read_case(case), kept)
    with _told_if_unwritten(out):
        write_responses(made, out)


@contextmanager
def _told_if_unwritten(out: Path) -> Iterator[None]:
    try:
        yield
    except OSError as error:
        raise Trouble(
            "limits", f"The result cannot be written to {out}: {error.strerror}.", "Free some space or choose a place."
        ) from error


def _failed(number: Any, trouble: Trouble) -> dict[str, Any]:
    return {"id": number, "code": trouble.exit_code, "trouble": json.loads(trouble.as_json())}


def _say(document: dict[str, Any]) -> None:
    print(json.dumps(document), flush=True)


def _listen(requests: queue.SimpleQueue[str]) -> None:
    """Take in requests, a line each; the end of the stream is the end of whoever asked."""
    # Not through sys.stdin: a lock held on it would abort the interpreter's own end.
    left = b""
    while read := os.read(0, 1 << 16):
        *lines, left = (left + read).split(b"\n")
        for line in lines:
            requests.put(line.decode("utf-8", "replace"))
    sys.stdout.flush()
    if hasattr(os, "killpg") and os.getpgrp() == os.getpid():
        os.killpg(os.getpgrp(), signal.SIGKILL)
    os._exit(0)
