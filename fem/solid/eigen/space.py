"""The space that eigenvectors are sought in, nearly orthonormal in A, and its Ritz values and vectors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.linalg as sla
from numpy.typing import NDArray

from fem.solid.kernels.tall import combine, gram, turn
from fem.solid.shape import Array

Operator = Callable[[Array], Array]
"""(f, k) of (f, k)."""
AT_ONCE = 8
"""Columns that products take together: more of them do not stay in the cache."""
_INDEPENDENT = 1e-12
"""Least part (squared, in the norm of A) of a new direction that may lie outside the space."""
_ALIKE = 1e-2
"""The same below which what is left of it after the space was taken out is more rounding than it should be."""
_MULTIPLE = 4


@dataclass(frozen=True, slots=True)
class Pencil:
    """Products with A and B, and a symmetric positive definite approximation of A^-1."""

    A: Operator
    B: Operator
    precondition: Operator
    threads: int = 1


def by_turns(operator: Operator, x: Array) -> Array:
    """The operator on AT_ONCE columns after the other."""
    if x.shape[1] <= AT_ONCE:
        return operator(np.ascontiguousarray(x))
    return np.hstack([operator(np.ascontiguousarray(x[:, a : a + AT_ONCE])) for a in range(0, x.shape[1], AT_ONCE)])


class Space:
    """Columns V and A V (plus `shift` B V, once it has been sounded), `HA` = V^T A V, about 1, and `HB` = V^T B V.

    The Ritz values come from both, so that V need not be orthonormal to the last digit and is not made so.
    """

    def __init__(self, pencil: Pencil, unknowns: int, room: int) -> None:
        self.pencil, self.size, self.shift = pencil, 0, 0.0
        self.V, self.AV = np.empty((unknowns, room)), np.empty((unknowns, room))
        self.HA, self.HB = np.zeros((0, 0)), np.zeros((0, 0))

    def ritz(self) -> tuple[Array, Array]:
        """Rising values and their coordinates S with S^T HA S = 1."""
        values, S = sla.eigh(self.HB, self.HA)
        return values, S

    def trial(self, mu: Array, S: Array) -> Trial:
        return Trial(self, mu, S)

    def add(self, W: Array) -> bool:
        """Add what is new of W (f, k); False when nothing is."""
        parts = [np.array(W[:, a : a + AT_ONCE], order="C") for a in range(0, W.shape[1], AT_ONCE)]
        added = [self._add(part) for part in parts]
        return any(added)

    def _add(self, W: Array) -> bool:
        threads = self.pencil.threads
        self._take_out(W)
        AW = self.pencil.A(W)
        HW = _symmetric(gram(W, W.shape[1], AW, threads))
        for least in (_INDEPENDENT, 0.0):
            scale = 1.0 / np.sqrt(np.maximum(np.diag(HW), 1e-300))
            values, Q = np.linalg.eigh(HW * scale * scale[:, None])
            good = values > least * max(float(values.max(initial=0.0)), 1e-300)
            if not good.any():
                return False
            Q = (scale[:, None] * Q[:, good]) / np.sqrt(values[good])
            W, AW = (combine(a, Q.shape[0], Q, np.empty((a.shape[0], Q.shape[1])), threads) for a in (W, AW))
            if values[good].min() >= _ALIKE * values.max():
                break
            self._take_out(W)  # rounding was divided by small numbers
            AW = self.pencil.A(W)
            HW = _symmetric(gram(W, W.shape[1], AW, threads))
        BW = self.pencil.B(W)
        k = W.shape[1]
        both = gram(self.V, self.size, np.hstack([AW, BW]), threads)
        own = gram(W, k, np.hstack([AW, BW]), threads)
        self.HA = _bordered(self.HA, both[:, :k], own[:, :k])
        self.HB = _bordered(self.HB, both[:, k:], own[:, k:])
        first, self.size = self.size, self.size + k
        self.V[:, first : self.size], self.AV[:, first : self.size] = W, AW
        return True

    def _take_out(self, W: Array) -> None:
        """W -= V V^T A W."""
        threads = self.pencil.threads
        if self.size:
            combine(self.V, self.size, -gram(self.AV, self.size, W, threads), W, threads, 1.0)

    def cut_back(self, S: Array, last: Array, chosen: NDArray[np.int64]) -> Array:
        """Keep the directions S (size, k) and what `last` has outside them; gives those of S that are `chosen` in the
        new coordinates."""
        padded = np.zeros((self.size, last.shape[1]))
        padded[: last.shape[0]] = last
        for _ in range(2):
            padded -= S @ (S.T @ (self.HA @ padded))
        values, Q = np.linalg.eigh(_symmetric(padded.T @ self.HA @ padded))
        good = values > 1e-16
        S = np.hstack([S, padded @ (Q[:, good] / np.sqrt(values[good]))])
        for kept in (self.V, self.AV):
            turn(kept, self.size, S, self.pencil.threads)
        self.HA, self.HB = _symmetric(S.T @ self.HA @ S), _symmetric(S.T @ self.HB @ S)
        self.size = S.shape[1]
        return np.eye(self.size)[:, chosen]


@dataclass(frozen=True, slots=True)
class Trial:
    """Ritz pairs mu, V S of a space."""

    space: Space
    mu: Array
    S: Array

    def vectors(self) -> Array:
        """(f, k)."""
        return self._combine(self.space.V, self.S)

    def residuals(self, which: NDArray[np.int64]) -> Array:
        """(f, w) B x - mu A x of some."""
        S = self.S[:, which]
        left = by_turns(self.space.pencil.B, self._combine(self.space.V, S))
        return combine(self.space.AV, self.space.size, -S * self.mu[which], left, self.space.pencil.threads, 1.0)

    def _combine(self, a: Array, S: Array) -> Array:
        return combine(a, self.space.size, S, np.empty((a.shape[0], S.shape[1])), self.space.pencil.threads)


def _bordered(H: Array, cross: Array, corner: Array) -> Array:
    return np.block([[H, cross], [cross.T, _symmetric(corner)]])


def _symmetric(H: Array) -> Array:
    return np.asarray((H + H.T) / 2)
