"""The held system K u + C^T m = f with u = T y + g and C u = d: set up once, solved for any right-hand sides."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.factor import GAUGE_ALLOWED, RESIDUAL_ALLOWED, NotPositive, TooLarge
from fem.solid.held import free_motions
from fem.solid.shape import Array
from fem.solid.solver import Choice, Solver
from fem.solid.solver.cholesky import CholeskySolver, spring_unknowns
from fem.solid.solver.choose import choose
from fem.solid.solver.conjugate import Stalled
from fem.solid.solver.elimination import Elimination, block_matrix
from fem.solid.solver.gauge import bending_field, rounding_of_product
from fem.solid.solver.multigrid import MultigridSolver
from fem.solid.support import Constraints
from geometry.budget import Budget
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh


@dataclass(frozen=True, slots=True)
class Solution:
    """u (3 n, c) mm; mean_forces (rows, c) generalised force of each mean row *on the part*; residual and gauge.

    `residual_allowed` is `RESIDUAL_ALLOWED`, or more where rounding alone makes more of it; then `correction` is
    what one further step of refinement would change the displacements by, relative to the largest.
    """

    u: Array
    mean_forces: Array
    residual: float
    gauge: float
    backend: str
    residual_allowed: float = RESIDUAL_ALLOWED
    correction: float = 0.0
    reason: str = ""


class OffGate(SolveError):
    """A solution that did not pass; `short` says why in a few words."""

    def __init__(self, short: str, advice: str) -> None:
        self.short = short
        super().__init__(short + advice)


NOT_POSITIVE = (
    "The stiffness matrix is not positive definite although the supports hold every rigid motion: the mesh has a "
    "detached piece or an element that is nearly flat. Mesh the part again."
)


class HeldSystem:
    """A part's stiffness on the motions that its supports leave.

    Parameters
    ----------
    K
        Stiffness (3 n, 3 n), N/mm (or any matrix of its kind that is positive definite on the held motions).
    choice
        ``auto``, or the solver that is wanted.
    backend
        Of the direct solver: ``auto`` (PARDISO where it is installed), ``pardiso`` or ``lu``.
    cases
        Right-hand sides, where they are all that the system will be asked for.

    Attributes
    ----------
    free
        f, the number of unknowns y.
    T
        (3 n, f) of u = T y + g.
    mean_rows
        (rows, f) CSR: C T, the rows of mean values that y meets; the inverse gives motions with C T y = 0.

    Raises
    ------
    SolveError
        When the part is not held (its free motions are named), the matrix is not positive definite, or the memory
        would not suffice.
    """

    def __init__(
        self,
        K: BlockMatrix | sp.csr_matrix,
        constraints: Constraints,
        mesh: NamedMesh,
        budget: Budget,
        choice: Choice = "auto",
        backend: str = "auto",
        cases: int | None = None,
    ) -> None:
        motions = free_motions(mesh, constraints)
        if motions:
            raise SolveError("The supports do not hold the part: " + "; ".join(motions) + ". Hold these motions.")
        self.K = K if isinstance(K, BlockMatrix) else block_matrix(K)
        self.constraints = constraints
        self.elimination = Elimination(constraints.T, budget.threads)
        self.T = constraints.T
        self.free = self.T.shape[1]
        self.mean_rows = sp.csr_matrix(constraints.rows @ self.T)
        self._nodes = mesh.nodes
        self._tets, self._budget, self._backend, self._choice = mesh.tets, budget, backend, choice
        on_surface = np.zeros(mesh.nodes.shape[1], dtype=bool)
        on_surface[mesh.boundary] = True
        extents = np.sort(np.ptp(mesh.nodes, axis=1))
        slender = float(extents[2] / extents[1])
        which, reason = choose(self.free, on_surface.size, int(on_surface.sum()), choice, cases, slender)
        self.solver: Solver = self._direct(reason) if which == "cholesky" else self._iterative(reason)

    def _direct(self, reason: str) -> Solver:
        springs = np.zeros(0, dtype=np.int64)
        if self.mean_rows.shape[0]:
            springs = spring_unknowns(self._nodes, self.T)
        try:
            upper = self.elimination.square(self.K)
            return CholeskySolver(upper, self.mean_rows, springs, self._budget, self._backend, reason)
        except NotPositive as error:
            raise SolveError(NOT_POSITIVE) from error
        except TooLarge as error:
            if self._choice != "auto":
                raise
            return self._multigrid(f"An iterative solver, as the memory does not suffice for a direct one: {error}")

    def _iterative(self, reason: str) -> Solver:
        try:
            return self._multigrid(reason)
        except NotPositive:
            self._choice = "cholesky"
            return self._direct("A direct solver, as the linear level of the iterative one could not be factored.")

    def _multigrid(self, reason: str) -> Solver:
        rows, tets = self.constraints.rows, self._tets
        return MultigridSolver(self.K, self.elimination, rows, tets, self._nodes, self._budget, self._backend, reason)

    def _fall_back(self, why: str) -> None:
        """Change from the iterative to the direct solver."""
        self.solver.close()
        self._choice = "cholesky"
        self.solver = self._direct(f"A direct solver, as the iterative one failed: {why}.")

    def _solve(
        self, rhs: Array, values: Array, heated: NDArray[np.bool_] | None = None, known: Array | None = None
    ) -> tuple[Array, Array]:
        try:
            if isinstance(self.solver, MultigridSolver):
                return self.solver.solve_bordered(rhs, values, heated, known)
            return self.solver.solve_bordered(rhs, values)
        except Stalled as error:
            self._fall_back(str(error))
            return self.solver.solve_bordered(rhs, values)

    def apply(self, y: Array) -> Array:
        """T^T K T y for y (f,) or (f, k)."""
        return self.elimination.gather(self.K @ self.elimination.expand(y))

    def inverse(self, rhs: Array) -> Array:
        """(f, k) solution for right-hand sides (f, k), on the motions that meet the mean rows: symmetric."""
        b = np.asarray(rhs, dtype=float).reshape(self.free, -1)
        return self._solve(b, np.zeros((self.mean_rows.shape[0], b.shape[1])))[0]

    def precondition(self, residual: Array) -> Array:
        """(f, k): a fixed symmetric positive approximation of `inverse` applied to (f, k)."""
        return self.solver.precondition(np.asarray(residual, dtype=float).reshape(self.free, -1))

    def close(self) -> None:
        """Give memory back; the object is of no use afterwards."""
        self.solver.close()

    def solve(self, loads: Array, heated: NDArray[np.bool_] | None = None) -> Solution:
        """Solve for the columns of loads (3 n, c), N, with the prescribed values of the supports.

        One more right-hand side always goes along, K y0 of a known bending field, and the true residual is taken.
        `heated` (c,) tells which columns have a thermal part and must be solved nearer.

        Raises
        ------
        SolveError
            When the residual or the forward error of the known field is off.
        """
        try:
            return self._checked(loads, heated)
        except OffGate as error:
            if not isinstance(self.solver, MultigridSolver):
                raise
            self._fall_back(error.short)
            return self._checked(loads, heated)

    def _checked(self, loads: Array, heated: NDArray[np.bool_] | None) -> Solution:
        g, C = self.constraints.g, self.mean_rows
        moved = self.K @ g if g.any() else np.zeros(g.size)
        rhs = self.elimination.gather(loads - moved[:, None])
        values = (self.constraints.row_values - self.constraints.rows @ g)[:, None].repeat(rhs.shape[1], axis=1)
        size = np.bincount(self.T.indices, weights=self.T.data**2, minlength=self.free)
        y0 = self.elimination.gather(bending_field(self._nodes).T.ravel()) / size
        nearer = None if heated is None else np.append(heated, False)
        both, m = self._solve(np.column_stack([rhs, self.apply(y0)]), np.column_stack([values, C @ y0]), nearer, y0)
        y, m = both[:, :-1], m[:, :-1]
        gauge = float(np.abs(both[:, -1] - y0).max() / np.abs(y0).max())
        scale = np.maximum(np.linalg.norm(rhs, axis=0), np.abs(moved).max() * np.sqrt(g.size))
        if values.any():  # the load is then what the mean rows take, or of a rigid motion the rounding of the stiffness
            stiff = self.K.diagonal()[:, None] * self.elimination.expand(y)
            scale = np.maximum(scale, np.maximum(np.linalg.norm(C.T @ m, axis=0), 1e-8 * np.linalg.norm(stiff, axis=0)))
        scale = np.where(scale > 0, scale, 1.0)
        left = rhs - self.apply(y) - C.T @ m
        residual = float((np.linalg.norm(left, axis=0) / scale).max())
        allowed, correction = RESIDUAL_ALLOWED, 0.0
        if not residual <= RESIDUAL_ALLOWED:
            allowed = max(allowed, float((rounding_of_product(self.K, self.elimination.expand(y)) / scale).max()))
            again = self.inverse(left)
            largest = np.abs(y).max(axis=0)
            correction = float((np.abs(again).max(axis=0) / np.where(largest > 0, largest, 1.0)).max())
        self._gate(residual, allowed, correction, gauge)
        u = self.elimination.expand(y) + g[:, None]
        return Solution(u, -m, residual, gauge, self.solver.name, allowed, correction, self.solver.reason)

    def _gate(self, residual: float, allowed: float, correction: float, gauge: float) -> None:
        if not (residual <= allowed and correction <= GAUGE_ALLOWED):
            raise OffGate(
                f"The equations are not met: residual {residual:.2e} of the load, allowed {allowed:.0e}",
                f"; correcting it would move the part by {correction:.1e} of its largest displacement, allowed "
                f"{GAUGE_ALLOWED:.0e}. The part is extremely slender, or the mesh holds a nearly flat element; mesh "
                "the part again.",
            )
        if not gauge <= GAUGE_ALLOWED:
            raise OffGate(
                f"A known bending field comes back with an error of {gauge:.2e}, allowed {GAUGE_ALLOWED:.0e}",
                ": the matrix is too badly conditioned. Look for nearly flat elements; mesh the part again.",
            )


def solve_system(
    K: BlockMatrix | sp.csr_matrix,
    loads: Array,
    constraints: Constraints,
    mesh: NamedMesh,
    budget: Budget,
    choice: Choice = "auto",
    backend: str = "auto",
) -> Solution:
    """Set up, solve for the columns of loads (3 n, c), and give the memory back; see `HeldSystem`."""
    system = HeldSystem(K, constraints, mesh, budget, choice, backend)
    try:
        return system.solve(loads)
    finally:
        system.close()
