"""The mesher and the menders, C++ cores all of them, in a process of its own: a crash or a hang is then an exit code.

Called by apart.py as ``python libraries_process.py TOOL INPUT.npz OUTPUT.npz BYTES SECONDS ARGUMENT``; imports nothing
of the project. Exit code 3 and one line on stderr when a tool refuses the surface, 4 when its library is missing, 5
when memory ran out.
"""

from __future__ import annotations

import ctypes
import sys
import types
from collections.abc import Callable

import numpy as np

REFUSED, MISSING, MEMORY = 3, 4, 5
Arrays = dict[str, np.ndarray]


def tetrahedra(surface: Arrays, switches: str) -> Arrays:
    """TetGen: points, facets and markers in; points, cells, regions, faces and markers out."""
    import tetgen

    mesher = tetgen.TetGen(surface["points"], surface["facets"], surface["markers"])
    mesher.tetrahedralize(switches=switches)
    return {
        "points": mesher.node,
        "cells": mesher.elem,
        "regions": mesher.attributes[:, 0],
        "faces": mesher.trifaces,
        "markers": mesher.triface_markers,
    }


def union(surface: Arrays, tolerance: str) -> Arrays:
    """Manifold: shells of positive volume united, ones of negative volume cut away, largest first; then simplified."""
    from manifold3d import Manifold, Mesh64

    result = Manifold()
    for shell in _by_volume(surface):
        points, facets, inward = _alone(surface, shell)
        solid = Manifold(Mesh64(points, facets.astype(np.uint64), face_id=surface["markers"][shell].astype(np.uint64)))
        if solid.status().name != "NoError":
            raise RuntimeError(f"a shell is not a manifold ({solid.status().name})")
        result = result - solid if inward else result + solid
    made = result.simplify(float(tolerance)).to_mesh64()
    return {"points": np.array(made.vert_properties)[:, :3], "facets": np.array(made.tri_verts).astype(np.int64)}


def shell_by_shell(surface: Arrays, _: str) -> Arrays:
    """MeshFix, on each shell: crossing and degenerate faces removed and the gaps closed."""
    from pymeshfix import MeshFix

    points: list[np.ndarray] = []
    facets: list[np.ndarray] = []
    count = 0
    for shell in _by_volume(surface):
        corners, triangles, inward = _alone(surface, shell)
        mender = MeshFix(corners, triangles.astype(np.int32))
        mender.repair(remove_smallest_components=False)
        corners, triangles = np.array(mender.points), np.array(mender.faces).astype(np.int64)
        if not len(triangles):
            continue
        points.append(corners)
        facets.append((triangles[:, ::-1] if inward else triangles) + count)
        count += len(corners)
    if not points:
        raise RuntimeError("nothing is left of the surface")
    return {"points": np.concatenate(points), "facets": np.concatenate(facets)}


def exact_union(surface: Arrays, _: str) -> Arrays:
    """libigl: every crossing resolved in exact arithmetic, what is wound about kept."""
    from igl.copyleft.cgal import mesh_boolean

    none = np.zeros((0, 3))
    facets = np.ascontiguousarray(surface["facets"], np.int64)
    points, facets, _origin = mesh_boolean(surface["points"], facets, none, none.astype(np.int64), "union")
    return {"points": points, "facets": facets}


def envelope(surface: Arrays, share: str) -> Arrays:
    """fTetWild: tetrahedra within an envelope of the surface, a share of its diagonal wide; their outer faces."""
    # The library draws with PyVista and imports it for that alone.
    sys.modules.setdefault("pyvista", types.ModuleType("pyvista"))
    import pytetwild

    points, cells = pytetwild.tetrahedralize(
        surface["points"], surface["facets"].astype(np.int32), edge_length_fac=0.04, epsilon=float(share), num_threads=1
    )
    if not len(cells):
        raise RuntimeError("nothing is left of the surface")
    edges = points[cells[:, 1:]] - points[cells[:, :1]]
    cells = np.where((np.linalg.det(edges) < 0)[:, None], cells[:, [0, 2, 1, 3]], cells)
    faces = cells[:, [(1, 2, 3), (0, 3, 2), (0, 1, 3), (0, 2, 1)]].reshape(-1, 3)
    _, first, uses = np.unique(np.sort(faces, axis=1), axis=0, return_index=True, return_counts=True)
    return {"points": points, "facets": faces[first[uses == 1]].astype(np.int64)}


TOOLS: dict[str, Callable[[Arrays, str], Arrays]] = {
    tool.__name__: tool for tool in (tetrahedra, union, shell_by_shell, exact_union, envelope)
}


def _by_volume(surface: Arrays) -> list[np.ndarray]:
    """The facets of each shell, the shell of largest volume first."""
    shells = [np.flatnonzero(surface["shell"] == number) for number in np.unique(surface["shell"])]
    return sorted(shells, key=lambda shell: -abs(_volume(surface["points"], surface["facets"][shell])))


def _volume(points: np.ndarray, facets: np.ndarray) -> float:
    corners = points[facets] - points[facets[0, 0]]
    return float(np.einsum("fi,fi->", corners[:, 0], np.cross(corners[:, 1], corners[:, 2])) / 6.0)


def _alone(surface: Arrays, shell: np.ndarray) -> tuple[np.ndarray, np.ndarray, bool]:
    """The points and facets of one shell, turned outwards, and whether it looked inwards."""
    used, facets = np.unique(surface["facets"][shell], return_inverse=True)
    points, facets = surface["points"][used], facets.reshape(-1, 3)
    inward = _volume(points, facets) < 0
    return points, np.ascontiguousarray(facets[:, ::-1] if inward else facets), inward


def _bound(size: int, seconds: int) -> None:
    """Let the process take no more memory and processor time than that, and end with the one that started it.

    Linux alone has all three. macOS takes the bound on memory and does not keep it, Windows has none: what bounds a
    tool there is how many points it may add, and the wall clock of the process that waits for it.
    """
    if sys.platform == "linux":
        ctypes.CDLL(None).prctl(1, 9)  # PR_SET_PDEATHSIG, SIGKILL
    try:
        import resource
    except ImportError:  # Windows has neither bound
        return
    for kind, most in ((resource.RLIMIT_AS, size), (resource.RLIMIT_CPU, seconds)):
        try:
            resource.setrlimit(kind, (most, most))
        except (ValueError, OSError):  # a lower bound is in force already
            continue


def main(tool: str, source: str, target: str, size: str, seconds: str, argument: str) -> int:
    _bound(int(size), int(seconds))
    try:
        with np.load(source) as arrays:
            made = TOOLS[tool](dict(arrays), argument)
        np.savez(target, **made)
    except ImportError as error:
        print(str(error).replace("\n", " "), file=sys.stderr)
        return MISSING
    except (RuntimeError, ValueError, MemoryError) as error:
        print((str(error).strip() or type(error).__name__).replace("\n", " "), file=sys.stderr)
        return MEMORY if isinstance(error, MemoryError) or "out of memory" in str(error).lower() else REFUSED
    return 0


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
