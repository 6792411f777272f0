"""TetGen in a process of its own: a crash of its C++ core is then an exit code, not a lost run.

Called by tetrahedra.py as ``python tetgen_process.py INPUT.npz OUTPUT.npz SWITCHES``; imports nothing of the project.
Exit code 3 and one line on stderr when TetGen refuses the surface.
"""

from __future__ import annotations

import sys

import numpy as np
import tetgen

REFUSED = 3


def main(source: str, target: str, switches: str) -> int:
    with np.load(source) as surface:
        mesher = tetgen.TetGen(surface["points"], surface["facets"], surface["markers"])
    try:
        mesher.tetrahedralize(switches=switches)
    except RuntimeError as error:
        print(str(error).strip().replace("\n", " "), file=sys.stderr)
        return REFUSED
    np.savez(
        target,
        points=mesher.node,
        cells=mesher.elem,
        regions=mesher.attributes[:, 0],
        faces=mesher.trifaces,
        markers=mesher.triface_markers,
    )
    return 0


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
