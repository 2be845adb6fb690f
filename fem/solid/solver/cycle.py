"""One symmetric cycle of two levels: smooth, correct on the coarse level, smooth."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fem.solid.block_matrix import SingleBlockMatrix
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import Array
from fem.solid.solver.smoother import ADD, BEGIN, CARRY, BlockJacobi


def largest(a: NDArray[Any], threads: int) -> Array:
    """(k,) largest size in each column of a (n, k)."""

    def part(first: int, last: int) -> Array:
        out = np.zeros(a.shape[1])
        _largest(first, last, a, out)
        return out

    return np.asarray(np.max(run(part, ranges(a.shape[0]), threads), axis=0))


@kernel
def _largest(first, last, a, out):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for c in range(out.size):
            out[c] = max(out[c], abs(a[i, c]))


GAINS = {
    1: (1.125,),
    2: (1.02387287570313, 1.26408905371085),
    3: (1.00842544782028, 1.08867839208730, 1.33753125909618),
    4: (1.00391310427285, 1.04035811188593, 1.14863498546254, 1.38268869241000),
}
"""Factors of the smoother's steps, by the number of steps: the best for the worst motion that the coarse level does
not see (J. Lottes 2023, see `smoother`; from memory, checked by the iterations that they save)."""
Single = NDArray[np.float32]


Coarse = Callable[[Single, Single], None]
"""Writes the coarse level's correction of the residual (3 n, k) to the second; the residual may be spent on it."""


class Cycle:
    """A symmetric positive approximation of K^-1 on held motions.

    Both smoothings are the same polynomial of D^-1 K, which makes the whole symmetric; residuals are scaled to size
    one before they become single precision. A cycle takes 2 `degree` products: the residual of a smoothing is formed
    once, and the first step of each needs none.
    """

    def __init__(self, K: SingleBlockMatrix, jacobi: BlockJacobi, coarse: Coarse, degree: int, seed: int) -> None:
        self._K, self._jacobi, self._coarse, self._degree = K, jacobi, coarse, degree
        self._bound = jacobi.largest(K, seed)
        self._buffers: dict[int, list[Single]] = {}

    def __call__(self, residual: Array, out: Array) -> None:
        """out = M residual, both (3 n, k) in double precision."""
        r, z = self._room(residual.shape)[:2]
        threads = self._jacobi.threads
        rows = ranges(r.shape[0])
        scale = largest(residual, threads)
        scale = np.where(scale > 0, scale, 1.0)
        run(lambda a, b: _copy(a, b, residual, 1 / scale, r), rows, threads)
        self.correct(r, z)
        run(lambda a, b: _copy(a, b, z, scale, out), rows, threads)

    def correct(self, r: Single, z: Single) -> None:
        """z = M r in single precision."""
        left, d, w = self._room(r.shape)[2:]
        threads = self._jacobi.threads
        self._smooth(r, None, left, z, d, w, BEGIN)
        self._K.product(z, w, threads)
        run(lambda a, b: np.subtract(r[a:b], w[a:b], out=left[a:b]), ranges(r.shape[0]), threads)
        self._coarse(left, d)
        self._K.product(d, w, threads)
        self._smooth(left, w, left, z, d, w, CARRY)

    def close(self) -> None:
        """Give memory back."""
        self._buffers.clear()

    def _room(self, shape: tuple[int, ...]) -> list[Single]:
        if shape[1] not in self._buffers:
            self._buffers = {shape[1]: [np.empty(shape, np.float32) for _ in range(5)]}
        return self._buffers[shape[1]]

    def _smooth(
        self, source: Single, change: Single | None, left: Single, z: Single, d: Single, w: Single, mode: int
    ) -> None:
        """Smooth z, whose residual is source - change; `left` is then of no use."""
        for k, gain in enumerate(GAINS[self._degree], start=1):
            if k > 1:
                change = self._K.product(d, w, self._jacobi.threads)
            old = (2 * k - 3) / (2 * k + 1) if k > 1 else 0.0
            new = (8 * k - 4) / ((2 * k + 1) * self._bound)
            self._jacobi.step(source, change, left, d, z, old, new, gain, mode if k == 1 else ADD)
            if change is not None:
                source = left


@kernel
def _copy(first, last, source, factor, out):  # type: ignore[no-untyped-def]
    """out = source times the factor of each column, in the type of `out`."""
    for i in range(first, last):
        for c in range(out.shape[1]):
            out[i, c] = source[i, c] * factor[c]
