"""Between the quadratic displacements and the linear ones of the corner nodes: the two levels of the multigrid.

A linear field takes on a mid-edge node the mean of the edge's two corners, also on a curved element, whose map is the
same for both. Held nodes take part with what they are free to do: a partly held one with the projection of the mean,
one of a rigid region with the region's own motion. So the coarse unknowns are those of T that belong to corners, and
every coarse motion is one that the supports allow.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run, weighted_ranges
from fem.solid.kernels.pattern import find
from fem.solid.shape import TET_EDGES, Array
from fem.solid.solver.elimination import Elimination

Int = NDArray[np.int32]
_PARTS = 4
"""Ranges of rows with their own sums in the coarse matrix: fixed, so that the order of all sums is."""


class Transfer:
    """Prolongation P (3 n of the fine level, f' of the coarse) and its transpose.

    Attributes
    ----------
    corners
        (n',) fine nodes that are corners, rising.
    parents
        (n, 2) int32 coarse numbers of the ends of the edge that carries a fine node; twice the same for a corner.
    coarse
        Elimination of the coarse level.
    """

    def __init__(self, tets: NDArray[np.int64], fine: Elimination, threads: int) -> None:
        n = fine.count.size
        self._threads = threads
        is_corner = np.zeros(n, dtype=bool)
        is_corner[tets[:4]] = True
        self.corners = np.flatnonzero(is_corner)
        number = np.cumsum(is_corner, dtype=np.int32) - 1
        self.parents = np.empty((n, 2), dtype=np.int32)
        self.parents[self.corners] = number[self.corners][:, None]
        for k, (a, b) in enumerate(TET_EDGES, start=4):
            self.parents[tets[k], 0] = number[tets[a]]
            self.parents[tets[k], 1] = number[tets[b]]
        self.coarse = Elimination(self._coarse_motions(fine))
        self._fine, self._shared = fine, fine.rigid.shape[1] > 0
        self._plain = np.ones(n, dtype=np.bool_)
        self._plain[fine.special] = not self._shared
        self._rows = (3 * fine.special[:, None] + np.arange(3)).ravel()
        if self._shared:
            self._special = self._special_rows(fine)
            self._special_back = self._special.T.tocsr()
        plain = np.flatnonzero(self._plain)
        child = sp.csr_matrix(
            (
                np.full(2 * plain.size, 0.5, dtype=np.float32),
                (self.parents[plain].ravel(), np.repeat(plain, 2)),
            ),
            shape=(self.corners.size, n),
        )  # entries of a corner add up to 1
        child.sum_duplicates()
        self._children = (child.indptr, child.indices, child.data)

    def _coarse_motions(self, fine: Elimination) -> sp.csr_matrix:
        """(3 n', f') rows of T of the corners: unknowns of their own in their order, then the shared ones."""
        count = fine.count[self.corners]
        start = np.cumsum(count) - count
        own = np.repeat(fine.first[self.corners] - start, count) + np.arange(int(count.sum()))
        kept = np.concatenate([own, np.arange(fine.own, fine.free)])
        T = fine.motions(self.corners)
        column = np.empty(fine.free, dtype=T.indices.dtype)
        column[kept] = np.arange(kept.size)
        return sp.csr_matrix((T.data, column[T.indices], T.indptr), shape=(T.shape[0], kept.size)).sorted_indices()

    def _special_rows(self, fine: Elimination) -> sp.csr_matrix:
        """(3 s, f') rows of P of the nodes that are not plain."""
        s = fine.special.size
        parents = 3 * self.parents[fine.special][:, None, :] + np.arange(3)[None, :, None]  # (s, 3, 2)
        mean = sp.csr_matrix(
            (np.full(6 * s, 0.5), parents.ravel(), 2 * np.arange(3 * s + 1)), shape=(3 * s, 3 * self.corners.size)
        )
        projection = fine.basis @ fine.pseudo
        own = sp.bsr_matrix((projection, np.arange(s), np.arange(s + 1)), shape=(3 * s, 3 * s))
        rows = own @ mean @ self.coarse.T
        shared = fine.rigid[self._rows]
        if shared.shape[1]:
            rows = rows + sp.hstack([sp.csr_matrix((3 * s, self.coarse.own)), shared])
        return sp.csr_matrix(rows)

    def prolong(self, y: Array, z: NDArray[Any]) -> None:
        """z (3 n, k) = P y of y (f', k)."""
        self.prolong_nodes(self.coarse.expand(y.astype(z.dtype)), z)
        if self._shared:
            z[self._rows] = self._special @ y

    def restrict(self, r: NDArray[Any]) -> Array:
        """P^T r: (3 n, k) to (f', k). What of r presses against the supports is taken off it."""
        y = self.coarse.gather(self.restrict_nodes(r)).astype(float)
        if self._shared:
            y += self._special_back @ r[self._rows].astype(float)
        return y

    def prolong_nodes(self, x: NDArray[Any], z: NDArray[Any]) -> None:
        """`prolong` of the held motions x (3 n', k) of the corners themselves, but for the rigid regions."""
        parts = ranges(self._plain.size)
        run(lambda a, b: _prolong(a, b, self.parents, self._plain, x, z), parts, self._threads)
        if not self._shared:
            self._fine.project(z)

    def restrict_nodes(self, r: NDArray[Any]) -> NDArray[Any]:
        """`restrict` to forces (3 n', k) on the corners themselves, in the type of r, but for the rigid regions."""
        if not self._shared:
            self._fine.project(r)
        x = np.empty((3 * self.corners.size, r.shape[1]), dtype=r.dtype)
        parts = ranges(self.corners.size)
        run(lambda a, b: _restrict(a, b, *self._children, r, x), parts, self._threads)
        return x

    def galerkin(self, K: BlockMatrix) -> BlockMatrix:
        """E^T K E on the corner nodes, E the mean without regard to what is held.

        Equal to the linear elements' own stiffness where the mesh is straight. With the coarse level's elimination it
        gives P^T K P, but for curved rigid regions, where it is near it.
        """
        n = self.corners.size
        mid = self.parents[:, 0] != self.parents[:, 1]
        ends = np.sort(np.vstack([self.parents[mid], np.repeat(np.arange(n, dtype=np.int32)[:, None], 2, axis=1)]))
        graph = sp.csr_matrix((np.ones(ends.shape[0], np.int8), (ends[:, 0], ends[:, 1])), shape=(n, n))
        graph.sort_indices()
        indptr, indices = graph.indptr.astype(np.int32), graph.indices.astype(np.int32)

        def part(first: int, last: int) -> Array:
            blocks = np.zeros((indices.size, 3, 3))
            _galerkin(first, last, K.indptr, K.indices, K.blocks, self.parents, indptr, indices, blocks)
            return blocks

        sums = run(part, weighted_ranges(K.indptr, _PARTS), self._threads)
        blocks = sums[0]
        for more in sums[1:]:
            blocks += more
        return BlockMatrix(indptr, indices, blocks, self._threads)


@kernel
def _prolong(first, last, parents, plain, x, z):  # type: ignore[no-untyped-def]
    half = z.dtype.type(0.5)
    for i in range(first, last):
        if plain[i]:
            a, b = 3 * parents[i, 0], 3 * parents[i, 1]
            for d in range(3):
                for c in range(z.shape[1]):
                    z[3 * i + d, c] = half * (x[a + d, c] + x[b + d, c])


@kernel
def _restrict(first, last, starts, children, weights, r, x):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for d in range(3):
            for c in range(r.shape[1]):
                total = x.dtype.type(0.0)
                for k in range(starts[i], starts[i + 1]):
                    total += weights[k] * r[3 * children[k] + d, c]
                x[3 * i + d, c] = total


@kernel
def _galerkin(first, last, indptr, indices, blocks, parents, starts, columns, out):  # type: ignore[no-untyped-def]
    """Adds the fine block rows first to last to the upper coarse blocks."""
    for i in range(first, last):
        ki = 1 if parents[i, 0] == parents[i, 1] else 2
        for k in range(indptr[i], indptr[i + 1]):
            j = indices[k]
            kj = 1 if parents[j, 0] == parents[j, 1] else 2
            w = 1.0 / (ki * kj)
            for p in range(ki):
                for q in range(kj):
                    row, column = parents[i, p], parents[j, q]
                    if i == j and row > column:
                        continue
                    place = find(starts, columns, min(row, column), max(row, column))
                    if row <= column:
                        for c in range(3):
                            for d in range(3):
                                out[place, c, d] += w * blocks[k, c, d]
                    if row > column or (row == column and i != j):
                        for c in range(3):
                            for d in range(3):
                                out[place, c, d] += w * blocks[k, d, c]
