"""Compile every kernel in advance, so that no run of a check has to wait for it unannounced."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from time import perf_counter

import numpy as np
import scipy.sparse as sp

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.cache import base_folder, is_warm, set_warm
from mesher.named_mesh import NamedMesh

__all__ = ["SECONDS", "is_warm", "warm_up"]

SECONDS = 60
"""What compiling all of them takes, measured on one processor; from the kept code it is two or three seconds."""


def warm_up(tell: Callable[[str], None]) -> None:
    """Solve a tiny part in all the ways there are, which compiles what is not kept yet. May be repeated.

    Parameters
    ----------
    tell
        Called with a sentence before and after.
    """
    from fem.solid.kernels.tiny import tiny_mesh, tiny_part
    from fem.solid.solve import solve_solid
    from geometry.budget import Budget

    begun = perf_counter()
    tell(
        "the solver's kernels are compiled"
        + ("" if is_warm() else f", once, about {SECONDS} s" if base_folder() else f", about {SECONDS} s in every run: "
           "no folder can be written in which to keep them (name one in NUMBA_CACHE_DIR)")
    )  # fmt: skip
    mesh, part = tiny_mesh(), tiny_part()
    one = replace(part, cases=part.cases[1:2], vibration=None, buckling=())
    solve_solid(part, mesh, Budget(threads=1), solver="cholesky")
    solve_solid(part, mesh, Budget(threads=1), solver="multigrid")
    solve_solid(one, mesh, Budget(threads=1), solver="multigrid")
    _matrices(mesh)
    set_warm()
    tell(f"the solver's kernels are ready after {perf_counter() - begun:.0f} s")


def _matrices(mesh: NamedMesh) -> None:
    """What no solution above is bound to need: mass, geometric stiffness and the scalar forms of a matrix."""
    from fem.solid.cut import Cutter
    from fem.solid.geometric import geometric_stiffness
    from fem.solid.kernels.energy import elastic_energy
    from fem.solid.kernels.interface import rules
    from fem.solid.kernels.tall import combine, gram
    from fem.solid.mass import mass_matrix
    from fem.solid.stiffness import element_groups, group_stresses, stiffness_matrix

    groups = element_groups(mesh.nodes, mesh.tets)
    K = stiffness_matrix(mesh.nodes, mesh.tets, groups, 1.0, 0.3)
    M = mass_matrix(groups, 1.0, K)
    stress = group_stresses(groups, np.zeros((1, *mesh.nodes.shape)), 1.0, 0.3, np.zeros(1))
    geometric_stiffness(groups, [s[0] for s in stress], K)
    wide = np.zeros((K.shape[0], 15))  # columns are taken by eight, four, two and one
    combine(M @ wide, 15, gram(wide, 15, wide, 1), wide, 1)
    cutter = Cutter(mesh)
    for cases in (1, 2, 4, 8):
        u, free = np.zeros((K.shape[0], cases)), np.zeros(cases)
        elastic_energy(cutter.tets, cutter.curved, cutter.points, u, (1.0, 0.3, 1.0, 1.0), free, rules(2, 4), 1)
    K.to_csr()
    K.upper_csr()
    for columns in ((), (2,), (4,), (8,)):
        x = np.zeros((K.shape[0], *columns))
        K @ x
        K.single() @ x.astype(np.float32)
    _large(mesh, K)


def _large(mesh: NamedMesh, K: BlockMatrix) -> None:
    """What the iterative solver needs beyond in large models."""
    from fem.solid.solver.aggregate import AggregateSolver
    from fem.solid.solver.elimination import Elimination
    from geometry.budget import Budget

    free = np.flatnonzero(np.repeat(mesh.nodes[0] > mesh.nodes[0].min() + 1e-6, 3))
    T = sp.csr_matrix((np.ones(free.size), (free, np.arange(free.size))), shape=(K.shape[0], free.size))
    solver = AggregateSolver(K, Elimination(T), mesh.nodes, Budget(threads=1), "auto")
    solver.solve(np.ones((free.size, 15)))  # columns are taken by eight, four, two and one
    solver.close()
