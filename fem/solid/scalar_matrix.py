"""Symmetric matrix that treats the three directions alike: a number times the identity for each pair of nodes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.scalar_product import scalar_product
from fem.solid.shape import Array


@dataclass(frozen=True, slots=True)
class ScalarMatrix:
    """Upper half, diagonal included, in rows: a ninth of what a `BlockMatrix` holds and moves.

    Attributes
    ----------
    indptr, indices
        Of the pattern, as of `BlockMatrix`.
    values
        (b,) the number of each pair of nodes.
    threads
        For products; the result does not depend on it, not even in its last bit.
    """

    indptr: NDArray[np.int32]
    indices: NDArray[np.int32]
    values: Array
    threads: int = 1

    @property
    def shape(self) -> tuple[int, int]:
        """(3 n, 3 n), unknown 3 node + direction."""
        return 3 * (self.indptr.size - 1), 3 * (self.indptr.size - 1)

    def __matmul__(self, x: Array) -> Array:
        """Product with x (3 n,) or (3 n, k)."""
        if x.shape[0] != self.shape[0]:
            raise ValueError(f"a product of a matrix with {self.shape[0]} columns and x {x.shape}")
        x = np.ascontiguousarray(x, dtype=np.float64)
        out = np.empty(x.shape)
        # (n, 3 k): the directions of a node are columns beside each other
        wide = self.indptr.size - 1, x.size // (self.indptr.size - 1)
        scalar_product(self.indptr, self.indices, self.values, x.reshape(wide), out.reshape(wide), self.threads)
        return out

    def sizes(self) -> Array:
        """(n,) sum of the sizes of the numbers in each row: the diagonal matrix of them minus this one, or plus this
        one, has no negative eigenvalue (Gershgorin's circles)."""
        size = ScalarMatrix(self.indptr, self.indices, np.abs(self.values), self.threads)
        return np.ascontiguousarray((size @ np.ones(self.shape[0]))[::3])

    def add_to(self, blocks: Array, factor: float) -> None:
        """Add factor times this matrix to blocks (b, 3, 3) of the same pattern."""
        for i in range(3):
            blocks[:, i, i] += factor * self.values

    def to_csr(self) -> sp.csr_matrix:
        """The whole matrix (3 n, 3 n)."""
        blocks = np.zeros((self.values.size, 3, 3))
        self.add_to(blocks, 1.0)
        return BlockMatrix(self.indptr, self.indices, blocks, self.threads).to_csr()
