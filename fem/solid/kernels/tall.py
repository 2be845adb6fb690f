"""Products of tall arrays, many rows and few columns, in ranges of rows whose sums are added in a fixed order.

General libraries share such products among threads in ways that move the last digits with the number of threads, and
make new arrays where one in place would do.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import cast

import numpy as np

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.lanes import load, store, times, times_plus
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import Array

_ROWS_AT_ONCE = 2048
"""Rows that are turned in place together."""


def _grams(width: int) -> Callable[..., None]:
    @kernel
    def gram(first, last, a, size, stride, b, column, columns, out):  # type: ignore[no-untyped-def]
        """out (size, columns) += a[:, :size]^T b of the rows first to last, `width` columns from `column` on."""
        long, wide = np.uint64(stride), np.uint64(columns)
        for i in range(first, last):
            at = np.uint64(i) * long
            w = load(b, np.uint64(i) * wide + np.uint64(column), width)
            to = np.uint64(column)
            for s in range(size):
                store(out, to, times_plus(a[at + np.uint64(s)], w, load(out, to, width)))
                to += wide

    return cast(Callable[..., None], gram)


def _combinations(width: int) -> Callable[..., None]:
    @kernel
    def combine(first, last, a, size, stride, c, keep, out, column, columns, shift):  # type: ignore[no-untyped-def]
        """out (rows from `shift` on, columns) = keep out + a[:, :size] c, `width` columns from `column` on."""
        long, wide = np.uint64(stride), np.uint64(columns)
        for i in range(first, last):
            at = np.uint64(i) * long
            to = np.uint64(i - shift) * wide + np.uint64(column)
            place = np.uint64(column)
            total = times(a[at], load(c, place, width))
            for s in range(1, size):
                place += wide
                total = times_plus(a[at + np.uint64(s)], load(c, place, width), total)
            if keep != 0.0:
                total = times_plus(keep, load(out, to, width), total)
            store(out, to, total)

    return cast(Callable[..., None], combine)


_WIDTHS = (8, 4, 2, 1)
_GRAM = {width: _grams(width) for width in _WIDTHS}
_COMBINE = {width: _combinations(width) for width in _WIDTHS}


def _windows(columns: int) -> list[tuple[int, int]]:
    """(first column, width) of windows that cover the columns."""
    out, column = [], 0
    for width in _WIDTHS:
        while columns - column >= width:
            out.append((column, width))
            column += width
    return out


def gram(a: Array, size: int, b: Array, threads: int) -> Array:
    """a[:, :size]^T b (size, k) of contiguous a (n, m) and b (n, k)."""
    flat_a, flat_b, columns = a.reshape(-1), b.reshape(-1), b.shape[1]

    def part(first: int, last: int) -> Array:
        out = np.zeros(size * columns)
        for column, width in _windows(columns):
            _GRAM[width](first, last, flat_a, size, a.shape[1], flat_b, column, columns, out)
        return out

    total = np.zeros(size * columns)
    for some in run(part, ranges(a.shape[0]), threads):
        total += some
    return total.reshape(size, columns)


def combine(a: Array, size: int, c: Array, out: Array, threads: int, keep: float = 0.0) -> Array:
    """out = keep out + a[:, :size] c of contiguous a (n, m), c (size, k) and out (n, k), which is given back."""
    columns = out.shape[1]
    if not size:
        out *= keep
        return out
    flat_a, flat_c, flat = a.reshape(-1), np.ascontiguousarray(c, dtype=np.float64).reshape(-1), out.reshape(-1)

    def part(first: int, last: int) -> None:
        for column, width in _windows(columns):
            _COMBINE[width](first, last, flat_a, size, a.shape[1], flat_c, keep, flat, column, columns, 0)

    run(part, ranges(a.shape[0]), threads)
    return out


def turn(a: Array, size: int, c: Array, threads: int) -> None:
    """a[:, :k] = a[:, :size] c in place, of contiguous a (n, m) and c (size, k)."""
    columns = c.shape[1]
    flat_a, flat_c = a.reshape(-1), np.ascontiguousarray(c, dtype=np.float64).reshape(-1)

    def part(first: int, last: int) -> None:
        for begin in range(first, last, _ROWS_AT_ONCE):
            end = min(begin + _ROWS_AT_ONCE, last)
            out = np.empty((end - begin, columns))
            for column, width in _windows(columns):
                _COMBINE[width](
                    begin, end, flat_a, size, a.shape[1], flat_c, 0.0, out.reshape(-1), column, columns, begin
                )
            a[begin:end, :columns] = out

    run(part, ranges(a.shape[0]), threads)
