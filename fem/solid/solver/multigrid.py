"""The iterative solver: conjugate gradients with two levels, quadratic and linear displacements, as preconditioner.

The quadratic level is smoothed in single precision, the linear level solved directly: what is left of a smooth motion
after smoothing is nearly linear in each element, whatever the size of the elements, so that the number of iterations
does not grow with the mesh (p-multigrid; E. M. Ronquist, A. T. Patera, J. Sci. Comput. 2 (1987) 389).
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.factor import GAUGE_ALLOWED, NotPositive
from fem.solid.shape import Array
from fem.solid.solver.aggregate import AggregateSolver
from fem.solid.solver.cholesky import CholeskySolver, spring_unknowns
from fem.solid.solver.conjugate import Goal, MeanRows, conjugate_gradients
from fem.solid.solver.cycle import Cycle
from fem.solid.solver.elimination import Elimination
from fem.solid.solver.estimate import AT_ONCE, FACTORED, refuse_multigrid
from fem.solid.solver.gauge import rounding_of_product
from fem.solid.solver.ordering import Ordering
from fem.solid.solver.smoother import BlockJacobi
from fem.solid.solver.transfer import Transfer
from geometry.budget import Budget

Single = NDArray[np.float32]
DEGREE = 3
ENERGY = 1e-6
"""Allowed error in the norm of the energy, as it was two iterations before the last: what remains is about a tenth, and
displacements are nearer still (1e-9 to 1e-8 of the largest, measured)."""
RESIDUAL = 8e-7
"""Allowed residual over the load, four fifths of what the held system's gate lets pass. It is mostly of short waves,
which move little: at the energy's goal it stands at 4e-7 to 3e-6. Of a very slender part rounding alone makes more."""
HEATED = 1e-3
"""What both are tightened by for a case with a change of temperature: the energy and the nodal forces of an expansion
that nothing hinders are as large as those of one that is fully hindered, so that the stress that is left, which may be
none, is lost in an error that is small beside them."""
KNOWN = GAUGE_ALLOWED / 10
"""Largest error of the known field, over its largest value, with which it leaves the iteration: a tenth of what the
gate lets pass, and measured, not estimated."""
PATIENCE = 4
"""Iterations that meet the goal of the energy and not that of the residual, after which rounding is looked at."""
ROUNDING = 1e-13


