"""Products of the upper half of a symmetric matrix of numbers with many columns; see `fem.solid.kernels.product`."""

from __future__ import annotations

from collections.abc import Callable
from typing import cast

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.lanes import load, plus, store, times, times_plus
from fem.solid.kernels.parallel import ranges, run, weighted_ranges
from fem.solid.shape import Array

Int = NDArray[np.int32]
_PARTS = 4
"""Ranges of rows, each with its own sum: fixed, so that the order of all sums is."""


def _by_lanes(width: int) -> Callable[..., None]:
    @kernel
    def multiply(first, last, indptr, indices, values, x, y, column, stride):  # type: ignore[no-untyped-def]
        """`width` columns from `column` on of the rows first to last and their mirror images; y begins at row first."""
        wide, begin = np.uint64(stride), np.uint64(column)
        shift = wide * np.uint64(first)
        for i in range(first, last):
            r = np.uint64(i) * wide + begin
            mine = load(x, r, width)
            total = times(values[indptr[i]], mine)
            for n in range(indptr[i] + 1, indptr[i + 1]):
                a = values[np.uint64(n)]
                c = np.uint64(indices[np.uint64(n)]) * wide + begin
                total = times_plus(a, load(x, c, width), total)
                store(y, c - shift, times_plus(a, mine, load(y, c - shift, width)))
            store(y, r - shift, plus(load(y, r - shift, width), total))

    return cast(Callable[..., None], multiply)


_WIDTHS = (8, 4, 2, 1)
_MULTIPLY = {width: _by_lanes(width) for width in _WIDTHS}


def scalar_product(indptr: Int, indices: Int, values: Array, x: Array, out: Array, threads: int) -> None:
    """out = A x of contiguous x (n, k)."""
    columns = x.shape[1]
    if columns == 0:
        return
    parts = weighted_ranges(indptr, _PARTS)
    flat_x, flat_out = x.reshape(-1), out.reshape(-1)
    sums: dict[int, Array] = {}

    def work(first: int, last: int) -> None:
        sums[first] = y = flat_out if first == 0 else np.empty(flat_x.size - columns * first)
        y[...] = 0
        column = 0
        for width in _WIDTHS:
            while columns - column >= width:
                _MULTIPLY[width](first, last, indptr, indices, values, flat_x, y, column, columns)
                column += width

    def add(start: int, stop: int) -> None:
        for first, _ in parts[1:]:
            offset = columns * first
            begin = max(start, offset)
            if begin < stop:
                flat_out[begin:stop] += sums[first][begin - offset : stop - offset]

    run(work, parts, threads)
    if len(parts) > 1:
        run(add, ranges(flat_x.size, 4 * _PARTS), threads)
