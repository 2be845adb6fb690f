"""Whether nothing was missed, by random vectors: the bound behind it, and that what is missing is found."""

from __future__ import annotations

import numpy as np
import pytest
from test_eigen_pairs import dense, pencil

from fem.solid.eigen.sounding import COLUMNS, STEPS, assumed, contradicts, sound, told
from fem.solid.eigen.space import Pencil, Space
from fem.solid.shape import Array

VALUES = np.r_[3.0, 2.9, 2.0, 1.9, 1.0, np.random.default_rng(1).uniform(-0.8, 0.8, 195)]


def exact_vectors(A: Array, B: Array) -> Array:
    """Columns in falling order of mu."""
    L = np.linalg.cholesky(A)
    half = np.linalg.solve(L, np.linalg.solve(L, B).T)
    values, Q = np.linalg.eigh((half + half.T) / 2)
    return np.linalg.solve(L.T, Q[:, ::-1][:, values[::-1] > 0])


def space_of(pencil: Pencil, vectors: Array) -> Space:
    space = Space(pencil, vectors.shape[0], vectors.shape[1])
    space.add(vectors)
    return space


def rough(B: Array, seed: int) -> Array:
    size = np.abs(B).sum(axis=1)  # diag(size) - B and diag(size) + B have no negative eigenvalue
    return np.sqrt(size)[:, None] * np.random.default_rng(seed).standard_normal((B.shape[0], COLUMNS))


@pytest.mark.parametrize("blur", [0.0, 1.0])
@pytest.mark.parametrize("missed", [None, 0, 1, 3])
def test_a_pair_that_was_missed_is_found(blur: float, missed: int | None) -> None:
    """Four lie beyond mu = 1.5; of the space some are left out, and vectors that are not exact are in it."""
    A, B = dense(VALUES)
    problem = pencil(A, B, blur)
    X = exact_vectors(A, B)[:, :5]
    X += 1e-4 * np.random.default_rng(2).standard_normal(X.shape) / np.sqrt(np.diag(A))[:, None]
    if missed is not None:
        X = np.delete(X, missed, axis=1)
    for seed in range(5):
        result = sound(problem, space_of(problem, X), -1.0 / 1.5, rough(B, seed), 1.0 if not blur else 0.01)
        assert result.known == (4 if missed is None else 3)
        assert result.found == (missed is not None)
        assert result.clear == (missed is None)
        assert result.steps <= STEPS
        assert ("another" in told(result, "4")) == result.found


def test_both_signs_one_after_the_other() -> None:
    """The space is sounded at a shift of either sign, as buckling needs it."""
    values = np.r_[3.0, -2.5, -2.4, 2.0, 0.5 * np.random.default_rng(1).uniform(-1, 1, 96)]
    A, B = dense(values)
    problem = pencil(A, B, 0.0)
    L = np.linalg.cholesky(A)
    half = np.linalg.solve(L, np.linalg.solve(L, B).T)
    found, Q = np.linalg.eigh((half + half.T) / 2)
    X = np.linalg.solve(L.T, Q[:, np.abs(found) > 1.0])
    space = space_of(problem, X)
    for shift, known in ((-1.0, 2), (1.0, 2), (-1 / 2.5, 1)):
        result = sound(problem, space, shift, rough(B, 0), 1.0)
        assert (result.known, result.clear, result.found) == (known, True, False)
    without = space_of(problem, np.linalg.solve(L.T, Q[:, found > 1.0]))
    assert sound(problem, without, -1.0, rough(B, 0), 1.0).clear
    assert sound(problem, without, 1.0, rough(B, 0), 1.0).found


@pytest.mark.parametrize("least", [0.0, -1e-3, -0.3])
def test_the_bound_holds_for_lanczos_values(least: float) -> None:
    """With the true angle no value of Lanczos' method ever contradicts a least eigenvalue that is there."""
    rng = np.random.default_rng(3)
    values = np.r_[least, rng.uniform(0.02, 1.0, 149)]
    for share in (1e-1, 1e-3, 1e-5):
        start = rng.standard_normal(150)
        start[0] = share * np.linalg.norm(start[1:])
        v, T = start / np.linalg.norm(start), np.zeros((40, 40))
        V = [v]
        for k in range(40):
            w = values * V[-1]
            w -= np.array(V).T @ (np.array(V) @ w)
            w -= np.array(V).T @ (np.array(V) @ w)
            basis = np.array(V)
            T = basis @ (values[:, None] * basis.T)
            lowest = np.linalg.eigvalsh(T)[:1]
            if lowest[0] > 0:
                assert not contradicts(lowest, np.array([1.0]), np.array([1.0 / share**2]), k + 1).any()
            V.append(w / np.linalg.norm(w))
        assert lowest[0] < 0.02  # it was found in the end


def test_without_a_negative_direction_it_contradicts_early() -> None:
    assert contradicts(np.array([0.2]), np.array([1.0]), np.array([1e9]), 20).all()
    assert not contradicts(np.array([0.2]), np.array([1.0]), np.array([1e9]), 8).any()


def test_what_is_taken_for_granted_is_told() -> None:
    assert "no motion is more than 100 times softer than the solver's approximation" in assumed(0.01)
    assert "softer" not in assumed(1.0)
    assert "at least 91% of the greatest" in assumed(1.0) and "at least 91% of the greatest" in assumed(0.01)
