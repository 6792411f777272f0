"""The solver's command line in a process that ends with its parent: ``python solver_process.py PACKAGE ARGUMENT...``

The parent holds the other end of this process's stdin, so that its end, however it comes, is seen as the end of the
stream. Processes that this one started end with it, when it leads a group of its own.
"""

from __future__ import annotations

import os
import runpy
import signal
import sys
import threading

# How far behind the host's own work the solver stands where there are too few cores for both.
GIVING_WAY = 5


def end_with_parent() -> None:
    # Not through sys.stdin: a lock held on it would abort the interpreter's own end.
    while os.read(0, 1):
        pass
    if hasattr(os, "killpg") and os.getpgrp() == os.getpid():
        os.killpg(os.getpgrp(), signal.SIGKILL)
    os._exit(1)


if __name__ == "__main__":
    package = sys.argv.pop(1)
    if hasattr(os, "nice"):  # elsewhere whoever starts this process sees to it
        os.nice(GIVING_WAY)
    if sys.argv[1] != "work":  # which is written to, and sees the end of the stream by itself
        threading.Thread(target=end_with_parent, daemon=True).start()
    runpy.run_module(package, run_name="__main__", alter_sys=True)
