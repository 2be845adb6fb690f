"""Which nodes are coupled: elements at each node, and the upper half of the block sparsity pattern."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run

Int = NDArray[np.int32]


@kernel
def _incidence(tets, starts, places):  # type: ignore[no-untyped-def]
    m, width = tets.shape
    n = starts.size - 1
    for e in range(m):
        for a in range(width):
            starts[tets[e, a] + 1] += 1
    for i in range(n):
        starts[i + 1] += starts[i]
    for e in range(m):
        for a in range(width):
            i = tets[e, a]
            places[starts[i]] = e * width + a
            starts[i] += 1
    for i in range(n, 0, -1):
        starts[i] = starts[i - 1]
    starts[0] = 0


@kernel
def _upper_rows(first, last, tets, starts, places, mark, columns, counts):  # type: ignore[no-untyped-def]
    """Sorted columns >= row of the rows first to last, one after the other; gives how many there are."""
    width = tets.shape[1]
    filled = 0
    for i in range(first, last):
        begin = filled
        for s in range(starts[i], starts[i + 1]):
            e = places[s] // width
            for b in range(width):
                j = tets[e, b]
                if j >= i and mark[j] != i:
                    mark[j] = i
                    k = filled
                    while k > begin and columns[k - 1] > j:
                        columns[k] = columns[k - 1]
                        k -= 1
                    columns[k] = j
                    filled += 1
        counts[i] = filled - begin
    return filled


@kernel
def find(indptr, indices, row, column):  # type: ignore[no-untyped-def]
    """Place of the block (row, column), which must be there."""
    low, high = indptr[row], indptr[row + 1] - 1
    while low < high:
        middle = (low + high) // 2
        if indices[middle] < column:
            low = middle + 1
        else:
            high = middle
    return low


def incidence(tets: Int, node_count: int) -> tuple[Int, Int]:
    """Where each node occurs in the elements (m, w): ``places[starts[i] : starts[i + 1]]`` are w element + local
    node, rising."""
    starts, places = np.zeros(node_count + 1, dtype=np.int32), np.empty(tets.size, dtype=np.int32)
    _incidence(tets, starts, places)
    return starts, places


def upper_pattern(tets: Int, starts: Int, places: Int, threads: int = 1) -> tuple[Int, Int]:
    """indptr (n + 1,) and indices of the nodes j >= i that share an element (m, w) with node i, rising."""
    n = starts.size - 1
    counts = np.zeros(n + 1, dtype=np.int32)

    def rows(first: int, last: int) -> Int:
        mark = np.full(n, -1, dtype=np.int32)
        columns = np.empty(tets.shape[1] * int(starts[last] - starts[first]), dtype=np.int32)
        filled = _upper_rows(first, last, tets, starts, places, mark, columns, counts[1:])
        return columns[:filled].copy()

    found = run(rows, ranges(n), threads)
    indices = np.concatenate(found) if found else np.zeros(0, dtype=np.int32)
    indptr = np.cumsum(counts, dtype=np.int64)
    if indptr[-1] > np.iinfo(np.int32).max // 9:
        raise OverflowError("the matrix has more entries than 32-bit numbers can count")
    return indptr.astype(np.int32), indices
