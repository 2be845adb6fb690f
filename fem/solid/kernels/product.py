"""Products of the upper half of a symmetric block matrix: every block is read once, for both its places."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run, weighted_ranges

Int = NDArray[np.int32]
_PARTS = 4
"""Ranges of rows, each with its own sum: fixed, so that the order of all sums is."""


@kernel
def _product(first, last, indptr, indices, blocks, x, y):  # type: ignore[no-untyped-def]
    """Rows first to last and their mirror images; y begins at row `first`."""
    shift = 3 * first
    for i in range(first, last):
        x0, x1, x2 = x[3 * i], x[3 * i + 1], x[3 * i + 2]
        k = indptr[i]
        s0 = blocks[k, 0, 0] * x0 + blocks[k, 0, 1] * x1 + blocks[k, 0, 2] * x2
        s1 = blocks[k, 1, 0] * x0 + blocks[k, 1, 1] * x1 + blocks[k, 1, 2] * x2
        s2 = blocks[k, 2, 0] * x0 + blocks[k, 2, 1] * x1 + blocks[k, 2, 2] * x2
        for k in range(indptr[i] + 1, indptr[i + 1]):
            c = 3 * indices[k]
            t = c - shift
            a, b, d = blocks[k, 0, 0], blocks[k, 0, 1], blocks[k, 0, 2]
            e, f, g = blocks[k, 1, 0], blocks[k, 1, 1], blocks[k, 1, 2]
            h, o, p = blocks[k, 2, 0], blocks[k, 2, 1], blocks[k, 2, 2]
            u, v, w = x[c], x[c + 1], x[c + 2]
            s0 += a * u + b * v + d * w
            s1 += e * u + f * v + g * w
            s2 += h * u + o * v + p * w
            y[t] += a * x0 + e * x1 + h * x2
            y[t + 1] += b * x0 + f * x1 + o * x2
            y[t + 2] += d * x0 + g * x1 + p * x2
        t = 3 * i - shift
        y[t] += s0
        y[t + 1] += s1
        y[t + 2] += s2


@kernel
def _product_columns(first, last, indptr, indices, blocks, x, y):  # type: ignore[no-untyped-def]
    """As `_product`, of several columns."""
    columns = x.shape[1]
    for i in range(first, last):
        r = 3 * i
        for k in range(indptr[i], indptr[i + 1]):
            c = 3 * indices[k]
            s, t = r - 3 * first, c - 3 * first
            a, b, d = blocks[k, 0, 0], blocks[k, 0, 1], blocks[k, 0, 2]
            e, f, g = blocks[k, 1, 0], blocks[k, 1, 1], blocks[k, 1, 2]
            h, o, p = blocks[k, 2, 0], blocks[k, 2, 1], blocks[k, 2, 2]
            for n in range(columns):
                u, v, w = x[c, n], x[c + 1, n], x[c + 2, n]
                y[s, n] += a * u + b * v + d * w
                y[s + 1, n] += e * u + f * v + g * w
                y[s + 2, n] += h * u + o * v + p * w
            if c > r:
                for n in range(columns):
                    u, v, w = x[r, n], x[r + 1, n], x[r + 2, n]
                    y[t, n] += a * u + e * v + h * w
                    y[t + 1, n] += b * u + f * v + o * w
                    y[t + 2, n] += d * u + g * v + p * w


def product(indptr: Int, indices: Int, blocks: NDArray[Any], x: NDArray[Any], out: NDArray[Any], threads: int) -> None:
    """out = A x of x (3 n,) or (3 n, k), both contiguous and of the blocks' type."""
    parts = weighted_ranges(indptr, _PARTS)
    out[...] = 0
    multiply = _product if x.ndim == 1 else _product_columns
    sums: dict[int, NDArray[Any]] = {}

    def work(first: int, last: int) -> None:
        sums[first] = out if first == 0 else np.zeros((x.shape[0] - 3 * first, *x.shape[1:]), dtype=x.dtype)
        multiply(first, last, indptr, indices, blocks, x, sums[first])

    def add(start: int, stop: int) -> None:
        for first, _ in parts[1:]:
            begin = max(start, 3 * first)
            if begin < stop:
                out[begin:stop] += sums[first][begin - 3 * first : stop - 3 * first]

    run(work, parts, threads)
    if len(parts) > 1:
        run(add, ranges(x.shape[0], _PARTS), threads)
