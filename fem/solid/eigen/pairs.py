"""Extreme eigenpairs of B x = mu A x, A positive definite, with a fixed approximation of A^-1.

Block Davidson method: the space grows by the approximate inverse applied to the residuals of the pairs that are wanted
and not yet found, Rayleigh and Ritz take the best of it, and it is cut back when it is full, to its best vectors and
those of the round before, which keep the pace of conjugate directions (E. R. Davidson, J. Comput. Phys. 17 (1975) 87;
A. Stathopoulos and Y. Saad, Electron. Trans. Numer. Anal. 7 (1998) 163; from memory). With the exact inverse the space
is a block Krylov space of A^-1 B and a few steps do. Blocks are what makes repeated eigenvalues come complete.

Both uses are of this form, with A the stiffness: vibration has B the mass and mu = 1 / omega^2, all positive; buckling
has B the geometric stiffness and mu = -1 / factor, of either sign. The largest mu are wanted in size.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.shape import Array
from geometry.budget import Budget

Operator = Callable[[Array], Array]
"""(f, k) of (f, k)."""

ROUNDS = 120
LEAST_ROOM = 24
ROUNDING = 1e-10
SEARCH_ALLOWED, SEARCH_GAP = 0.1, 1e-3
"""Residual to which a second search goes, and what makes two eigenvalues different ones."""
_ALIKE = 1e-2
_INDEPENDENT = 1e-12
"""Least part (squared, in the norm of A) of a new direction that may lie outside the space."""


@dataclass(frozen=True, slots=True)
class Pencil:
    """Products with A and B, and a symmetric positive definite approximation of A^-1."""

    A: Operator
    B: Operator
    precondition: Operator


@dataclass(frozen=True, slots=True)
class Pairs:
    """Pairs in falling order of \\|mu\\|.

    Attributes
    ----------
    mu, x
        (k,) and (f, k), with x^T A x = 1.
    residual
        (k,) \\|B x - mu A x\\| over \\|mu A x\\|, both in the norm of A^-1 (or of its approximation): mu is off by at
        most this part, and where it stands alone by its square.
    rounds
        Rounds that were taken.
    """

    mu: Array
    x: Array
    residual: Array
    rounds: int


def space_room(unknowns: int, budget: Budget) -> int:
    """Vectors that a third of the memory holds three times."""
    return int(budget.memory * 2**20 / 3 / (24 * unknowns))


def largest(mu: Array, count: int) -> NDArray[np.int64]:
    """Indices of the `count` largest in size, in falling order."""
    return np.argsort(-np.abs(mu), kind="stable")[:count]


def extreme_pairs(
    pencil: Pencil,
    start: Array,
    tolerance: Array,
    room: int = 1000,
    choose: Callable[[Array, int], NDArray[np.int64]] = largest,
    rounds: int = ROUNDS,
    enough: Callable[[Array, int], bool] = lambda mu, rounds: False,
    known: Pairs | None = None,
) -> Pairs:
    """The pairs with the largest \\|mu\\|.

    Parameters
    ----------
    start
        (f, p) vectors to begin with, at least as many as pairs are wanted.
    tolerance
        (k,) allowed residual of each of the k pairs, in their order. The pairs come back when all are met or after
        `rounds`: the caller looks at the residuals.
    room
        Vectors that the space may hold; no less than four times the wanted pairs, and no more than five times.
    choose
        Which Ritz values are wanted.
    enough
        Told the Ritz values that are wanted and the round, whether to give up.
    known
        Pairs among the start whose residuals need not be found again.
    """
    wanted = tolerance.size
    room = max(min(room, max(5 * wanted, LEAST_ROOM)), 4 * wanted, start.shape[1] + wanted)
    keep = room - 3 * wanted
    space, rng = _Space(pencil, start.shape[0], room), np.random.default_rng(0)
    space.add(start)
    settled = known or Pairs(np.zeros(0), start[:, :0], np.zeros(0), 0)
    last = np.zeros((0, 0))
    for done in range(1, rounds + 1):
        values, S = space.ritz()
        chosen = choose(values, wanted)
        mu = values[chosen]
        x, Ax, Bx = (V @ S[:, chosen] for V in (space.V, space.AV, space.BV))
        residual = _already(mu, tolerance, settled)
        size, new = np.zeros(mu.size), np.zeros_like(x)
        fresh = ~(residual < np.inf)
        for look in (fresh, ~fresh) if known is None else (fresh,):  # once these are met, is what was settled still so?
            if look.any():
                left = Bx[:, look] - Ax[:, look] * mu[look]
                new[:, look] = pencil.precondition(left)
                size[look] = np.sqrt(np.maximum(np.einsum("fk,fk->k", left, new[:, look]), 0.0))
                residual[look] = size[look] / np.where(mu[look] != 0, np.abs(mu[look]), 1e-300)
            going = residual > tolerance[: chosen.size]
            if going.any() or chosen.size < wanted:
                break
        settled = Pairs(mu, x, residual, done)
        if (chosen.size == wanted and not going.any()) or enough(mu, done):
            break
        if space.size + wanted > room:
            kept = np.union1d(largest(values, keep), chosen)
            space.rotate(_with(S[:, kept], last))
            last = np.eye(space.size, kept.size)[:, np.searchsorted(kept, chosen)]
        else:
            last = S[:, chosen]
        new = new[:, going] / np.where(size[going] > 0, size[going], 1.0)
        if chosen.size < wanted:  # B takes the start to fewer directions than are wanted
            new = np.hstack([new, pencil.precondition(rng.standard_normal((x.shape[0], wanted - chosen.size)))])
        if not space.add(new):
            break
    return settled


def _already(mu: Array, tolerance: Array, settled: Pairs) -> Array:
    """(k,) residuals of values that were found to be settled and stand where they stood; infinite of the others."""
    out = np.full(mu.size, np.inf)
    free = np.ones(settled.mu.size, dtype=bool)
    near = settled.residual**2 + ROUNDING  # what a settled value may still move by
    for i, value in enumerate(mu):
        same = free & (np.abs(settled.mu - value) <= near * abs(value)) & (settled.residual <= tolerance[i])
        if same.any():
            j = int(same.argmax())
            out[i], free[j] = settled.residual[j], False
    return out


def second_search(pencil: Pencil, found: Pairs, tolerance: Array, fresh: Array, room: int) -> Pairs:
    """Look on from pairs that are found and other vectors `fresh` (f, 2 or more), until two more pairs show what these
    lead to: a pair that was missed comes in before those that were found."""
    more = np.r_[tolerance, np.full(2, SEARCH_ALLOWED)]
    return extreme_pairs(pencil, np.hstack([found.x, fresh]), more, room, known=found)


def lost(found: Pairs, again: Pairs, count: int) -> int:
    """How many of the first pairs are others after a second search."""
    return int((np.abs(again.mu[:count]) > (1.0 + SEARCH_GAP) * np.abs(found.mu[:count])).sum())


def _with(S: Array, last: Array) -> Array:
    """Orthonormal S (k, s) and what `last`, of the first of the k coordinates, has outside it."""
    padded = np.zeros((S.shape[0], last.shape[1]))
    padded[: last.shape[0]] = last
    for _ in range(2):
        padded -= S @ (S.T @ padded)
    u, s, _ = np.linalg.svd(padded, full_matrices=False)
    return np.hstack([S, u[:, s > 1e-8]])


class _Space:
    """Columns V with V^T A V = 1, A V and B V; H = V^T B V."""

    def __init__(self, pencil: Pencil, unknowns: int, room: int) -> None:
        self.pencil, self.size = pencil, 0
        self._V, self._AV, self._BV = (np.empty((unknowns, room)) for _ in range(3))
        self.H = np.zeros((0, 0))

    @property
    def V(self) -> Array:
        return self._V[:, : self.size]

    @property
    def AV(self) -> Array:
        return self._AV[:, : self.size]

    @property
    def BV(self) -> Array:
        return self._BV[:, : self.size]

    def ritz(self) -> tuple[Array, Array]:
        values, S = np.linalg.eigh(self.H)
        return values, S

    def rotate(self, S: Array) -> None:
        count = S.shape[1]
        for kept in (self._V, self._AV, self._BV):
            kept[:, :count] = kept[:, : self.size] @ S
        self.size = count
        self.H = _symmetric(self.V.T @ self.BV)

    def add(self, W: Array) -> bool:
        """Add what is new of W (f, k); False when nothing is."""
        for _ in range(2):
            W = W - self.V @ (self.AV.T @ W)
        AW = self.pencil.A(W)
        for least in (_INDEPENDENT, 0.0):  # what the first pass divides by small numbers, the second makes exact
            gram = _symmetric(W.T @ AW)
            scale = 1.0 / np.sqrt(np.maximum(np.diag(gram), 1e-300))
            values, Q = np.linalg.eigh(gram * scale * scale[:, None])
            good = values > least * max(float(values.max(initial=0.0)), 1e-300)
            if not good.any():
                return False
            Q = (scale[:, None] * Q[:, good]) / np.sqrt(values[good])
            W, AW = W @ Q, AW @ Q
            if least and values[good].min() < _ALIKE * values.max():
                W = W - self.V @ (self.AV.T @ W)
                AW = self.pencil.A(W)  # rounding was divided by small numbers too
        BW = self.pencil.B(W)
        cross = self.V.T @ BW
        self.H = np.block([[self.H, cross], [cross.T, _symmetric(W.T @ BW)]])
        first, self.size = self.size, self.size + W.shape[1]
        for kept, new in ((self._V, W), (self._AV, AW), (self._BV, BW)):
            kept[:, first : self.size] = new
        return True


def _symmetric(H: Array) -> Array:
    return np.asarray((H + H.T) / 2)
