"""The eigenvalue method, the count and the hold of a free part by themselves, against dense algebra."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg as sla
import scipy.sparse as sp
from eigen_help import BUDGET, WALL
from solid_help import box_mesh, box_part

from fem.solid.eigen.count import LowRank, negative_count, separated
from fem.solid.eigen.motions import free_part_constraints, held_at_points
from fem.solid.eigen.pairs import Pencil, extreme_pairs
from fem.solid.held import free_motions
from fem.solid.model import build_model
from fem.solid.shape import Array
from geometry.problem import SolveError


def dense(values: Array, seed: int = 0) -> tuple[Array, Array]:
    """A (f, f) positive definite and B with B x = mu A x for the mu given."""
    rng = np.random.default_rng(seed)
    f = values.size
    Q, _ = np.linalg.qr(rng.standard_normal((f, f)))
    R = np.diag(np.geomspace(1.0, 30.0, f)) @ Q  # A = R^T R
    return R.T @ R, R.T @ np.diag(values) @ R


def pencil(A: Array, B: Array, blur: float) -> Pencil:
    rng = np.random.default_rng(5)
    S = rng.standard_normal(A.shape)
    near = A + blur * (S @ S.T) / A.shape[0]
    return Pencil(lambda x: A @ x, lambda x: B @ x, lambda x: np.linalg.solve(near, x))


@pytest.mark.parametrize("blur", [0.0, 1.0, 30.0])
def test_repeated_values_of_both_signs(blur: float) -> None:
    """An inverse that is only an approximation finds the same pairs, in more rounds."""
    values = np.r_[3.0, 3.0, 3.0, -2.5, -2.5, 2.0, 0.5 * np.random.default_rng(1).uniform(-1, 1, 194)]
    A, B = dense(values)
    start = np.random.default_rng(2).standard_normal((200, 8))
    found = extreme_pairs(pencil(A, B, blur), start, np.full(6, 1e-8))
    assert found.mu == pytest.approx([3.0, 3.0, 3.0, -2.5, -2.5, 2.0], rel=1e-10)
    assert found.x.T @ A @ found.x == pytest.approx(np.eye(6), abs=1e-9)
    assert np.abs(B @ found.x - A @ found.x * found.mu).max() < 1e-6 * np.abs(A @ found.x).max()
    assert (found.residual <= 1e-8).all()


def test_residual_is_the_one_that_is_said() -> None:
    values = np.r_[3.0, 2.9, np.random.default_rng(1).uniform(0, 1, 98)]
    A, B = dense(values)
    found = extreme_pairs(pencil(A, B, 0.0), np.random.default_rng(2).standard_normal((100, 3)), np.full(2, 1e-2))
    for mu, x, told in zip(found.mu, found.x.T, found.residual, strict=True):
        r = B @ x - mu * A @ x
        assert told == pytest.approx(np.sqrt(r @ np.linalg.solve(A, r)) / mu, rel=1e-6)
        assert np.abs(values - mu).min() <= told * mu


def test_a_start_that_holds_an_invariant_space_only() -> None:
    """B of rank 3 takes any start to three directions; the fourth pair has mu = 0."""
    A, B = dense(np.r_[3.0, 2.0, 1.0, np.zeros(57)])
    start = np.linalg.solve(A, B @ np.random.default_rng(2).standard_normal((60, 6)))
    found = extreme_pairs(pencil(A, B, 0.0), start, np.r_[np.full(3, 1e-8), np.inf])
    assert found.mu == pytest.approx([3.0, 2.0, 1.0, 0.0], abs=1e-9)


def test_no_pair_is_given_as_found_that_is_not() -> None:
    A, B = dense(np.random.default_rng(1).uniform(0.9, 1.0, 100))
    start = np.random.default_rng(2).standard_normal((100, 4))
    found = extreme_pairs(pencil(A, B, 10.0), start, np.full(4, 1e-8), rounds=3)
    assert found.rounds == 3
    assert found.residual.max() > 1e-8


@pytest.mark.parametrize("sign", [1.0, -1.0])
@pytest.mark.parametrize("shift", [-0.5, 0.3, 1.7])
def test_count_on_held_motions_with_low_rank_parts(shift: float, sign: float) -> None:
    rng = np.random.default_rng(3)
    S = rng.standard_normal((40, 40))
    A = S + S.T - shift * 8 * np.eye(40)
    rows, low = rng.standard_normal((3, 40)), rng.standard_normal((5, 40))
    weight = sign * np.array([20.0, 30.0, 0.0, 50.0, -1.0])
    whole = A + low.T @ np.diag(weight) @ low
    N = sla.null_space(rows)
    exact = int((np.linalg.eigvalsh(N.T @ whole @ N) < 0).sum())
    count = negative_count(sp.csr_matrix(np.triu(A)), LowRank(low, weight), rows, BUDGET)
    assert count == exact


def test_count_where_the_rows_alone_hold_the_matrix() -> None:
    """Singular by itself: springs stand in, and are taken out again."""
    rng = np.random.default_rng(3)
    S = np.diag(np.r_[np.zeros(2), rng.uniform(-1, 1, 38)])
    Q, _ = np.linalg.qr(rng.standard_normal((40, 40)))
    A, rows = Q @ S @ Q.T, rng.standard_normal((3, 40))
    N = sla.null_space(rows)
    exact = int((np.linalg.eigvalsh(N.T @ A @ N) < 0).sum())
    none = LowRank(np.zeros((0, 40)), np.zeros(0))
    upper = sp.csr_matrix(np.triu(A))
    assert negative_count(upper, none, rows, BUDGET, np.array([3, 17, 30])) == exact
    with pytest.raises(SolveError, match="singular"):
        negative_count(upper, none, rows, BUDGET)


def test_where_to_count() -> None:
    assert separated(np.array([1.0, 2.0, 3.0]), 1) == (1, pytest.approx(1.01))
    assert separated(np.array([1.0, 1.003, 3.0]), 1) == (1, pytest.approx(1.001))
    assert separated(np.array([1.0, 1.0001, 3.0]), 1) == (2, pytest.approx(1.0001 * 1.01))
    assert separated(np.array([1.0, 1.0001]), 1) is None


def test_a_free_part_is_held_at_six_directions_and_no_more() -> None:
    part = box_part(200.0, 20.0, 30.0, [WALL])
    model = build_model(part, box_mesh(200.0, 20.0, 30.0, (4, 1, 1)))
    whole = free_part_constraints(model)
    assert len(free_motions(model.mesh, whole)) == 6
    held, kept = held_at_points(model.mesh.nodes, whole)
    assert free_motions(model.mesh, held) == []
    assert held.T.shape[1] == whole.T.shape[1] - 6 == kept.size
    assert abs(whole.T[:, kept] - held.T).max() == 0
