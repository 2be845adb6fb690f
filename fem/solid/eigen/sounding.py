"""Whether a matrix A + s B has negative directions beside those that are known: by Lanczos' method from random vectors.

Known are V with S = V^T (A + s B) V, A V and B V. With Y = (A + s B) V and D chosen so that S + S D S is positive, the
matrix N = A + s B + Y D Y^T falls apart into V, where it is positive, and what is orthogonal to V in A + s B, where it
is A + s B: its negative directions are those of A + s B less those of S, exactly (E. V. Haynsworth, Linear Algebra
Appl. 1 (1968) 73). So nothing is missed if and only if N has none.

The preconditioner P takes N to a matrix P N of few different eigenvalues, whose least one Lanczos' method approaches
from above. Its value after k steps from a vector that makes the angle t with the least eigenvector is at most

    least + d + greatest (tan t / T_{k-1}(1 + 2 d / (greatest - d)))^2      for every d > 0 (relative to the least)

with Chebyshev's polynomial T (J. Kuczynski and H. Wozniakowski, SIAM J. Matrix Anal. Appl. 13 (1992) 1094; this form is
derived, and tested, here). A value above that with least <= 0 is a contradiction: no direction is negative, unless the
random vector was nearly orthogonal to it. Vectors r = W g, g normal, with W^2 >= |B| are so with a known probability: a
negative direction x with x^T P^-1 x = 1 has x^T W^2 x >= x^T |B| x >= x^T A x / |s| >= a / |s| when P A has no
eigenvalue below a.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg as sla

from fem.solid.eigen.space import AT_ONCE, Pencil, Space
from fem.solid.kernels.parallel import ranges, run
from fem.solid.kernels.tall import combine, gram
from fem.solid.shape import Array

CHANCE = 1e-6
"""Allowed probability that a direction which is there goes unseen."""
COLUMNS = 4
"""Random vectors that are followed beside each other: all of them have to miss it."""
STEPS = 60
LEAST_OF_INVERSE = {True: 1.0, False: 0.01}
"""Least eigenvalue of P A, by whether the solver is direct. For an iterative one it is assumed: with one below it,
conjugate gradients would take more steps than the 60 after which that solver gives way (2 sqrt(1 / a) ln(1e6) / 4)."""
_ABOVE = 1.1
"""What the largest value seen is raised by for a bound of the greatest one: an assumption, too."""


@dataclass(frozen=True, slots=True)
class Sounding:
    """`known`: negative directions in the space. `clear`: there is no other one, but for a chance of CHANCE; `found`:
    there is. Neither where the steps did not decide."""

    known: int
    clear: bool
    found: bool
    steps: int


def sound(pencil: Pencil, space: Space, shift: float, rough: Array, least: float) -> Sounding:
    """Look for negative directions of A + shift B outside the space.

    Parameters
    ----------
    space
        What is known. Its A V is used up, but for more soundings.
    rough
        (f, COLUMNS) random vectors W g; see above.
    least
        Of the eigenvalues of P A.
    """
    S = space.HA + shift * space.HB
    values, Q = sla.eigh(S, space.HA)
    weight = np.maximum(1.0 - values, 0.0) / values**2
    threads, size = pencil.threads, space.size
    Y = space.AV
    for first in range(0, size, AT_ONCE):
        some = slice(first, min(first + AT_ONCE, size))
        Y[:, some] += (shift - space.shift) * pencil.B(np.ascontiguousarray(space.V[:, some]))
    space.shift = shift
    D = (Q * weight) @ Q.T

    def apply(z: Array) -> Array:
        out = pencil.A(z) + shift * pencil.B(z)
        return combine(Y, size, D @ gram(Y, size, z, threads), out, threads, 1.0)

    known = int((values < 0).sum())
    v, z = rough, pencil.precondition(rough)
    norm = dots(v, z, threads)
    # squared tangent of the angle that is undercut with the probability CHANCE, by all columns together
    part = CHANCE ** (1.0 / rough.shape[1]) * np.sqrt(np.pi / 2.0)
    tangent = norm * abs(shift) / (least * part**2)
    beta = np.sqrt(norm)
    v, z, before = v / beta, z / beta, np.zeros_like(v)
    diagonals: list[Array] = []
    offs: list[Array] = []
    lowest = np.full(beta.size, np.inf)
    for steps in range(1, STEPS + 1):
        u = apply(z)
        alpha = dots(z, u, threads)
        u -= alpha * v
        if steps > 1:
            u -= beta * before
        diagonals.append(alpha)
        lowest, greatest = _ends(np.array(diagonals), np.array(offs))
        if (lowest <= 0).any():
            return Sounding(known, False, True, steps)
        if (contradicts(lowest, greatest * _ABOVE, tangent, steps)).all():
            return Sounding(known, True, False, steps)
        w = pencil.precondition(u)
        beta = np.sqrt(np.maximum(dots(u, w, threads), 0.0))
        if (beta <= 1e-12 * greatest).any():  # the vectors span all that they can reach
            break
        before, v, z = v, u / beta, w / beta
        offs.append(beta)
    return Sounding(known, False, False, steps)


def told(sounding: Sounding, where: str) -> str:
    """What a sounding says of the number of modes, e.g. ``6 at or below 50 Hz``."""
    if sounding.found:
        return f"more than {where}: {sounding.steps} steps from random vectors found another one"
    return (
        f"{where}: {sounding.steps} steps from random vectors leave a chance below {CHANCE:.0e} that there is one more"
    )


def assumed(least: float) -> str:
    """The sentence on what a sounding takes for granted, with `least` as it was given to it."""
    within = f"the largest value that they met is at least {1.0 / _ABOVE:.0%} of the greatest there is"
    if least == 1.0:
        return f"this takes for granted that {within}"
    return (
        f"this takes for granted that no motion is more than {1.0 / least:.3g} times softer than the solver's "
        f"approximation has it, and that {within}"
    )


def contradicts(lowest: Array, greatest: Array, tangent: Array, steps: int) -> Array:
    """(k,) whether Lanczos' least values after so many steps cannot be had with a least eigenvalue of zero or less."""
    d = lowest * np.linspace(0.05, 0.95, 37)[:, None]
    ratio = np.minimum(d / np.maximum(greatest - d, 1e-300), 1e6)
    grown = np.cosh(np.minimum((steps - 1) * np.arccosh(1.0 + 2.0 * ratio), 300.0))
    return np.asarray((d + greatest * tangent / grown**2).min(axis=0) < lowest)


def _ends(diagonals: Array, offs: Array) -> tuple[Array, Array]:
    """(k,) least and largest eigenvalue of the tridiagonal matrices (steps, k), (steps - 1, k)."""
    if not offs.size:
        return diagonals[0], diagonals[0]
    ends = [np.sort(sla.eigvalsh_tridiagonal(a, b)) for a, b in zip(diagonals.T, offs.T, strict=True)]
    return np.array([e[0] for e in ends]), np.array([e[-1] for e in ends])


def dots(a: Array, b: Array, threads: int) -> Array:
    """(k,) products of the columns of a and b (n, k)."""
    parts = run(lambda i, j: np.einsum("fk,fk->k", a[i:j], b[i:j]), ranges(a.shape[0]), threads)
    return np.asarray(sum(parts[1:], start=parts[0]))
