"""The project's own solver on a given mesh, timed by stage."""

from __future__ import annotations

import numpy as np
import problems
from cases import case_of, metal
from fluxface.solver.fem import linear_algebra
from fluxface.solver.fem.mesh import Mesh, ordered, quadratic
from fluxface.solver.fem.multigrid import Hierarchy, hierarchy
from fluxface.solver.fem.products import Rows, in_rows
from fluxface.solver.physics import steady
from fluxface.solver.physics.problem import put_together
from measuring import TRUE_RESIDUAL, Answer, Clock


def solve(mesh: Mesh, order: int, _: str, clock: Clock) -> Answer:
    corners = mesh.nodes
    with clock.stage("order"):
        mesh = ordered(mesh)
        mesh = mesh if order == 1 else quadratic(mesh)
    with clock.stage("assemble"):
        case = case_of(problems.block(), problems.TAGS, material=metal(problems.CONDUCTIVITY), order=order)
        system = steady.assembled(put_together(case, mesh), problems.AMBIENT)
        interpolation = steady.midside_interpolation(mesh) if order == 2 else None
    with clock.stage("set up"):
        preconditioner = hierarchy(system.matrix, interpolation)
    with clock.stage("solve"):
        rise, taken = linear_algebra.conjugate_gradients(
            system.matrix, system.load[:, None], TRUE_RESIDUAL, preconditioner.cycle
        )
    residual = system.load - system.matrix @ rise[:, 0]
    rise_at = np.empty(len(corners))
    rise_at[np.lexsort(corners.T)] = rise[np.lexsort(mesh.nodes[: len(corners)].T), 0]
    share = float(np.linalg.norm(residual) / np.linalg.norm(system.load))
    return Answer(rise_at, share, taken, len(rise), taken * _moved(in_rows(system.matrix), preconditioner))


def _moved(matrix: Rows, preconditioner: Hierarchy) -> float:
    """Bytes of one iteration: the entries of all matrices, and what its products read and write."""
    products = [matrix]
    for level in preconditioner.levels:
        products += [level.matrix] * 3 + [level.carried, level.prolongation, level.restriction]
    return float(sum(12 * b.nnz + 8 * b.shape[1] + 20 * b.shape[0] for rows in products for b in rows.blocks))
