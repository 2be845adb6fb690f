"""Symmetric matrix of 3 x 3 blocks, one for each pair of coupled nodes; only the upper half is kept."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.kernels import scalar
from fem.solid.kernels.parallel import ranges, run
from fem.solid.kernels.product import Part, divide, product
from fem.solid.shape import Array

Single = NDArray[np.float32]


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
    threads
        For products and conversions; the result does not depend on it, not even in its last bit.
    linear
        Makes of the numbers of the mesh's corners (n',) the stiffness with linear displacements, corners in that order;
        None where it is not known. It must be E^T A E, E the mean of an edge's ends for the node between them.
    """

    indptr: NDArray[np.int32]
    indices: NDArray[np.int32]
    blocks: Array
    threads: int = 1
    linear: Callable[[NDArray[np.integer]], BlockMatrix] | None = field(default=None, repr=False, compare=False)
    _parts: list[Part] = field(default_factory=list, repr=False, compare=False)

    @property
    def shape(self) -> tuple[int, int]:
        """(3 n, 3 n), unknown 3 node + direction."""
        return 3 * (self.indptr.size - 1), 3 * (self.indptr.size - 1)

    def __matmul__(self, x: Array) -> Array:
        """Product with x (3 n,) or (3 n, k)."""
        return self.product(x, np.empty(x.shape))

    def product(self, x: Array, out: Array, threads: int | None = None) -> Array:
        """out = A x of x (3 n,) or (3 n, k), written to the contiguous double array `out`, which is returned."""
        _check(self.shape[0], x, out, np.float64)
        x = np.ascontiguousarray(x, dtype=np.float64)
        threads = self.threads if threads is None else threads
        product(self.indptr, self.indices, self.blocks, x, out, threads, _divided(self))
        return out

    def single(self) -> SingleBlockMatrix:
        """The same matrix in single precision, for a smoother or a preconditioner."""
        blocks = np.empty(self.blocks.shape, dtype=np.float32)

        def copy(first: int, last: int) -> None:
            blocks[first:last] = self.blocks[first:last]

        run(copy, ranges(self.indices.size), self.threads)
        return SingleBlockMatrix(self.indptr, self.indices, blocks, self.threads, self._parts)

    def diagonal(self) -> Array:
        """(3 n,) diagonal."""
        return self.diagonal_blocks()[:, range(3), range(3)].ravel()

    def diagonal_blocks(self) -> Array:
        """(n, 3, 3) copy of the diagonal blocks."""
        return self.blocks[self.indptr[:-1]]

    def to_csr(self) -> sp.csr_matrix:
        """The whole matrix (3 n, 3 n), columns sorted: twice the memory of the blocks, and half as much again."""
        return _sorted_csr(scalar.full_csr(self.indptr, self.indices, self.blocks, self.threads), self.shape[0])

    def upper_csr(self, kept: NDArray[np.integer] | NDArray[np.bool_] | None = None) -> sp.csr_matrix:
        """Upper triangle, diagonal included, of the matrix restricted to some unknowns; columns sorted.

        Parameters
        ----------
        kept
            Numbers of the unknowns that stay, rising, or a mask (3 n,); None for all.

        Raises
        ------
        ValueError
            When the numbers do not rise: the triangle of another order is not that of this one.
        """
        if kept is None:
            place = np.arange(self.shape[0], dtype=np.int32)
            count = place.size
        else:
            numbers = np.flatnonzero(kept) if kept.dtype == np.bool_ else np.asarray(kept)
            if (np.diff(numbers) <= 0).any():
                raise ValueError("the unknowns kept must rise")
            place, count = np.full(self.shape[0], -1, dtype=np.int32), numbers.size
            place[numbers] = np.arange(count, dtype=np.int32)
        parts = scalar.upper_csr(self.indptr, self.indices, self.blocks, place, count, self.threads)
        return _sorted_csr(parts, count)


@dataclass(frozen=True, slots=True)
class SingleBlockMatrix:
    """A `BlockMatrix` whose blocks are single precision; see there."""

    indptr: NDArray[np.int32]
    indices: NDArray[np.int32]
    blocks: Single
    threads: int = 1
    _parts: list[Part] = field(default_factory=list, repr=False, compare=False)

    @property
    def shape(self) -> tuple[int, int]:
        """(3 n, 3 n)."""
        return 3 * (self.indptr.size - 1), 3 * (self.indptr.size - 1)

    def __matmul__(self, x: Single) -> Single:
        """Product with x (3 n,) or (3 n, k), summed in single precision."""
        return self.product(x, np.empty(x.shape, dtype=np.float32))

    def product(self, x: Single, out: Single, threads: int | None = None) -> Single:
        """out = A x, written to the contiguous single-precision array `out`, which is returned."""
        _check(self.shape[0], x, out, np.float32)
        x = np.ascontiguousarray(x, dtype=np.float32)
        threads = self.threads if threads is None else threads
        product(self.indptr, self.indices, self.blocks, x, out, threads, _divided(self))
        return out


def _divided(matrix: BlockMatrix | SingleBlockMatrix) -> list[Part]:
    """The ranges of rows of a product, found once."""
    if not matrix._parts:
        matrix._parts.extend(divide(matrix.indptr, matrix.indices))
    return matrix._parts


def _check(size: int, x: NDArray[np.floating], out: NDArray[np.floating], kind: type) -> None:
    if x.ndim not in (1, 2) or x.shape[0] != size or out.shape != x.shape:
        raise ValueError(f"a product of a matrix with {size} columns, x {x.shape} and out {out.shape}")
    if out.dtype != kind or not out.flags.c_contiguous or np.may_share_memory(x, out):
        raise ValueError("out must be a contiguous array of the matrix's own type, apart from x")


def _sorted_csr(parts: tuple[Array, NDArray[np.int32], NDArray[np.int32]], size: int) -> sp.csr_matrix:
    matrix = sp.csr_matrix(parts, shape=(size, size), copy=False)
    matrix.has_sorted_indices = True
    matrix.has_canonical_format = True
    return matrix
