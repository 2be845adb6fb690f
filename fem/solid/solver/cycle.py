"""One symmetric cycle of two levels: smooth, correct on the coarse level, smooth."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from fem.solid.block_matrix import SingleBlockMatrix
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import Array
from fem.solid.solver.smoother import BlockJacobi


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
}
"""Factors of the smoother's steps, by the number of steps: the best for the worst motion that the coarse level does
not see (J. Lottes 2023, see `smoother`; from memory, checked by the iterations that they save)."""
Single = NDArray[np.float32]


class Coarse(Protocol):
    """What takes residuals to the coarse level and corrections back, each the transpose of the other."""

    def restrict(self, r: NDArray[Any]) -> Array:
        """(f', k) of (3 n, k)."""

    def prolong(self, y: Array, z: NDArray[Any]) -> None:
        """Adds the image of y (f', k) to z (3 n, k)."""


class Cycle:
    """A symmetric positive approximation of K^-1 on held motions.

    Both smoothings are the same polynomial of D^-1 K, which makes the whole symmetric; residuals are scaled to size
    one before they become single precision.
    """

    def __init__(
        self,
        K: SingleBlockMatrix,
        jacobi: BlockJacobi,
        transfer: Coarse,
        coarse: Callable[[Array], Array],
        degree: int,
        seed: int,
    ) -> None:
        self._K, self._jacobi, self._transfer, self._coarse, self._degree = K, jacobi, transfer, coarse, degree
        self._bound = jacobi.largest(K, seed)
        self._buffers: dict[int, list[NDArray[np.float32]]] = {}

    def __call__(self, residual: Array, out: Array) -> None:
        """out = M residual, both (3 n, k) in double precision."""
        columns = residual.shape[1]
        if columns not in self._buffers:
            self._buffers = {columns: [np.empty(residual.shape, np.float32) for _ in range(4)]}
        left, z, d, w = self._buffers[columns]
        threads = self._jacobi.threads
        rows = ranges(left.shape[0])
        scale = largest(residual, threads)
        scale = np.where(scale > 0, scale, 1.0)
        run(lambda a, b: _copy(a, b, residual, 1 / scale, left), rows, threads)
        z[:] = 0
        self._smooth(left, None, z, d, w)
        self._K.product(z, w, threads)
        run(lambda a, b: _left(a, b, residual, 1 / scale, w, left), rows, threads)
        d[:] = 0
        self._transfer.prolong(self._coarse(self._transfer.restrict(left)), d)
        run(lambda a, b: np.add(z[a:b], d[a:b], out=z[a:b]), rows, threads)
        self._K.product(d, w, threads)
        self._smooth(left, w, z, d, w)
        run(lambda a, b: _copy(a, b, z, scale, out), rows, threads)

    def close(self) -> None:
        """Give memory back."""
        self._buffers.clear()

    def _smooth(self, left: Single, change: Single | None, z: Single, d: Single, w: Single) -> None:
        """Smooth z, whose residual is left - change; `left` is afterwards nothing of use."""
        for k, gain in enumerate(GAINS[self._degree], start=1):
            if k > 1:
                change = self._K.product(d, w, self._jacobi.threads)
            old = (2 * k - 3) / (2 * k + 1) if k > 1 else 0.0
            new = (8 * k - 4) / ((2 * k + 1) * self._bound)
            self._jacobi.step(left, change, d, z, old, new, gain)


@kernel
def _left(first, last, source, factor, change, out):  # type: ignore[no-untyped-def]
    """out = source times the factor of each column - change."""
    for i in range(first, last):
        for c in range(out.shape[1]):
            out[i, c] = out.dtype.type(source[i, c] * factor[c]) - change[i, c]


@kernel
def _copy(first, last, source, factor, out):  # type: ignore[no-untyped-def]
    """out = source times the factor of each column, in the type of `out`."""
    for i in range(first, last):
        for c in range(out.shape[1]):
            out[i, c] = source[i, c] * factor[c]
