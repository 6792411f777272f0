"""The same mesh and problem in general-purpose libraries, each a process of its own: what it takes, by stage.

Handing the mesh over, and what a library then finds out about its edges and faces on the way, is not counted. Every
library gets several preconditioners; run.py takes the best of them.
"""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
from fluxface.solver.fem.mesh import Mesh
from measuring import ASKED, TRUE_RESIDUAL, Answer, Clock
from problems import CONDUCTIVITY, COOLED, FILM, FLUX, HEATED
from scipy.sparse import csr_array

THREADS = 2


def scikit_fem(mesh: Mesh, order: int, method: str, clock: Clock) -> Answer:
    """Gustafsson & McBain, J. Open Source Software 5 (2020) 2369; with PyAMG, or Intel's direct solver PARDISO."""
    from skfem import Basis, BilinearForm, ElementTetP1, ElementTetP2, FacetBasis, LinearForm, MeshTet
    from skfem.helpers import dot, grad

    library = MeshTet(mesh.nodes.T, mesh.cells.T.astype(np.int64))
    facets = _facets_in(library.facets, mesh)
    with clock.stage("assemble"):
        element = ElementTetP1() if order == 1 else ElementTetP2()
        inside = Basis(library, element, intorder=max(1, 2 * order - 2))
        heated, cooled = (
            FacetBasis(library, element, facets=facets[mesh.boundary_tag == tag], intorder=2 * order)
            for tag in (HEATED, COOLED)
        )
        conduction = BilinearForm(lambda u, v, w: CONDUCTIVITY * dot(grad(u), grad(v)))
        film = BilinearForm(lambda u, v, w: FILM * u * v)
        matrix = (conduction.assemble(inside) + film.assemble(cooled)).tocsr()
        load = LinearForm(lambda v, w: FLUX * v).assemble(heated)
    rise, taken = _pardiso(matrix, load, clock) if method == "pardiso" else _pyamg(matrix, load, method, clock)
    return Answer(rise[inside.nodal_dofs[0]], _residual(matrix, load, rise), taken, len(load))


def _facets_in(facets: np.ndarray, mesh: Mesh) -> np.ndarray:
    """The library's numbers of the boundary's triangles, found by their corners."""
    size = np.int64(len(mesh.nodes))
    known, wanted = (
        (rows[:, 0].astype(np.int64) * size + rows[:, 1]) * size + rows[:, 2]
        for rows in (np.sort(facets.T, axis=1), np.sort(mesh.boundary, axis=1))
    )
    order = np.argsort(known)
    return order[np.searchsorted(known, wanted, sorter=order)]


def _pyamg(matrix: csr_array, load: np.ndarray, method: str, clock: Clock) -> tuple[np.ndarray, int]:
    import pyamg
    from scipy.sparse import csr_matrix

    polynomial = ("chebyshev", {"degree": 2, "iterations": 1})
    set_up = {
        "smoothed aggregation": lambda a: pyamg.smoothed_aggregation_solver(a),
        "smoothed aggregation, Chebyshev": lambda a: pyamg.smoothed_aggregation_solver(
            a, strength=("symmetric", {"theta": 0.0}), presmoother=polynomial, postsmoother=polynomial
        ),
        "smoothed aggregation, strength 0.08": lambda a: pyamg.smoothed_aggregation_solver(
            a, strength=("symmetric", {"theta": 0.08})
        ),
        "Ruge-Stuben": lambda a: pyamg.ruge_stuben_solver(a),
    }[method]
    with clock.stage("set up"):
        levels = set_up(csr_matrix(matrix))
    for asked in ASKED:
        residuals: list[float] = []
        with clock.stage("solve"):
            rise = levels.solve(load, tol=asked, maxiter=500, accel="cg", residuals=residuals)
        if _residual(matrix, load, rise) <= TRUE_RESIDUAL:
            break
    return rise, len(residuals) - 1


def _pardiso(matrix: csr_array, load: np.ndarray, clock: Clock) -> tuple[np.ndarray, int]:
    from pypardiso import PyPardisoSolver
    from scipy.sparse import csr_matrix, triu

    with clock.stage("set up"):
        solver, upper = PyPardisoSolver(mtype=2), csr_matrix(triu(matrix, format="csr"))
        solver.factorize(upper)
    with clock.stage("solve"):
        rise = solver.solve(upper, load)
    return rise, 1


def _residual(matrix: csr_array, load: np.ndarray, rise: np.ndarray) -> float:
    return float(np.linalg.norm(load - matrix @ rise) / np.linalg.norm(load))


