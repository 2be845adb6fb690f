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
    """When to stop: both must be met.

    Attributes
    ----------
    energy
        (k,) allowed error in the norm of the energy, over the norm of the solution, as it was `DELAY` iterations ago.
    floor
        (k,) energy that counts as nothing: the rounding of a start that is a large rigid motion.
    met
        Whether (k,) the residuals of motions and residuals (3 n, k) are small enough.
    """

    energy: Array
    floor: Array
    met: Callable[[Array, Array], NDArray[np.bool_]]


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
    columns = loads.shape[1]
    r = loads.copy()
    u = np.zeros_like(loads)
    z, p, q = np.empty_like(loads), np.zeros_like(loads), np.empty_like(loads)
    multipliers = np.zeros((rows.C.shape[0] if rows else 0, columns))
    energy = goal.floor.copy()
    if start is not None:
        u += start
        product(u, q)
        r -= q
        energy += (u * q).sum(axis=0)
    steps: list[Array] = []
    active = np.ones(columns, dtype=bool)
    before = np.ones(columns)
    for iteration in range(1, MOST_ITERATIONS + 1):
        precondition(r, z)
        if rows:
            m = rows.inverse @ (rows.C @ z)
            z -= rows.W @ m
            r -= rows.C.T @ m
            multipliers += m
        rz = dot(r, z, threads)
        active &= rz != 0
        if not active.any():
            return Iterate(u, multipliers, iteration - 1)
        if not (rz[active] > 0).all():
            raise Stalled(f"the preconditioner was not positive (r.z = {rz[active].min():.2g})")
        advance(z, p, rz / before if iteration > 1 else np.zeros(columns), threads)
        product(p, q)
        pq = dot(p, q, threads)
        if not (pq[active] > 0).all():
            raise Stalled(f"the stiffness was not positive (p.Ap = {pq[active].min():.2g})")
        alpha = np.where(active, rz / np.where(active, pq, 1.0), 0.0)
        move(u, r, p, q, alpha, threads)
        steps.append(alpha * rz)
        energy += steps[-1]
        before = np.where(active, rz, 1.0)
        missed = np.sum(steps[-DELAY:], axis=0)
        met = (missed <= goal.energy**2 * energy) & (len(steps) >= DELAY)
        if (met & active).any():
            active &= ~(met & goal.met(u, r))
        if not active.any():
            return Iterate(u, multipliers, iteration)
    left = np.where(active, np.sqrt(missed / energy), 0.0)
    worst = int((left / goal.energy).argmax())
    if left[worst] <= goal.energy[worst]:
        raise Stalled(f"after {MOST_ITERATIONS} iterations the residual was not yet small enough")
    raise Stalled(
        f"after {MOST_ITERATIONS} iterations the error in the norm of the energy was still {left[worst]:.1e}, "
        f"{goal.energy[worst]:.0e} is wanted"
    )


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
