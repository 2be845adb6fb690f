"""Chebyshev iteration with the diagonal blocks as preconditioner, in single precision.

The polynomials of the fourth kind need only a bound of the largest eigenvalue (J. Lottes, Numer. Linear Algebra Appl.
30 (2023) e2518; recurrence from memory, checked by the iteration counts).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import cast

import numpy as np
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix, SingleBlockMatrix
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.lanes import load, minus, plus, store, times, times_plus
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import Array
from fem.solid.shape import inverse as inverse_of
from fem.solid.solver.elimination import Elimination

Single = NDArray[np.float32]
_LANCZOS = 8
"""Products for the bound of the spectrum; see `highest`."""


class BlockJacobi:
    """D^-1 on the held motions: 3 x 3 blocks (n, 3, 3) in single precision, and the shared unknowns of the rigid
    regions as one block.

    For a partly held node with the basis Q it is Q (Q^T K Q)^-1 Q^T, so that what comes out is a held motion.
    """

    def __init__(self, K: BlockMatrix, held: Elimination, threads: int) -> None:
        self.threads = threads
        D = K.diagonal_blocks()
        inverse, _ = inverse_of(D)
        Q = held.basis
        inner = Q.transpose(0, 2, 1) @ D[held.special] @ Q
        unused = ~Q.any(axis=1)
        s, i = np.nonzero(unused)
        inner[s, i, i] = 1.0
        inverse[held.special] = Q @ np.linalg.inv(inner) @ Q.transpose(0, 2, 1)
        self.blocks = inverse.astype(np.float32, order="C")
        self._rows = np.flatnonzero(np.diff(held.rigid.indptr))
        self._rigid = held.rigid[self._rows].toarray()
        if self._rows.size:
            R = held.rigid.toarray()
            self._inner = np.linalg.inv(R.T @ (K @ R))

    def step(
        self,
        source: Single,
        change: Single | None,
        left: Single,
        d: Single,
        z: Single,
        old: float,
        new: float,
        gain: float,
        mode: int,
    ) -> None:
        """left = source - change;  d = old d + new D^-1 left;  and z by `mode` (`BEGIN`, `ADD`, `CARRY`).

        All (3 n, k) and contiguous; without `change` the source is taken as it is and `left` is not written. With
        `old` zero d is not read, but to carry it.
        """
        shared = None
        if self._rows.size:
            there = source[self._rows] if change is None else source[self._rows] - change[self._rows]
            shared = (self._rigid @ (self._inner @ (self._rigid.T @ there.astype(float)))).astype(np.float32)
            shared *= np.float32(new)
        factors = np.float32(old), np.float32(new), np.float32(gain)
        columns = source.shape[1]
        given = (self.blocks, source, source if change is None else change, left, d, z)
        fields = [a.reshape(-1) for a in given]

        def part(first: int, last: int) -> None:
            column = 0
            for width, step in _STEP.items():
                while columns - column >= width:
                    step(first, last, *fields, change is not None, *factors, mode, column, columns)
                    column += width

        run(part, ranges(self.blocks.shape[0]), self.threads)
        if shared is not None:
            d[self._rows] += shared
            z[self._rows] += np.float32(gain) * shared

    def largest(self, K: SingleBlockMatrix, seed: int) -> float:
        """Estimate from above of the largest eigenvalue of D^-1 K, by `highest`."""
        rng = np.random.default_rng(seed)
        r = rng.standard_normal((K.shape[0], 1), dtype=np.float32)
        z, p, q = np.zeros_like(r), np.zeros_like(r), np.zeros_like(r)
        alphas, betas, rz = [], [], 0.0
        for k in range(_LANCZOS + 1):
            self.step(r, None, r, q, z, 0.0, 1.0, 1.0, BEGIN)
            new = float(np.vdot(r, z))
            if not new > 0:
                break
            betas.append(new / rz if k else 0.0)
            if k == _LANCZOS:
                break
            p = z + np.float32(betas[-1]) * p
            K.product(p[:, 0], q[:, 0], self.threads)
            alphas.append(new / float(np.vdot(p, q)))
            r -= np.float32(alphas[-1]) * q
            rz = new
        return highest(alphas, betas)


def highest(alphas: list[float], betas: list[float]) -> float:
    """Estimate from above of the largest eigenvalue, from the coefficients of conjugate gradients.

    The largest value of Lanczos' matrix lies below it; the last component of its vector times the next coefficient of
    Lanczos (from `betas`, one longer than `alphas` unless the space was exhausted) is how far it may be off, and is
    added (Y. Zhou and R.-C. Li, Linear Algebra Appl. 435 (2011) 480-493, "bounding the spectrum of large Hermitian
    matrices"; from memory). Not a strict bound: a start without any part of the highest shape would not see it.
    """
    values, vectors = np.linalg.eigh(_tridiagonal(alphas, betas[: len(alphas)]))
    beyond = np.sqrt(betas[len(alphas)]) / alphas[-1] if len(betas) > len(alphas) else 0.0
    return float(values[-1] + beyond * abs(vectors[-1, -1]))


def ritz_values(alphas: list[float], betas: list[float]) -> Array:
    """Rising eigenvalues of the tridiagonal matrix of Lanczos' method."""
    return np.asarray(np.linalg.eigvalsh(_tridiagonal(alphas, betas[: len(alphas)])), dtype=float)


def _tridiagonal(alphas: list[float], betas: list[float]) -> Array:
    """Lanczos' matrix, from the coefficients of conjugate gradients (Y. Saad, Iterative Methods for Sparse Linear
    Systems, 2nd ed. 2003, 6.7.3; from memory)."""
    a, b = np.array(alphas), np.array(betas)
    diagonal = 1 / a
    diagonal[1:] += b[1:] / a[:-1]
    off = np.sqrt(b[1:]) / a[:-1]
    return np.asarray(np.diag(diagonal) + np.diag(off, 1) + np.diag(off, -1), dtype=float)


BEGIN, ADD, CARRY = 0, 1, 2
"""z = gain d;  z += gain d;  z += d as it was + gain d."""


def _by_lanes(width: int) -> Callable[..., None]:
    """One step of `width` columns side by side, which begin at `column` of rows that are `stride` long."""

    @kernel
    def step(  # type: ignore[no-untyped-def]
        first, last, blocks, source, change, left, d, z, changes, old, new, gain, mode, column, stride
    ):
        one = np.uint64(stride)
        for i in range(first, last):
            at = np.uint64(3 * i) * one + np.uint64(column)
            u, v, w = load(source, at, width), load(source, at + one, width), load(source, at + one + one, width)
            if changes:
                u = minus(u, load(change, at, width))
                v = minus(v, load(change, at + one, width))
                w = minus(w, load(change, at + one + one, width))
                store(left, at, u)
                store(left, at + one, v)
                store(left, at + one + one, w)
            u, v, w = times(new, u), times(new, v), times(new, w)
            for k in range(3):
                b = np.uint64(9 * i + 3 * k)
                g = times_plus(
                    blocks[b], u, times_plus(blocks[b + np.uint64(1)], v, times(blocks[b + np.uint64(2)], w))
                )
                if old != 0:
                    g = times_plus(old, load(d, at, width), g)
                if mode == 0:
                    store(z, at, times(gain, g))
                elif mode == 1:
                    store(z, at, times_plus(gain, g, load(z, at, width)))
                else:
                    store(z, at, times_plus(gain, g, plus(load(d, at, width), load(z, at, width))))
                store(d, at, g)
                at += one

    return cast(Callable[..., None], step)


_STEP = {width: _by_lanes(width) for width in (8, 4, 2, 1)}