def ngsolve(mesh: Mesh, order: int, method: str, clock: Clock) -> Answer:
    """Schoberl, C++11 implementation of finite elements in NGSolve, ASC Report 30/2014, TU Wien."""
    import ngsolve as library
    from netgen.meshing import FaceDescriptor
    from netgen.meshing import Mesh as Plain

    plain = Plain(dim=3)
    plain.AddPoints(np.ascontiguousarray(mesh.nodes))
    plain.SetMaterial(1, "metal")
    plain.AddElements(dim=3, index=1, data=mesh.cells[:, [0, 2, 1, 3]].astype(np.int32), base=0)
    for number, (tag, name) in enumerate(((HEATED, "heated"), (COOLED, "cooled")), 1):
        index = plain.Add(FaceDescriptor(surfnr=number, domin=1, domout=0, bc=number))
        plain.SetBCName(number - 1, name)
        plain.AddElements(dim=2, index=index, data=mesh.boundary[mesh.boundary_tag == tag].astype(np.int32), base=0)
    native = library.Mesh(plain)
    library.SetNumThreads(THREADS)
    with library.TaskManager():
        with clock.stage("assemble"):
            space = library.H1(native, order=order, wb_withedges=False)
            u, v = space.TnT()
            form = library.BilinearForm(space, symmetric=method != "bddc, algebraic coarse")
            form += CONDUCTIVITY * library.grad(u) * library.grad(v) * library.dx
            form += FILM * u * v * library.ds("cooled")
            kind, flags = {
                "h1amg": ("h1amg", {}),
                "bddc": ("bddc", {}),
                "bddc, h1amg coarse": ("bddc", {"coarsetype": "h1amg"}),
                "local": ("local", {}),
                "multigrid, h1amg coarse": ("multigrid", {"coarsetype": "h1amg"}),
            }[method]
            preconditioner = library.Preconditioner(form, kind, **flags)
            load = library.LinearForm(FLUX * v * library.ds("heated")).Assemble()
        with clock.stage("set up"):  # the form's assembly and its preconditioner's set-up are one call
            form.Assemble()
        rise, left = load.vec.CreateVector(), load.vec.CreateVector()
        for asked in ASKED:
            iterations = library.CGSolver(form.mat, preconditioner.mat, maxiter=2000, tol=asked, printrates=False)
            with clock.stage("solve"):
                rise.data = iterations * load.vec
            left.data = load.vec - form.mat * rise
            residual = library.Norm(left) / library.Norm(load.vec)
            if residual <= TRUE_RESIDUAL:
                break
    return Answer(np.array(rise.FV().NumPy())[: len(mesh.nodes)], residual, iterations.iterations, space.ndof)


def mfem(mesh: Mesh, order: int, method: str, clock: Clock) -> Answer:
    """Anderson et al., MFEM: a modular finite element methods library, Comput. Math. Appl. 81 (2021) 42."""
    import mfem.ser as library

    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "given.mesh"
        _write_for_mfem(mesh, path)
        native = library.Mesh(str(path), 1, 0, False)
    with clock.stage("assemble"):
        space = library.FiniteElementSpace(native, library.H1_FECollection(order, 3))
        form, load = library.BilinearForm(space), library.LinearForm(space)
        heated, cooled = library.intArray([1, 0]), library.intArray([0, 1])
        conductivity, film, flux = map(library.ConstantCoefficient, (CONDUCTIVITY, FILM, FLUX))
        form.AddDomainIntegrator(library.DiffusionIntegrator(conductivity))
        form.AddBoundaryIntegrator(library.MassIntegrator(film), cooled)
        load.AddBoundaryIntegrator(library.BoundaryLFIntegrator(flux), heated)
        form.Assemble()
        form.Finalize()
        load.Assemble()
        matrix = form.SpMat()
    with clock.stage("set up"):
        smoother = library.GSSmoother(matrix) if method == "Gauss-Seidel" else library.DSmoother(matrix)
    right = np.array(load.GetDataArray())
    for asked in ASKED:
        rise, iterations = library.Vector(space.GetVSize()), library.CGSolver()
        rise.Assign(0.0)
        iterations.SetOperator(matrix)
        iterations.SetPreconditioner(smoother)
        iterations.SetRelTol(asked)
        iterations.SetMaxIter(5000)
        with clock.stage("solve"):
            iterations.Mult(load, rise)
        product = library.Vector(space.GetVSize())
        matrix.Mult(rise, product)
        residual = float(np.linalg.norm(right - product.GetDataArray()) / np.linalg.norm(right))
        if residual <= TRUE_RESIDUAL:
            break
    return Answer(np.array(rise.GetDataArray())[: len(mesh.nodes)], residual, iterations.GetNumIterations(), len(right))


def _write_for_mfem(mesh: Mesh, path: Path) -> None:
    """Its plain text: attribute, kind (4 tetrahedron, 2 triangle) and corners of each element."""
    with path.open("w") as file:
        file.write(f"MFEM mesh v1.0\n\ndimension\n3\n\nelements\n{len(mesh.cells)}\n")
        np.savetxt(file, np.c_[np.tile([1, 4], (len(mesh.cells), 1)), mesh.cells], fmt="%d")
        file.write(f"\nboundary\n{len(mesh.boundary)}\n")
        np.savetxt(file, np.c_[mesh.boundary_tag + 1, np.full(len(mesh.boundary), 2), mesh.boundary], fmt="%d")
        file.write(f"\nvertices\n{len(mesh.nodes)}\n3\n")
        np.savetxt(file, mesh.nodes, fmt="%.17g")
