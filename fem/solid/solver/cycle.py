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
        r, z, d, w = self._buffers[columns]
        scale = largest(residual, self._jacobi.threads)
        scale = np.where(scale > 0, scale, 1.0)
        np.divide(residual, scale, out=r, casting="same_kind")
        z[:] = 0
        self._smooth(r, z, d, w, first=True)
        self._K.product(z, w, self._jacobi.threads)
        np.subtract(r, w, out=w)
        self._transfer.prolong(self._coarse(self._transfer.restrict(w)), z)
        self._smooth(r, z, d, w, first=False)
        np.multiply(z, scale, out=out)

    def close(self) -> None:
        """Give memory back."""
        self._buffers.clear()

    def _smooth(self, r: Any, z: Any, d: Any, w: Any, first: bool) -> None:
        for k in range(1, self._degree + 1):
            fresh = first and k == 1
            if not fresh:
                self._K.product(z, w, self._jacobi.threads)
            old = (2 * k - 3) / (2 * k + 1) if k > 1 else 0.0
            new = (8 * k - 4) / ((2 * k + 1) * self._bound)
            self._jacobi.step(r, None if fresh else w, d, z, old, new)
