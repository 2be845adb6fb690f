"""Symmetric matrix of 3 x 3 blocks, one for each pair of coupled nodes; only the upper half is kept."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.shape import Array


@dataclass(frozen=True, slots=True)
class BlockMatrix:
    """Upper half, diagonal blocks included, in block rows.

    Attributes
    ----------
    indptr
        (n + 1,) int32; the blocks of node i are ``indptr[i] : indptr[i + 1]``.
    indices
        (b,) int32, the other node j >= i, rising in each row: the diagonal block stands first.
    blocks
        (b, 3, 3) double; block (i, j) couples direction k of node i (row) with direction l of node j (column). The
        block (j, i) is its transpose.
    """

    indptr: NDArray[np.int32]
    indices: NDArray[np.int32]
    blocks: Array

    @property
    def shape(self) -> tuple[int, int]:
        """(3 n, 3 n), unknown 3 node + direction."""
        return 3 * (self.indptr.size - 1), 3 * (self.indptr.size - 1)

    def __matmul__(self, x: Array) -> Array:
        """Product with x (3 n,) or (3 n, k)."""
        return np.asarray(self.to_csr() @ x)

    def diagonal(self) -> Array:
        """(3 n,) diagonal."""
        return self.blocks[self.indptr[:-1]][:, range(3), range(3)].ravel()

    def to_csr(self) -> sp.csr_matrix:
        """The whole matrix (3 n, 3 n)."""
        size = self.shape
        upper = sp.bsr_matrix((self.blocks, self.indices, self.indptr), shape=size).tocsr()
        off = self.blocks.copy()
        off[self.indptr[:-1]] = 0.0
        return sp.csr_matrix(upper + sp.bsr_matrix((off, self.indices, self.indptr), shape=size).T)
