"""``python -m fluxface.solver``: the command line, in a process of its own."""

import os
import sys

# Dense algebra has little to do here, and its idle threads would wait in a busy loop. Read when NumPy is loaded.
for variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(variable, "1")

from .command_line import main as command_line  # noqa: E402
from .memory import keep_freed_memory  # noqa: E402


def main() -> int:
    """The exit code."""
    keep_freed_memory()
    return command_line()


if __name__ == "__main__":
    sys.exit(main())
