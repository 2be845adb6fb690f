"""Numbers of the nodes with which what a product needs together stands together in memory.

scikit-fem numbers the corners first and the mid-edge nodes after them, so that one row of the stiffness reaches far
through the vectors, at 140 000 nodes beyond the processor's cache. Along the part's longest direction the rows of a
slice of the part stand together, and ranges of rows overlap in a slice only.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp

from fem.solid.block_matrix import BlockMatrix, SingleBlockMatrix
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run, weighted_ranges
from fem.solid.node_order import along_the_part
from fem.solid.shape import Array

_PARTS = 4
"""Ranges of rows that are counted and placed apart: fixed, though the result does not depend on it."""


class Ordering:
    """A new order of the nodes.

    Attributes
    ----------
    nodes
        (n,) old number of each new node.
    number
        (n,) int32 new number of each old node.
    given
        Whether the nodes are in this order already, so that nothing changes.
    """

    def __init__(self, nodes: Array) -> None:
        self.nodes = along_the_part(nodes)
        self.given = bool((np.diff(self.nodes) == 1).all())
        self.number = np.empty(self.nodes.size, dtype=np.int32)
        self.number[self.nodes] = np.arange(self.nodes.size, dtype=np.int32)

    def columns(self, C: sp.csr_matrix) -> sp.csr_matrix:
        """C (rows, 3 n) in the new order of its columns."""
        if self.given:
            return C
        node, direction = np.divmod(C.indices, 3)
        return sp.csr_matrix((C.data, 3 * self.number[node] + direction, C.indptr), shape=C.shape).sorted_indices()

    def matrix(self, K: BlockMatrix, threads: int) -> tuple[BlockMatrix, SingleBlockMatrix]:
        """K in the new order, in double and in single precision."""
        if self.given:
            return K, K.single()
        n, parts = K.indptr.size - 1, weighted_ranges(K.indptr, _PARTS)
        place = np.zeros((len(parts), n), dtype=np.int32)
        which = {first: k for k, (first, _) in enumerate(parts)}
        run(lambda a, b: _count(a, b, K.indptr, K.indices, self.number, place[which[a]]), parts, threads)
        ends = np.cumsum(place.T.ravel(), dtype=np.int64)
        indptr = np.concatenate([[0], ends[len(parts) - 1 :: len(parts)]]).astype(np.int32)
        np.subtract(ends.reshape(n, -1).T, place, out=place, casting="unsafe")
        indices, source = np.empty_like(K.indices), np.empty_like(K.indices)
        fill = (K.indptr, K.indices, self.number)
        run(lambda a, b: _fill(a, b, *fill, place[which[a]], indices, source), parts, threads)
        blocks, light = np.empty(K.blocks.shape), np.empty(K.blocks.shape, dtype=np.float32)
        taken = (indptr, indices, source, K.blocks, blocks, light)
        run(lambda a, b: _take(a, b, *taken), ranges(n), threads)
        double = BlockMatrix(indptr, indices, blocks, K.threads)
        return double, SingleBlockMatrix(indptr, indices, light, K.threads)


@kernel
def _count(first, last, indptr, indices, number, count):  # type: ignore[no-untyped-def]
    """Blocks of each new row among the old rows first to last."""
    for i in range(first, last):
        for k in range(indptr[i], indptr[i + 1]):
            count[min(number[i], number[indices[k]])] += 1


@kernel
def _fill(first, last, indptr, indices, number, place, column, source):  # type: ignore[no-untyped-def]
    """New column of each block at its new row, and its old place; -1 - place where the block is to be transposed."""
    for i in range(first, last):
        a = number[i]
        for k in range(indptr[i], indptr[i + 1]):
            b = number[indices[k]]
            at = place[min(a, b)]
            place[min(a, b)] = at + 1
            column[at] = max(a, b)
            source[at] = k if a <= b else -1 - k


@kernel
def _take(first, last, indptr, column, source, blocks, out, light):  # type: ignore[no-untyped-def]
    """Sorts the new rows first to last by their columns and fetches their blocks."""
    for i in range(first, last):
        for k in range(indptr[i] + 1, indptr[i + 1]):
            c, s, at = column[k], source[k], k
            while at > indptr[i] and column[at - 1] > c:
                column[at], source[at] = column[at - 1], source[at - 1]
                at -= 1
            column[at], source[at] = c, s
        for k in range(indptr[i], indptr[i + 1]):
            old = source[k]
            for a in range(3):
                for b in range(3):
                    value = blocks[old, a, b] if old >= 0 else blocks[-1 - old, b, a]
                    out[k, a, b] = value
                    light[k, a, b] = value
