"""Whether memory will do for a case, told before it is tried."""

from __future__ import annotations

from . import memory
from .case import Case
from .errors import Trouble
from .geometry.tetrahedra import NODES_PER_CORNER
from .keeping import Kept

# The peak of ``fluxface solve`` on a block, less what it takes at rest, measured on Linux x64 with NumPy 1.26 and
# rounded up. Order 1: 3 800 and 3 910 bytes a node at 57 000 and 183 000 nodes, nearly all for making the mesh.
# Order 2: 1 780, 1 800 and 1 910 at 63 000, 254 000 and 993 000 nodes, 2 270 with radiation, and 2 830 where the
# conductivity is a table too; nearly all for solving.
BYTES_AT_REST = 90 << 20
BYTES_PER_NODE = {1: 4_000, 2: 2_900}


def bytes_needed(nodes: float, order: int) -> float:
    """The most that solving a case of so many nodes takes."""
    return BYTES_AT_REST + BYTES_PER_NODE[order] * nodes


def check_room(case: Case, nodes: float, kept: Kept) -> None:
    """Raises Trouble of kind "limits" where memory will not do for so many nodes, even without what is kept."""
    accuracy = case.accuracy
    needed, free = bytes_needed(nodes, accuracy.order), memory.available()
    if free is None or needed <= free:
        return
    kept.forget()
    memory.give_back()
    free = memory.available() or 0
    if needed <= free:
        return
    # Said to two digits, and to fit however they are rounded.
    larger = 1.05 * ((needed - BYTES_AT_REST) / max(free - BYTES_AT_REST, 1)) ** (1 / 3)
    size = f"of {1e3 * larger * accuracy.size:.2g} mm or more" if accuracy.size else f"{larger:.2g} times as large"
    linear = bytes_needed(nodes / NODES_PER_CORNER[2], 1)
    orders = f", or linear elements, which take {linear / 1e9:.2g} GB" if accuracy.order == 2 and linear <= free else ""
    raise Trouble(
        "limits",
        f"The case takes about {nodes:.2g} nodes and {needed / 1e9:.2g} GB of memory; {free / 1e9:.2g} GB are free.",
        f"Choose a mesh size {size}{orders}, or close other programs.",
    )
