"""The same equations by general libraries alone: scikit-fem's assembly, then LU, Cholesky or algebraic multigrid.

One child assembles and writes the reduced system down; each solver reads it in a child of its own, so that the
assembly is paid and timed once. Each is used as its documents show it, at its better settings: symmetric Cholesky
rather than LU for PARDISO, the rigid-body modes and 3 x 3 blocks for multigrid.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import scipy.sparse as sp

from solver_timing import meshes
from solver_timing.child import Tell
from solver_timing.measure import Clock, PeakMemory, answer
from solver_timing.shapes import SHAPES

if TYPE_CHECKING:
    from mesher.named_mesh import NamedMesh

NAMES = {"lu": "SciPy LU", "pardiso": "PARDISO Cholesky", "amg": "PyAMG + CG"}
FORCE = np.array([0.0, 0.0, -1000.0])
"""N, on the end face: the first case of every shape."""
AMG_TOLERANCE = 1e-8
"""Of the residual; looser ones leave more than 1e-6 of the displacement of a slender part."""


def assemble(job: dict[str, Any], tell: Tell) -> None:
    """scikit-fem's stiffness matrix, load and condensed system of the mesh, written to ``system``."""
    from skfem import Basis, ElementTetP2, ElementVector, LinearForm, condense
    from skfem.models.elasticity import lame_parameters, linear_elasticity

    part = meshes.part_of(SHAPES[job["shape"]])
    lam, mu = lame_parameters(part.material.E, part.material.nu)

    def system(mesh: Any) -> tuple[Any, ...]:
        straight, skfem_mesh = _skfem_mesh(mesh)
        order = 2 if straight else None  # of quadrature: 2 is exact for straight elements; None is the default
        basis = Basis(skfem_mesh, ElementVector(ElementTetP2()), intorder=order)
        K = linear_elasticity(lam, mu).assemble(basis)
        end = basis.mesh.facets_satisfying(lambda x: np.isclose(x[0], part.members[0].end[0]), boundaries_only=True)
        facets = basis.boundary(end)
        area = facets.dx.sum()
        f = LinearForm(lambda v, w: sum(force / area * v[i] for i, force in enumerate(FORCE))).assemble(facets)
        held = basis.get_dofs(lambda x: np.isclose(x[0], 0.0)).flatten()
        return condense(K, f, D=held)

    system(meshes.structured(meshes.part_of(SHAPES["box"]), (4, 1, 1)))
    mesh = meshes.load(Path(job["mesh"]))
    memory, clock = PeakMemory(), Clock()
    A, b, _, free = system(mesh)
    seconds, processor = clock.read()
    tell(assembly=seconds, processor=processor, memory=memory.now())
    A = A.tocsr()
    part_file = Path(job["system"]).with_suffix(".part.npz")
    np.savez(
        part_file,
        data=A.data,
        indices=A.indices,
        indptr=A.indptr,
        b=b,
        free=free,
        nodes=mesh.nodes,
        end=np.unique(mesh.facets["bar.end"]),
    )
    part_file.rename(job["system"])


def _skfem_mesh(mesh: NamedMesh) -> tuple[bool, Any]:
    """Whether all elements are straight, and scikit-fem's mesh (straight: the cheaper kind), numbered as ours."""
    from skfem import MeshTet

    from mesher.numbering import TET_EDGES
    from mesher.skfem_mesh import to_skfem

    curved = to_skfem(mesh)
    ends = mesh.nodes[:, mesh.tets[np.array(TET_EDGES)]]  # (3, 6, 2, m)
    if not np.allclose(ends.mean(axis=2), mesh.nodes[:, mesh.tets[4:]], rtol=0, atol=1e-9 * np.ptp(mesh.nodes)):
        return False, curved
    straight = MeshTet(mesh.nodes[:, : curved.nvertices], curved.t, validate=False)
    straight._t2e, straight._edges = curved._t2e, curved._edges
    return True, straight


def _system(job: dict[str, Any]) -> dict[str, Any]:
    with np.load(job["system"], allow_pickle=False) as stored:
        data = {name: stored[name] for name in stored.files}
    n = data["b"].size
    data["A"] = sp.csr_matrix((data.pop("data"), data.pop("indices"), data.pop("indptr")), shape=(n, n))
    return data


def _told(tell: Tell, system: dict[str, Any], x: Any, clock: Clock, memory: PeakMemory, **more: Any) -> None:
    (seconds, processor), peak = clock.read(), memory.now()
    A, b = system["A"], system["b"]
    u = np.zeros(system["nodes"].size)
    u[system["free"]] = x
    residual = float(np.linalg.norm(b - A @ x) / np.linalg.norm(b))
    end = system["end"]
    tell(solve=seconds, processor=processor, memory=peak, residual=residual, **answer(u.reshape(-1, 3).T, end), **more)


def lu(job: dict[str, Any], tell: Tell) -> None:
    """SciPy's sparse LU as it is."""
    import scipy.sparse.linalg as spla

    spla.splu(sp.eye(10, format="csc"))
    system = _system(job)
    memory, clock = PeakMemory(), Clock()
    x = spla.splu(system["A"].tocsc()).solve(system["b"])
    _told(tell, system, x, clock, memory)


def pardiso(job: dict[str, Any], tell: Tell) -> None:
    """PARDISO's Cholesky on the upper triangle, through pypardiso."""
    from pypardiso import PyPardisoSolver

    solver = PyPardisoSolver(mtype=2)
    solver.solve(sp.eye(10, format="csr"), np.ones(10))
    solver.free_memory(everything=True)
    system = _system(job)
    memory, clock = PeakMemory(), Clock()
    x = solver.solve(sp.triu(system["A"], format="csr"), system["b"])
    _told(tell, system, x, clock, memory)


def amg(job: dict[str, Any], tell: Tell) -> None:
    """Smoothed aggregation with the six rigid motions, as preconditioner of conjugate gradients."""
    import pyamg

    def solve(A: sp.csr_matrix, b: Any, motions: Any) -> tuple[Any, int]:
        history: list[float] = []
        blocks = A.tobsr((3, 3))
        levels = pyamg.smoothed_aggregation_solver(
            blocks, B=motions, strength=("symmetric", {"theta": 0.05}), max_coarse=500
        )
        x = levels.solve(b, tol=AMG_TOLERANCE, maxiter=1000, accel="cg", residuals=history)
        return x, len(history) - 1

    solve(sp.eye(30, format="csr"), np.ones(30), np.ones((30, 1)))
    system = _system(job)
    free = system["free"]
    motions = rigid_motions(system["nodes"])[free]
    memory, clock = PeakMemory(), Clock()
    x, iterations = solve(system["A"], system["b"], motions)
    _told(tell, system, x, clock, memory, iterations=iterations)


def rigid_motions(nodes: Any) -> Any:
    """(3 n, 6) three displacements and three rotations about the middle, scaled to the part's size."""
    x, y, z = (nodes - nodes.mean(axis=1, keepdims=True)) / np.ptp(nodes)
    out = np.zeros((nodes.shape[1], 3, 6))
    out[:, range(3), range(3)] = 1.0
    out[:, 1, 3], out[:, 2, 3] = -z, y
    out[:, 0, 4], out[:, 2, 4] = z, -x
    out[:, 0, 5], out[:, 1, 5] = -y, x
    return out.reshape(-1, 6)
