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

from fem.solid.eigen.space import Pencil, Space, Trial, by_turns
from fem.solid.shape import Array
from geometry.budget import Budget

__all__ = ["Pairs", "Pencil", "extreme_pairs", "largest", "lost", "second_search", "space_room"]

ROUNDS = 120
LEAST_ROOM = 24
ROUNDING = 1e-10
SEARCH_ALLOWED, SEARCH_GAP = 0.1, 1e-3
"""Residual to which a second search goes, and what makes two eigenvalues different ones."""


@dataclass(frozen=True, slots=True)
class Pairs:
    """Pairs in falling order of \\|mu\\|.

    Attributes
    ----------
    mu, x
        (k,) and (f, k) (of a part: f = 3 n, motions of its nodes), with x^T A x = 1.
    residual
        (k,) \\|B x - mu A x\\| over \\|mu A x\\|, both in the norm of A^-1 (or of its approximation): mu is off by at
        most this part, and where it stands alone by its square.
    rounds
        Rounds that were taken.
    space
        What they were found in.
    """

    mu: Array
    x: Array
    residual: Array
    rounds: int
    space: Space | None = None


def space_room(unknowns: int, budget: Budget) -> int:
    """Vectors that a third of the memory holds twice."""
    return int(budget.memory * 2**20 / 3 / (16 * unknowns))


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
        (f, p) vectors to begin with, at least as many (with those known) as pairs are wanted.
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
        Pairs that stand before the start and whose residuals need not be found again.
    """
    wanted, before = tolerance.size, known.mu.size if known else 0
    room = max(min(room, max(5 * wanted, LEAST_ROOM)), 4 * wanted, start.shape[1] + before + wanted)
    keep = room - 3 * wanted
    space, rng = Space(pencil, start.shape[0], room), np.random.default_rng(0)
    if known:
        space.add(known.x)
    space.add(start)
    settled = known or Pairs(np.zeros(0), start[:, :0], np.zeros(0), 0)
    last = np.zeros((0, 0))
    for done in range(1, rounds + 1):
        values, S = space.ritz()
        chosen = choose(values, wanted)
        mu = values[chosen]
        trial = space.trial(mu, S[:, chosen])
        residual = _already(mu, tolerance, settled)
        size, new = np.zeros(mu.size), [np.zeros((start.shape[0], 0))] * mu.size
        fresh = ~(residual < np.inf)
        for look in (fresh, ~fresh) if known is None else (fresh,):  # once these are met, is what was settled still so?
            if look.any():
                _look(trial, np.flatnonzero(look), size, residual, new)
            going = residual > tolerance[: chosen.size]
            if going.any() or chosen.size < wanted:
                break
        if (chosen.size == wanted and not going.any()) or enough(mu, done) or done == rounds:
            break
        settled = Pairs(mu, start[:, :0], residual, done)
        if space.size + wanted > room:
            kept = np.union1d(largest(values, keep), chosen)
            last = space.cut_back(S[:, kept], last, np.searchsorted(kept, chosen))
        else:
            last = S[:, chosen]
        more = np.hstack([new[k] for k in np.flatnonzero(going)] or [start[:, :0]])
        more /= np.where(size[going] > 0, size[going], 1.0)
        if chosen.size < wanted:  # B takes the start to fewer directions than are wanted
            random = rng.standard_normal((start.shape[0], wanted - chosen.size))
            more = np.hstack([more, pencil.precondition(random)])
        if not space.add(more):
            break
    return Pairs(mu, trial.vectors(), residual, done, space)


def _look(trial: Trial, which: NDArray[np.int64], size: Array, residual: Array, new: list[Array]) -> None:
    """Approximate inverse of the residuals of some pairs, its norm and that over the pairs' own."""
    left = trial.residuals(which)
    z = by_turns(trial.space.pencil.precondition, left)
    size[which] = np.sqrt(np.maximum(np.einsum("fk,fk->k", left, z), 0.0))
    mu = trial.mu[which]
    residual[which] = size[which] / np.where(mu != 0, np.abs(mu), 1e-300)
    for at, k in enumerate(which):
        new[k] = z[:, at : at + 1]


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
    return extreme_pairs(pencil, fresh, more, room, known=found)


def lost(found: Pairs, again: Pairs, count: int) -> int:
    """How many of the first pairs are others after a second search."""
    return int((np.abs(again.mu[:count]) > (1.0 + SEARCH_GAP) * np.abs(found.mu[:count])).sum())
