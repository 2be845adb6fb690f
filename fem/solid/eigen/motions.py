"""The motions that eigenvectors are sought among: those that the supports leave, or all but the rigid ones."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.tall import combine, gram
from fem.solid.model import SolidModel
from fem.solid.shape import Array
from fem.solid.solver import Choice
from fem.solid.solver.cholesky import spring_unknowns
from fem.solid.solver.elimination import Elimination
from fem.solid.solver.multigrid import MultigridSolver
from fem.solid.support import Block, Constraints, build_constraints, rigid_map
from fem.solid.system import HeldSystem
from geometry.budget import Budget

NO_SPRINGS = np.zeros(0, dtype=np.int64)
Operator = Callable[[Array], Array]
"""(3 n, k) of (3 n, k)."""


@dataclass(frozen=True, slots=True)
class Motions:
    """u = T y, (3 n, f), with C y = 0.

    Eigenvectors are sought among the u themselves: of forces (3 n,) only the work on such motions counts, so that what
    the supports take needs no removing.

    Attributes
    ----------
    elimination
        T.
    rows
        (r, f) C, dense: the rows of mean values that are held.
    stiffness, precondition
        K u, and a symmetric positive semidefinite approximation of its inverse on the motions u = T y with C y = 0
        (and, of a free part, with no rigid motion), which are what it gives.
    threads
        For products of tall arrays.
    solver
        Name of the solver behind it; `direct`: its approximation is the inverse. `close` gives memory back that was
        taken for these motions alone.
    springs
        Unknowns that hold the part without the rows, were there springs on them; none where there are no rows.
    """

    elimination: Elimination
    rows: Array
    stiffness: Operator
    precondition: Operator
    solver: str
    close: Callable[[], None]
    springs: NDArray[np.int64]
    threads: int = 1

    @property
    def free(self) -> int:
        return int(self.elimination.T.shape[1])

    @property
    def direct(self) -> bool:
        return is_direct(self.solver)


def is_direct(solver: str) -> bool:
    """Whether the solver of that name applies the inverse itself."""
    return solver.startswith("cholesky")


def held_motions(system: HeldSystem, nodes: Array) -> Motions:
    """What the supports leave."""
    rows = system.mean_rows.toarray()
    springs = spring_unknowns(nodes, system.T) if rows.shape[0] else NO_SPRINGS
    K, eliminate = system.K, system.elimination

    def precondition(r: Array) -> Array:
        if isinstance(system.solver, MultigridSolver) and system.solver.in_given_order:
            return system.solver.precondition_nodes(r)
        return eliminate.expand(system.precondition(eliminate.gather(r)))

    return Motions(
        eliminate, rows, K.__matmul__, precondition, system.solver.name, lambda: None, springs, K.threads
    )  # fmt: skip


def free_part_constraints(model: SolidModel) -> Constraints:
    """No supports; regions that loads make rigid stay rigid."""
    return build_constraints(replace(model.part, supports=()), model.mesh)


def held_at_points(nodes: Array, constraints: Constraints) -> tuple[Constraints, NDArray[np.int64]]:
    """The same with six directions of three far nodes held, just enough that no rigid motion is left.

    Loads that balance draw no reaction from such a hold, so that solutions under it are solutions of the free part but
    for a rigid motion. Also gives the unknowns (f - 6,) that are kept.
    """
    T = constraints.T
    plain = np.flatnonzero((np.diff(T.indptr).reshape(-1, 3) == 1).all(axis=1))
    x = nodes[:, plain]
    a = int(((x - x.mean(axis=1)[:, None]) ** 2).sum(axis=0).argmax())
    away = x - x[:, [a]]
    b = int((away**2).sum(axis=0).argmax())
    line = away[:, b] / np.linalg.norm(away[:, b])
    c = int(((away - np.outer(line, line @ away)) ** 2).sum(axis=0).argmax())
    turns = rigid_map(away[:, [b, c]], np.zeros(3))[:, :, 3:]  # (2, 3, 3) motion of b and c under turns about a
    options = [(pair, k) for pair in combinations(range(3), 2) for k in range(3)]
    pair, k = max(options, key=lambda o: abs(float(np.linalg.det(np.vstack([turns[0, list(o[0])], turns[1, [o[1]]]])))))
    eye = np.eye(3)
    held = [(plain[a], eye), (plain[b], eye[list(pair)]), (plain[c], eye[[k]])]
    blocks = tuple(
        Block(np.array([node]), rows, np.zeros(rows.shape[0]), ("",) * rows.shape[0]) for node, rows in held
    )
    unknowns = np.concatenate([3 * node + np.flatnonzero(rows.any(axis=0)) for node, rows in held])
    kept = np.setdiff1d(np.arange(T.shape[1]), T.indices[T.indptr[unknowns]])
    return replace(constraints, T=T[:, kept].tocsr(), blocks=constraints.blocks + blocks), kept


def free_motions(
    model: SolidModel,
    constraints: Constraints,
    elimination: Elimination,
    mass: Operator,
    R: Array,
    budget: Budget,
    choice: Choice = "auto",
    backend: str = "auto",
) -> Motions:
    """Every motion of a free part but the rigid ones.

    Parameters
    ----------
    constraints, elimination
        Of the part without its supports.
    mass
        u -> M u.
    R
        (3 n, 6) rigid motions with R^T M R = 1: every vector is kept M-orthogonal to them.
    choice, backend
        Of the solver, as for `HeldSystem`.
    """
    pinned, _ = held_at_points(model.mesh.nodes, constraints)
    system = HeldSystem(model.K, pinned, model.mesh, budget, choice, backend)
    heavy, threads = mass(R), model.K.threads
    held = held_motions(system, model.mesh.nodes)

    def precondition(r: Array) -> Array:
        balanced = combine(heavy, 6, -gram(R, 6, r, threads), r.copy(), threads, 1.0)
        y = held.precondition(balanced)
        return combine(R, 6, -gram(heavy, 6, y, threads), y, threads, 1.0)

    rows = np.zeros((0, elimination.T.shape[1]))
    return Motions(
        elimination, rows, model.K.__matmul__, precondition, system.solver.name, system.close, NO_SPRINGS, threads
    )
