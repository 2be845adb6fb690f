"""Scalar CSR matrices of the upper half of a symmetric block matrix."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import Array

Int = NDArray[np.int32]


@kernel
def _upper_counts(first, last, indptr, indices, place, counts):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        width = 0
        for k in range(indptr[i] + 1, indptr[i + 1]):
            j = 3 * indices[k]
            width += (place[j] >= 0) + (place[j + 1] >= 0) + (place[j + 2] >= 0)
        for c in range(2, -1, -1):
            row = place[3 * i + c]
            if row >= 0:
                width += 1
                counts[row] = width


@kernel
def _upper_fill(first, last, indptr, indices, blocks, place, starts, columns, data):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for c in range(3):
            row = place[3 * i + c]
            if row < 0:
                continue
            n = starts[row]
            for d in range(c, 3):
                column = place[3 * i + d]
                if column >= 0:
                    columns[n] = column
                    data[n] = blocks[indptr[i], c, d]
                    n += 1
            for k in range(indptr[i] + 1, indptr[i + 1]):
                for d in range(3):
                    column = place[3 * indices[k] + d]
                    if column >= 0:
                        columns[n] = column
                        data[n] = blocks[k, c, d]
                        n += 1


@kernel
def _lower_blocks(indptr, indices, starts, rows, slots):  # type: ignore[no-untyped-def]
    """Blocks below the diagonal: the transpose of those above. starts (n + 1,), rows and slots of each."""
    n = indptr.size - 1
    for i in range(n):
        for k in range(indptr[i] + 1, indptr[i + 1]):
            starts[indices[k] + 1] += 1
    for i in range(n):
        starts[i + 1] += starts[i]
    for i in range(n):
        for k in range(indptr[i] + 1, indptr[i + 1]):
            j = indices[k]
            rows[starts[j]] = i
            slots[starts[j]] = k
            starts[j] += 1
    for i in range(n, 0, -1):
        starts[i] = starts[i - 1]
    starts[0] = 0


@kernel
def _full_fill(first, last, indptr, indices, blocks, starts, rows, slots, lengths, columns, data):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for c in range(3):
            n = lengths[3 * i + c]
            for s in range(starts[i], starts[i + 1]):
                for d in range(3):
                    columns[n] = 3 * rows[s] + d
                    data[n] = blocks[slots[s], d, c]
                    n += 1
            for k in range(indptr[i], indptr[i + 1]):
                for d in range(3):
                    columns[n] = 3 * indices[k] + d
                    data[n] = blocks[k, c, d]
                    n += 1


def upper_csr(indptr: Int, indices: Int, blocks: Array, place: Int, kept: int, threads: int) -> tuple[Array, Int, Int]:
    """data, columns and row starts of the upper triangle; place (3 n,) is each unknown's new number, or -1."""
    n = indptr.size - 1
    starts = np.zeros(kept + 1, dtype=np.int32)
    run(lambda a, b: _upper_counts(a, b, indptr, indices, place, starts[1:]), ranges(n), threads)
    np.cumsum(starts, out=starts)
    columns, data = np.empty(starts[-1], dtype=np.int32), np.empty(starts[-1])
    run(lambda a, b: _upper_fill(a, b, indptr, indices, blocks, place, starts, columns, data), ranges(n), threads)
    return data, columns, starts


def full_csr(indptr: Int, indices: Int, blocks: Array, threads: int) -> tuple[Array, Int, Int]:
    """data, columns and row starts of the whole matrix."""
    n = indptr.size - 1
    below = indices.size - n
    starts = np.zeros(n + 1, dtype=np.int32)
    rows, slots = np.empty(below, dtype=np.int32), np.empty(below, dtype=np.int32)
    _lower_blocks(indptr, indices, starts, rows, slots)
    width = 3 * (np.diff(starts) + np.diff(indptr))
    lengths = np.concatenate([[0], np.cumsum(np.repeat(width, 3), dtype=np.int64)]).astype(np.int32)
    columns, data = np.empty(lengths[-1], dtype=np.int32), np.empty(lengths[-1])
    args = (indptr, indices, blocks, starts, rows, slots, lengths, columns, data)
    run(lambda a, b: _full_fill(a, b, *args), ranges(n), threads)
    return data, columns, lengths
