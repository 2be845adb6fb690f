"""Conjugate gradients for several right-hand sides at once, each with its own coefficients and all with one product.

The iteration runs on the nodes' motions u = T y themselves: the preconditioner gives held motions only, so that the
residual need not be projected. Mean rows C u = d are kept by the projected preconditioner
z - W (C W)^-1 C z, z = M r, W = M C^T, with the residual's part C^T m taken off as it appears (N. I. M. Gould, M. E.
Hribar, J. Nocedal, SIAM J. Sci. Comput. 23 (2001) 1376).

It stops on the energy of the error: the steps alpha (r, z) of the last `DELAY` iterations are the energy that the
iterate before them had missed (M. R. Hestenes, E. Stiefel 1952; Z. Strakos, P. Tichy, ETNA 13 (2002) 56).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.kernels.product import padded
from fem.solid.shape import Array

DELAY = 2
MOST_ITERATIONS = 60
Operator = Callable[[Array, Array], object]
"""Writes the image of the first (3 n, k) to the second."""


class Stalled(Exception):
    """The iteration does not converge; the message says how it was noticed."""


@dataclass(frozen=True, slots=True)
class Iterate:
    """u (3 n, k), multipliers (rows, k), and the number of iterations."""

    u: Array
    multipliers: Array
    iterations: int


@dataclass(frozen=True, slots=True)
class MeanRows:
    """C (rows, 3 n) dense, W = M C^T (3 n, rows), and the inverse of C W."""

    C: Array
    W: Array
    inverse: Array


@dataclass(frozen=True, slots=True)
class Goal:
    """When to stop: energy and `met`, both.

    Attributes
    ----------
    energy
        (k,) allowed error in the norm of the energy, over the norm of the solution, as it was `DELAY` iterations ago.
    floor
        (k,) energy that counts as nothing: the rounding of a start that is a large rigid motion.
    met
        Whether (j,) motions and residuals (3 n, j) of the columns with these numbers (j,) are near enough.
    known
        Solution (3 n,) of the last column and the largest error, over its largest value, with which that one is done
        before its time: this error is measured.
    """

    energy: Array
    floor: Array
    met: Callable[[Array, Array, NDArray[np.intp]], NDArray[np.bool_]]
    known: tuple[Array, float] | None = None


def conjugate_gradients(
    product: Operator,
    precondition: Operator,
    loads: Array,
    start: Array | None,
    rows: MeanRows | None,
    goal: Goal,
    threads: int,
) -> Iterate:
    """Solve K u + C^T m = f for the columns of f (3 n, k), beginning at u = `start`, which has the C u wanted.

    Raises
    ------
    Stalled
        After `MOST_ITERATIONS`, or when an inner product that a positive definite system has positive is not.
    """
    state = _State(product, loads, start, rows, goal)
    for iteration in range(1, MOST_ITERATIONS + 1):
        if not state.step(product, precondition, rows, threads):
            return state.ended(iteration - 1)
        if not state.active.any():
            return state.ended(iteration)
        state.narrow()
    raise Stalled(state.why())


class _State:
    """The columns that are still iterated, side by side; one that is done is put away when the rest is cheaper alone.

    A product takes 1, 2 or a multiple of 4 columns (`padded`).
    """

    def __init__(self, product: Operator, loads: Array, start: Array | None, rows: MeanRows | None, goal: Goal) -> None:
        columns = loads.shape[1]
        self.goal, self.number = goal, np.arange(columns)
        self.found = Iterate(np.zeros_like(loads), np.zeros((rows.C.shape[0] if rows else 0, columns)), 0)
        self.r, self.u, self.multipliers = loads.copy(), np.zeros_like(loads), self.found.multipliers.copy()
        self.z, self.p, self.q = np.empty_like(loads), np.zeros_like(loads), np.empty_like(loads)
        self.energy = goal.floor.copy()
        if start is not None:
            self.u += start
            product(self.u, self.q)
            self.r -= self.q
            self.energy += (self.u * self.q).sum(axis=0)
        self.steps: list[Array] = []
        self.active = np.ones(columns, dtype=bool)
        self.before = np.ones(columns)

    def step(self, product: Operator, precondition: Operator, rows: MeanRows | None, threads: int) -> bool:
        """One iteration; false when there was nothing left to do."""
        r, z, p, q = self.r, self.z, self.p, self.q
        precondition(r, z)
        if rows:
            m = rows.inverse @ (rows.C @ z)
            z -= rows.W @ m
            r -= rows.C.T @ m
            self.multipliers += m
        rz = dot(r, z, threads)
        self.active &= rz != 0
        active = self.active
        if not active.any():
            return False
        if not (rz[active] > 0).all():
            raise Stalled(f"the preconditioner was not positive (r.z = {rz[active].min():.2g})")
        advance(z, p, rz / self.before if self.steps else np.zeros(rz.size), threads)
        product(p, q)
        pq = dot(p, q, threads)
        if not (pq[active] > 0).all():
            raise Stalled(f"the stiffness was not positive (p.Ap = {pq[active].min():.2g})")
        alpha = np.where(active, rz / np.where(active, pq, 1.0), 0.0)
        move(self.u, r, p, q, alpha, threads)
        self.steps.append(alpha * rz)
        self.energy += self.steps[-1]
        self.before = np.where(active, rz, 1.0)
        self._look(threads)
        return True

    def _look(self, threads: int) -> None:
        """Which columns are done."""
        goal = self.goal
        met = (self.missed() <= goal.energy[self.number] ** 2 * self.energy) & (len(self.steps) >= DELAY)
        if goal.known is not None:
            field, allowed = goal.known
            known = self.number == goal.energy.size - 1
            if (known & self.active).any():
                off = farthest(self.u, int(known.argmax()), field, threads)
                self.active &= ~(known & (off <= allowed * float(np.abs(field).max())))
        if (met & self.active).any():
            self.active &= ~(met & goal.met(self.u, self.r, self.number))

    def missed(self) -> Array:
        """(j,) energy that the iterate `DELAY` iterations ago had missed."""
        return np.asarray(np.sum(self.steps[-DELAY:], axis=0))

    def narrow(self) -> None:
        """Put columns away that are done, if the product of the rest then takes fewer."""
        kept = self.active
        if padded(int(kept.sum())) >= padded(kept.size):
            return
        self._put_away(~kept)
        self.number, self.active = self.number[kept], self.active[kept]
        self.r, self.u, self.p = (np.ascontiguousarray(a[:, kept]) for a in (self.r, self.u, self.p))
        self.z, self.q = np.empty_like(self.r), np.empty_like(self.r)
        self.multipliers, self.energy, self.before = self.multipliers[:, kept], self.energy[kept], self.before[kept]
        self.steps = [step[kept] for step in self.steps]

    def _put_away(self, which: NDArray[np.bool_]) -> None:
        self.found.u[:, self.number[which]] = self.u[:, which]
        self.found.multipliers[:, self.number[which]] = self.multipliers[:, which]

    def ended(self, iterations: int) -> Iterate:
        """The solution of all columns."""
        if self.number.size == self.found.u.shape[1]:
            return Iterate(self.u, self.multipliers, iterations)
        self._put_away(np.ones(self.number.size, dtype=bool))
        return Iterate(self.found.u, self.found.multipliers, iterations)

    def why(self) -> str:
        """Why it did not come to an end."""
        allowed = self.goal.energy[self.number]
        left = np.where(self.active, np.sqrt(self.missed() / self.energy), 0.0)
        worst = int((left / allowed).argmax())
        if left[worst] <= allowed[worst]:
            return f"after {MOST_ITERATIONS} iterations the residual was not yet small enough"
        return (
            f"after {MOST_ITERATIONS} iterations the error in the norm of the energy was still {left[worst]:.1e}, "
            f"{allowed[worst]:.0e} is wanted"
        )


def farthest(u: Array, column: int, field: Array, threads: int) -> float:
    """Largest difference of a column of u (n, k) from a field (n,)."""

    def part(first: int, last: int) -> float:
        return float(np.abs(u[first:last, column] - field[first:last]).max())

    return max(run(part, ranges(u.shape[0]), threads))


def dot(a: Array, b: Array, threads: int) -> Array:
    """(k,) products of the columns of a and b (n, k), summed in a fixed order."""

    def part(first: int, last: int) -> Array:
        out = np.zeros(a.shape[1])
        _dot(first, last, a, b, out)
        return out

    return np.asarray(np.sum(run(part, ranges(a.shape[0]), threads), axis=0))


def advance(z: Array, p: Array, beta: Array, threads: int) -> None:
    """p = z + beta p."""
    run(lambda i, j: _advance(i, j, z, p, beta), ranges(z.shape[0]), threads)


def move(u: Array, r: Array, p: Array, q: Array, alpha: Array, threads: int) -> None:
    """u += alpha p;  r -= alpha q."""
    run(lambda i, j: _move(i, j, u, r, p, q, alpha), ranges(u.shape[0]), threads)


@kernel
def _dot(first, last, a, b, out):  # type: ignore[no-untyped-def]
    for c in range(a.shape[1]):
        total = 0.0
        for i in range(first, last):
            total += a[i, c] * b[i, c]
        out[c] = total


@kernel
def _advance(first, last, z, p, beta):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for c in range(z.shape[1]):
            p[i, c] = z[i, c] + beta[c] * p[i, c]


@kernel
def _move(first, last, u, r, p, q, alpha):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for c in range(u.shape[1]):
            u[i, c] += alpha[c] * p[i, c]
            r[i, c] -= alpha[c] * q[i, c]
