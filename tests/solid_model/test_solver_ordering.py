"""The order of the nodes that the iterative solver works in, and products where ranges of rows hardly overlap."""

from __future__ import annotations

import numpy as np
import pytest
from solver_help import ALL, WALL, bent_mesh, gap, straight_mesh
from test_kernels_product import whole
from test_solver_multigrid import SUPPORTS, make, system_of

from fem.solid.kernels.product import divide
from fem.solid.solver.elimination import Elimination
from fem.solid.solver.ordering import Ordering
from geometry.part import Support


@pytest.mark.parametrize("kind", SUPPORTS)
def test_matrix_motions_and_rows_are_those_in_another_order(kind: str) -> None:
    model = make(bent_mesh(), [*SUPPORTS[kind], Support("side", "arm.left", {"y": 0.0})])
    T, C = model.constraints.T, model.constraints.rows
    held, order = Elimination(T), Ordering(model.mesh.nodes)
    assert np.array_equal(order.number[order.nodes], np.arange(model.mesh.nodes.shape[1]))
    assert (np.diff(model.mesh.nodes[0, order.nodes]) >= 0).all()
    rows = (3 * order.nodes[:, None] + np.arange(3)).ravel()
    double, single = order.matrix(model.K, 2)
    assert abs(whole(double) - whole(model.K)[rows][:, rows]).max() == 0.0
    assert np.array_equal(single.blocks, double.blocks.astype(np.float32))
    if C.shape[0]:
        assert abs(order.columns(C) - C[:, rows]).max() == 0.0
    moved = held.in_order(order.nodes)
    assert abs(moved.T - T[rows]).max() == 0.0
    assert abs(moved.in_order(order.number).T - T).max() == 0.0
    y, f = np.random.default_rng(6).normal(size=(T.shape[1], 2)), np.random.default_rng(7).normal(size=(T.shape[0], 2))
    assert np.array_equal(moved.expand(y), held.expand(y)[rows])
    assert np.array_equal(moved.lift(y), held.lift(y)[rows])
    assert moved.gather(f[rows]) == pytest.approx(held.gather(f), abs=1e-12)
    assert moved.reduce(f[rows]) == pytest.approx(held.reduce(f), abs=1e-12)
    assert held.expand(y) == pytest.approx(T @ y, abs=1e-12)
    assert held.gather(f) == pytest.approx(T.T @ f, abs=1e-12)
    for which in (moved, held):
        u = f.copy()
        which.project(u)
        assert which.expand(which.reduce(u)) == pytest.approx(u, abs=1e-12)
    assert held.reduce(held.expand(y)) == pytest.approx(y, abs=1e-10)
    again = order.matrix(model.K, 1)[0]
    assert np.array_equal(again.indices, double.indices) and np.array_equal(again.blocks, double.blocks)


@pytest.mark.parametrize("columns", [1, 2, 5, 8])
def test_products_with_short_sums(columns: int) -> None:
    model = make(straight_mesh((40, 2, 2)))
    K, single = Ordering(model.mesh.nodes).matrix(model.K, 1)
    parts = divide(K.indptr, K.indices)
    assert len(parts) == 4
    assert all(part.split > part.first for part in parts)  # most of each range is its own
    assert sum(part.top - part.split for part in parts) < K.indptr.size // 4
    x = np.random.default_rng(1).normal(size=(K.shape[0], columns))
    exact = whole(K) @ x
    assert gap(K @ x, exact) <= 1e-14
    assert gap(single @ x.astype(np.float32), exact) <= 2e-6
    for threads in (2, 3):
        assert np.array_equal(K.product(x, np.empty_like(x), threads), K @ x)


def test_the_order_of_the_mesh_does_not_matter_to_the_system() -> None:
    """Unknowns keep their places outside of the solver."""
    model = make(bent_mesh(), [WALL, Support("side", "arm.left", {"y": 0.0}), Support("low", "arm.bottom", ALL)])
    system = system_of(model)
    rhs = np.random.default_rng(3).normal(size=(system.free, 2))
    direct = system_of(model, choice="cholesky")
    assert gap(system.inverse(rhs), direct.inverse(rhs)) < 1e-6
    system.close()
    direct.close()
