"""The direct solver: one Cholesky factorisation of T^T K T, every right-hand side at once.

Mean rows C y = d: K alone may leave rigid motions free, so a few springs at three far nodes are added (which makes it
positive definite) and taken out again exactly: spring forces p and multipliers m are the unknowns of a dense Schur
complement of at most 9 + rows.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.factor import Cholesky
from fem.solid.shape import Array
from geometry.budget import Budget


def spring_unknowns(nodes: Array, T: sp.csr_matrix) -> NDArray[np.int64]:
    """(9,) unknowns of three far, not collinear nodes that have three plain unknowns each."""
    plain = np.diff(T.indptr).reshape(-1, 3)
    free = np.flatnonzero((plain == 1).all(axis=1))
    x = nodes[:, free]
    first = int(((x - x.mean(axis=1)[:, None]) ** 2).sum(axis=0).argmax())
    away = x - x[:, [first]]
    second = int((away**2).sum(axis=0).argmax())
    line = away[:, second] / np.linalg.norm(away[:, second])
    third = int(((away - np.outer(line, line @ away)) ** 2).sum(axis=0).argmax())
    rows = (3 * free[[first, second, third]][:, None] + np.arange(3)).ravel()
    return np.asarray(T.indices[T.indptr[rows]], dtype=np.int64)


class CholeskySolver:
    """A y + C^T m = b, C y = d with the upper triangle of A (f, f) and mean rows C (k, f).

    Parameters
    ----------
    springs
        (9,) unknowns that hold the part while there are mean rows; empty without.
    single
        Factor in single precision.
    refinement
        Steps of refinement with mean rows: the springs' part is large when they carry the load alone.

    Raises
    ------
    NotPositive
        When A is not positive definite.
    TooLarge
        When its factor would not fit the memory of the budget.
    """

    iterations = 0

    def __init__(
        self,
        upper: sp.csr_matrix,
        mean_rows: sp.csr_matrix,
        springs: NDArray[np.int64],
        budget: Budget,
        backend: str = "auto",
        reason: str = "",
        single: bool = False,
        refinement: int = 2,
    ) -> None:
        self.reason, self._springs, self._steps = reason, springs, 1 + refinement
        self._rows = mean_rows.shape[0]
        if self._rows:
            diagonal = upper.indptr[:-1]
            self._stiffness = float(np.median(upper.data[diagonal]))
            upper = sp.csr_matrix((upper.data.copy(), upper.indices, upper.indptr), shape=upper.shape)
            upper.data[diagonal[springs]] += self._stiffness
            self._upper, self._diagonal = upper, upper.data[diagonal][:, None]
        self._factor = Cholesky(upper, budget, backend, upper=True, single=single)
        self.name = f"cholesky ({self._factor.backend})"
        if self._rows:
            self._border(mean_rows, springs)

    def _border(self, mean_rows: sp.csr_matrix, springs: NDArray[np.int64]) -> None:
        """A y + C^T m - E p = b;  C y = d;  E^T y - p / stiffness = 0, with y = A^-1 b - W sign q and q = (m, p)."""
        C = mean_rows.toarray()
        self._weight = np.linalg.norm(C, axis=1, keepdims=True)
        E = np.zeros((C.shape[1], springs.size))
        E[springs, np.arange(springs.size)] = 1.0
        self._B = np.hstack([(C / self._weight).T, E])
        self._W = self._factor.solve(self._B)
        self._sign = np.r_[np.ones(self._rows), -np.ones(springs.size)]
        S = (self._B.T @ self._W) * self._sign
        pulled = range(self._rows, self._B.shape[1])
        S[pulled, pulled] += 1.0 / self._stiffness
        self._S = S

    def solve(self, rhs: Array) -> Array:
        """(f, k) solutions with C y = 0."""
        return self.solve_bordered(rhs, np.zeros((self._rows, rhs.shape[1])))[0]

    def solve_bordered(self, rhs: Array, values: Array) -> tuple[Array, Array]:
        """y (f, k) with C y = values (rows, k), and the multipliers m (rows, k)."""
        if not self._rows:
            return self._factor.solve(rhs), np.zeros((0, rhs.shape[1]))
        k = self._rows
        target = np.zeros((self._B.shape[1], rhs.shape[1]))
        target[:k] = values / self._weight
        y, q = np.zeros_like(rhs), np.zeros_like(target)
        for step in range(self._steps):
            left = rhs - (self._B * self._sign) @ q if step else rhs
            if step:
                left -= self._upper @ y + self._upper.T @ y - self._diagonal * y
            gap = self._B.T @ y - target
            gap[k:] -= q[k:] / self._stiffness
            base = self._factor.solve(left)
            change = np.linalg.solve(self._S, self._B.T @ base + gap)
            y += base - (self._W * self._sign) @ change
            q += change
        return y, q[:k] / self._weight

    def precondition(self, residual: Array) -> Array:
        """The exact inverse."""
        return self.solve(residual)

    def close(self) -> None:
        self._factor.close()