class MultigridSolver:
    """K u + C^T m = f on the held motions u = T y, C u = d.

    Parameters
    ----------
    K
        Stiffness on all nodes.
    held
        The elimination T.
    mean_rows
        C (rows, 3 n) on all nodes.
    tets, nodes
        (10, m), and (3, n) mm.
    """

    name = "multigrid"

    def __init__(
        self,
        K: BlockMatrix,
        held: Elimination,
        mean_rows: sp.csr_matrix,
        tets: NDArray[np.int64],
        nodes: Array,
        budget: Budget,
        backend: str = "auto",
        reason: str = "",
    ) -> None:
        self.reason, self.iterations = reason, 0
        self._threads = budget.threads
        order = Ordering(nodes)
        given, self.in_given_order = K, order.given
        K, single = order.matrix(K, budget.threads)
        mean_rows = order.columns(mean_rows)
        if not order.given:
            held, tets, nodes = held.in_order(order.nodes), order.number[tets].astype(np.int64), nodes[:, order.nodes]
        self._K, self._held = K, held
        self._transfer = transfer = Transfer(tets, held, budget.threads)
        refuse_multigrid(K, transfer.coarse.free, budget)
        count = mean_rows.shape[0]
        if given.linear:
            coarse = given.linear(order.nodes[transfer.corners])
        else:
            coarse = transfer.galerkin(K)
        coarse_rows = sp.csr_matrix((count, transfer.coarse.free))
        springs = np.zeros(0, dtype=np.int64)
        if count:
            coarse_rows = sp.csr_matrix(np.vstack([transfer.restrict(row.T.toarray()).T for row in mean_rows]))
            springs = spring_unknowns(nodes[:, transfer.corners], transfer.coarse.T)
        self._coarse: CholeskySolver | AggregateSolver
        if transfer.coarse.free > FACTORED and not count and not held.rigid.shape[1]:
            self._coarse = AggregateSolver(coarse, transfer.coarse, nodes[:, transfer.corners], budget, backend)
        else:
            self._coarse = self._factored(transfer.coarse.square(coarse), coarse_rows, springs, budget, backend)
        jacobi = BlockJacobi(K, held, budget.threads)
        self._smooth_and_correct = Cycle(single, jacobi, self._correct, DEGREE, budget.seed)
        self._rows: MeanRows | None = None
        if count:
            C = mean_rows.toarray()
            W = np.empty_like(C.T)
            self._cycle(np.ascontiguousarray(C.T), W)
            self._rows = MeanRows(C, W, np.linalg.inv(C @ W))

    @staticmethod
    def _factored(
        upper: sp.csr_matrix, rows: sp.csr_matrix, springs: NDArray[np.int64], budget: Budget, backend: str
    ) -> CholeskySolver:
        single = not rows.shape[0]
        try:
            return CholeskySolver(upper, rows, springs, budget, backend, single=single, refinement=0)
        except NotPositive:  # of a slender part it takes double precision
            return CholeskySolver(upper, rows, springs, budget, backend, refinement=0)

    def solve(self, rhs: Array) -> Array:
        """(f, k) solutions with C y = 0."""
        count = self._rows.C.shape[0] if self._rows else 0
        return self.solve_bordered(rhs, np.zeros((count, rhs.shape[1])))[0]

    def solve_bordered(
        self, rhs: Array, values: Array, heated: NDArray[np.bool_] | None = None, known: Array | None = None
    ) -> tuple[Array, Array]:
        """y (f, k) with C y = values (rows, k), and the multipliers m (rows, k). Raises `Stalled`.

        `heated` (k,): which columns have a thermal part. `known` (f,): solution of the last column, which is done when
        it is met to `KNOWN` of its largest value.
        """
        tighter = np.ones(rhs.shape[1]) if heated is None else np.where(heated, HEATED, 1.0)
        turns = [slice(a, a + AT_ONCE) for a in range(0, rhs.shape[1], AT_ONCE)]
        found = [
            self._solve_some(rhs[:, some], values[:, some], tighter[some], known if some is turns[-1] else None)
            for some in turns
        ]
        if len(found) == 1:
            return found[0]
        return np.hstack([y for y, _ in found]), np.hstack([m for _, m in found])

    def _solve_some(self, rhs: Array, values: Array, tighter: Array, known: Array | None = None) -> tuple[Array, Array]:
        loads, allowed = self._held.lift(rhs), RESIDUAL * tighter
        start, force = None, np.linalg.norm(rhs, axis=0)
        floor = np.zeros(rhs.shape[1])
        if values.any() and isinstance(self._coarse, CholeskySolver):
            nothing = np.zeros((self._transfer.coarse.free, rhs.shape[1]))
            start = np.zeros((self._K.shape[0], rhs.shape[1]))
            self._transfer.prolong(self._coarse.solve_bordered(nothing, values)[0], start)
            stiff = self._K.diagonal()[:, None] * start
            floor = ROUNDING * (start * stiff).sum(axis=0)
            force = np.maximum(force, ROUNDING / allowed * np.linalg.norm(stiff, axis=0))

        looks = 0

        def met(u: Array, r: Array, columns: NDArray[np.intp]) -> NDArray[np.bool_]:
            nonlocal looks, force
            looks += 1
            if looks == PATIENCE:  # is it that rounding does not let it go lower?
                force[columns] = np.maximum(force[columns], rounding_of_product(self._K, u) / allowed[columns])
            return np.asarray(np.linalg.norm(self._held.gather(r), axis=0) <= allowed[columns] * force[columns])

        field = None if known is None else (self._held.expand(known), KNOWN)
        goal = Goal(ENERGY * tighter, floor, met, field)
        found = conjugate_gradients(self._product, self._cycle, loads, start, self._rows, goal, self._threads)
        self.iterations = found.iterations
        return self._held.reduce(found.u), found.multipliers

    def precondition(self, residual: Array) -> Array:
        """(f, k): one cycle, with mean rows its projection onto C y = 0."""
        r = self._held.lift(residual)
        z = np.empty_like(r)
        self._cycle(r, z)
        if self._rows:
            z -= self._rows.W @ (self._rows.inverse @ (self._rows.C @ z))
        return self._held.reduce(z)

    def precondition_nodes(self, residual: Array) -> Array:
        """The same from nodal forces (3 n, k) to nodal motions, of nodes that stand in the solver's order."""
        z = np.empty(residual.shape)
        self._cycle(residual, z)
        if self._rows:
            z -= self._rows.W @ (self._rows.inverse @ (self._rows.C @ z))
        return z

    def close(self) -> None:
        """Give memory back."""
        self._coarse.close()
        self._smooth_and_correct.close()

    def _cycle(self, residual: Array, out: Array) -> None:
        self._smooth_and_correct(residual, out)
        self._held.project(out)  # single precision keeps a rigid region rigid to seven digits only

    def _correct(self, residual: Single, out: Single) -> None:
        """The linear level's part of a cycle."""
        if isinstance(self._coarse, AggregateSolver):  # there are no rigid regions then
            self._transfer.prolong_nodes(self._coarse.correct(self._transfer.restrict_nodes(residual)), out)
        else:
            self._transfer.prolong(self._coarse.solve(self._transfer.restrict(residual)), out)

    def _product(self, x: Array, out: Array) -> None:
        self._K.product(x, out, self._threads)
