"""Products of the upper half of a symmetric block matrix: every block is read once, for both its places."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.lanes import load, plus, store, times, times_plus
from fem.solid.kernels.parallel import ranges, run, weighted_ranges

Int = NDArray[np.int32]
_PARTS = 4
"""Ranges of rows, each with its own sum: fixed, so that the order of all sums is."""
_FEW = 4000
"""Rows of such sums up to which adding them up is not worth a second thread."""


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


def _by_lanes(width: int) -> Callable[..., None]:
    """As `_product`, of `width` columns side by side, which begin at `column` of the rows of x and y `stride` long."""

    @kernel
    def multiply(first, last, indptr, indices, blocks, x, y, column, stride):  # type: ignore[no-untyped-def]
        one, two = np.uint64(stride), np.uint64(2 * stride)
        three, shift, begin = np.uint64(3 * stride), np.uint64(3 * stride * first), np.uint64(column)
        for i in range(first, last):
            r = np.uint64(i) * three + begin
            x0, x1, x2 = load(x, r, width), load(x, r + one, width), load(x, r + two, width)
            k = np.uint64(9 * np.int64(indptr[i]))
            a, b, d, e, f, g, h, o, p = _entries(blocks, k)
            s0 = times_plus(a, x0, times_plus(b, x1, times(d, x2)))
            s1 = times_plus(e, x0, times_plus(f, x1, times(g, x2)))
            s2 = times_plus(h, x0, times_plus(o, x1, times(p, x2)))
            for n in range(indptr[i] + 1, indptr[i + 1]):
                a, b, d, e, f, g, h, o, p = _entries(blocks, np.uint64(n) * np.uint64(9))
                c = np.uint64(indices[np.uint64(n)]) * three + begin
                t = c - shift
                u, v, w = load(x, c, width), load(x, c + one, width), load(x, c + two, width)
                s0 = times_plus(a, u, times_plus(b, v, times_plus(d, w, s0)))
                s1 = times_plus(e, u, times_plus(f, v, times_plus(g, w, s1)))
                s2 = times_plus(h, u, times_plus(o, v, times_plus(p, w, s2)))
                store(y, t, times_plus(a, x0, times_plus(e, x1, times_plus(h, x2, load(y, t, width)))))
                t += one
                store(y, t, times_plus(b, x0, times_plus(f, x1, times_plus(o, x2, load(y, t, width)))))
                t += one
                store(y, t, times_plus(d, x0, times_plus(g, x1, times_plus(p, x2, load(y, t, width)))))
            t = r - shift
            store(y, t, plus(load(y, t, width), s0))
            store(y, t + one, plus(load(y, t + one, width), s1))
            store(y, t + two, plus(load(y, t + two, width), s2))

    return cast(Callable[..., None], multiply)


@kernel
def _entries(blocks, k):  # type: ignore[no-untyped-def]
    one, two, three = np.uint64(1), np.uint64(2), np.uint64(3)
    a, b, d = blocks[k], blocks[k + one], blocks[k + two]
    k += three
    e, f, g = blocks[k], blocks[k + one], blocks[k + two]
    k += three
    return a, b, d, e, f, g, blocks[k], blocks[k + one], blocks[k + two]


_MULTIPLY = {width: _by_lanes(width) for width in (2, 4, 8)}


def padded(columns: int) -> int:
    """Columns that a product of `columns` really takes: 1, 2 or a multiple of 4."""
    return columns if columns <= 2 else -(-columns // 4) * 4


@dataclass(frozen=True, slots=True)
class Part:
    """A range of rows and what it writes: rows first to last to the result itself as far as `split`, all else, from
    row `split` to row `top`, to a sum of its own, since other ranges write there too."""

    first: int
    last: int
    split: int
    top: int


def divide(indptr: Int, indices: Int) -> list[Part]:
    """Ranges of rows with about equal numbers of blocks. Where neighbours have near numbers, their sums are short."""
    farthest = indices[indptr[1:] - 1]  # of each row: its blocks stand in rising order
    found = []
    for first, last in weighted_ranges(indptr, _PARTS):
        beyond = farthest[first:last] >= last
        split = first + int(beyond.argmax()) if beyond.any() else last
        found.append(Part(first, last, split, int(farthest[split:last].max(initial=split - 1)) + 1))
    return found


def product(
    indptr: Int,
    indices: Int,
    blocks: NDArray[Any],
    x: NDArray[Any],
    out: NDArray[Any],
    threads: int,
    parts: list[Part] | None = None,
) -> None:
    """out = A x of x (3 n,) or (3 n, k), both contiguous and of the blocks' type; `parts` of `divide`, if at hand."""
    columns = 1 if x.ndim == 1 else x.shape[1]
    if columns == 0:
        return
    if columns != padded(columns):
        wide = np.zeros((x.shape[0], padded(columns)), dtype=x.dtype)
        wide[:, :columns] = x
        result = np.empty_like(wide)
        product(indptr, indices, blocks, wide, result, threads, parts)
        out[...] = result[:, :columns]
        return
    parts = divide(indptr, indices) if parts is None else parts
    width = 3 * columns
    flat_x, flat_out, flat_blocks = x.reshape(-1), out.reshape(-1), blocks.reshape(-1)

    def rows(first: int, last: int, y: NDArray[Any]) -> None:
        """Adds rows first to last to y, which begins at row `first`."""
        if columns == 1:
            _product(first, last, indptr, indices, flat_blocks, flat_x, y)
        for column in range(0, columns if columns > 1 else 0, 8):
            multiply = _MULTIPLY[min(8, columns - column)]
            multiply(first, last, indptr, indices, flat_blocks, flat_x, y, column, columns)

    def work(k: int, _: int) -> NDArray[Any]:
        part = parts[k]
        flat_out[width * part.first : width * part.last] = 0
        if part.split > part.first:
            rows(part.first, part.split, flat_out[width * part.first :])
        own = np.zeros(width * (part.top - part.split), dtype=x.dtype)
        if part.last > part.split:
            rows(part.split, part.last, own)
        return own

    sums = run(work, [(k, k + 1) for k in range(len(parts))], threads)

    def add(start: int, stop: int) -> None:
        for part, own in zip(parts, sums, strict=True):
            begin, end = max(start, width * part.split), min(stop, width * part.top)
            if begin < end:
                flat_out[begin:end] += own[begin - width * part.split : end - width * part.split]

    overlap = sum(part.top - part.split for part in parts)
    if overlap:
        everything = overlap > _FEW
        run(add, ranges(flat_x.size, _PARTS if everything else 1), threads)
