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
    """Rows first to last and their mirror images, of flat arrays; y begins at row `first`.

    Unsigned places cost no check for being counted from the end: a third of the time.
    """
    one, two = np.uint64(1), np.uint64(2)
    shift = np.uint64(3 * first)
    for i in range(first, last):
        r = np.uint64(3 * i)
        x0, x1, x2 = x[r], x[r + one], x[r + two]
        k = np.uint64(9 * np.int64(indptr[i]))
        s0 = blocks[k] * x0 + blocks[k + one] * x1 + blocks[k + two] * x2
        s1 = blocks[k + np.uint64(3)] * x0 + blocks[k + np.uint64(4)] * x1 + blocks[k + np.uint64(5)] * x2
        s2 = blocks[k + np.uint64(6)] * x0 + blocks[k + np.uint64(7)] * x1 + blocks[k + np.uint64(8)] * x2
        for n in range(indptr[i] + 1, indptr[i + 1]):
            k = np.uint64(n) * np.uint64(9)
            c = np.uint64(indices[np.uint64(n)]) * np.uint64(3)
            t = c - shift
            a, b, d = blocks[k], blocks[k + one], blocks[k + two]
            e, f, g = blocks[k + np.uint64(3)], blocks[k + np.uint64(4)], blocks[k + np.uint64(5)]
            h, o, p = blocks[k + np.uint64(6)], blocks[k + np.uint64(7)], blocks[k + np.uint64(8)]
            u, v, w = x[c], x[c + one], x[c + two]
            s0 += a * u + b * v + d * w
            s1 += e * u + f * v + g * w
            s2 += h * u + o * v + p * w
            y[t] += a * x0 + e * x1 + h * x2
            y[t + one] += b * x0 + f * x1 + o * x2
            y[t + two] += d * x0 + g * x1 + p * x2
        t = r - shift
        y[t] += s0
        y[t + one] += s1
        y[t + two] += s2


@kernel
def _product_two(first, last, indptr, indices, blocks, x, y):  # type: ignore[no-untyped-def]
    """As `_product`, of two columns side by side."""
    one, two, three = np.uint64(1), np.uint64(2), np.uint64(3)
    four, five = np.uint64(4), np.uint64(5)
    shift = np.uint64(6 * first)
    for i in range(first, last):
        r = np.uint64(6 * i)
        x0, x1, x2, x3, x4, x5 = x[r], x[r + one], x[r + two], x[r + three], x[r + four], x[r + five]
        k = np.uint64(9 * np.int64(indptr[i]))
        a, b, d = blocks[k], blocks[k + one], blocks[k + two]
        e, f, g = blocks[k + three], blocks[k + four], blocks[k + five]
        h, o, p = blocks[k + np.uint64(6)], blocks[k + np.uint64(7)], blocks[k + np.uint64(8)]
        s0, s1 = a * x0 + b * x2 + d * x4, a * x1 + b * x3 + d * x5
        s2, s3 = e * x0 + f * x2 + g * x4, e * x1 + f * x3 + g * x5
        s4, s5 = h * x0 + o * x2 + p * x4, h * x1 + o * x3 + p * x5
        for n in range(indptr[i] + 1, indptr[i + 1]):
            k = np.uint64(n) * np.uint64(9)
            c = np.uint64(indices[np.uint64(n)]) * np.uint64(6)
            t = c - shift
            a, b, d = blocks[k], blocks[k + one], blocks[k + two]
            e, f, g = blocks[k + three], blocks[k + four], blocks[k + five]
            h, o, p = blocks[k + np.uint64(6)], blocks[k + np.uint64(7)], blocks[k + np.uint64(8)]
            u0, u1, v0, v1, w0, w1 = x[c], x[c + one], x[c + two], x[c + three], x[c + four], x[c + five]
            s0 += a * u0 + b * v0 + d * w0
            s1 += a * u1 + b * v1 + d * w1
            s2 += e * u0 + f * v0 + g * w0
            s3 += e * u1 + f * v1 + g * w1
            s4 += h * u0 + o * v0 + p * w0
            s5 += h * u1 + o * v1 + p * w1
            y[t] += a * x0 + e * x2 + h * x4
            y[t + one] += a * x1 + e * x3 + h * x5
            y[t + two] += b * x0 + f * x2 + o * x4
            y[t + three] += b * x1 + f * x3 + o * x5
            y[t + four] += d * x0 + g * x2 + p * x4
            y[t + five] += d * x1 + g * x3 + p * x5
        t = r - shift
        y[t] += s0
        y[t + one] += s1
        y[t + two] += s2
        y[t + three] += s3
        y[t + four] += s4
        y[t + five] += s5


@kernel
def _product_columns(first, last, indptr, indices, blocks, x, y):  # type: ignore[no-untyped-def]
    """As `_product`, of many columns: x and y (3 n, k)."""
    one, two = np.uint64(1), np.uint64(2)
    shift = np.uint64(3 * first)
    for i in range(first, last):
        r = np.uint64(3 * i)
        s = r - shift
        for n in range(indptr[i], indptr[i + 1]):
            k = np.uint64(n)
            c = np.uint64(indices[k]) * np.uint64(3)
            t = c - shift
            a, b, d = blocks[k, 0, 0], blocks[k, 0, 1], blocks[k, 0, 2]
            e, f, g = blocks[k, 1, 0], blocks[k, 1, 1], blocks[k, 1, 2]
            h, o, p = blocks[k, 2, 0], blocks[k, 2, 1], blocks[k, 2, 2]
            for m in range(x.shape[1]):
                q = np.uint64(m)
                u, v, w = x[c, q], x[c + one, q], x[c + two, q]
                y[s, q] += a * u + b * v + d * w
                y[s + one, q] += e * u + f * v + g * w
                y[s + two, q] += h * u + o * v + p * w
            if c > r:
                for m in range(x.shape[1]):
                    q = np.uint64(m)
                    u, v, w = x[r, q], x[r + one, q], x[r + two, q]
                    y[t, q] += a * u + e * v + h * w
                    y[t + one, q] += b * u + f * v + o * w
                    y[t + two, q] += d * u + g * v + p * w


def product(indptr: Int, indices: Int, blocks: NDArray[Any], x: NDArray[Any], out: NDArray[Any], threads: int) -> None:
    """out = A x of x (3 n,) or (3 n, k), both contiguous and of the blocks' type."""
    parts = weighted_ranges(indptr, _PARTS)
    out[...] = 0
    columns = 1 if x.ndim == 1 else x.shape[1]
    sums: dict[int, NDArray[Any]] = {}

    def work(first: int, last: int) -> None:
        sums[first] = y = out if first == 0 else np.zeros((x.shape[0] - 3 * first, *x.shape[1:]), dtype=x.dtype)
        if columns <= 2:
            multiply = _product if columns == 1 else _product_two
            multiply(first, last, indptr, indices, blocks.reshape(-1), x.reshape(-1), y.reshape(-1))
        else:
            _product_columns(first, last, indptr, indices, blocks, x, y)

    def add(start: int, stop: int) -> None:
        for first, _ in parts[1:]:
            begin = max(start, 3 * first)
            if begin < stop:
                out[begin:stop] += sums[first][begin - 3 * first : stop - 3 * first]

    run(work, parts, threads)
    if len(parts) > 1:
        run(add, ranges(x.shape[0], _PARTS), threads)
