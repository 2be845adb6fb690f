"""The held motions u = T y in a form that is quick to apply, and T^T K T of a block matrix.

T comes from `fem.solid.support`: the unknowns of one node stand together and follow the order of the nodes, those of
the rigid regions come last. A node then has three plain unknowns, or fewer along a basis of its own, or belongs to a
rigid region.
"""

from __future__ import annotations

from copy import copy

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import Array


class Elimination:
    """T (3 n, f) taken apart.

    Attributes
    ----------
    free
        f.
    first, count
        (n,) first unknown of each node and how many it has of its own (0 to 3).
    special, basis
        (s,) nodes that are not plain, and (s, 3, 3) the columns of T that are their own (zero where there are fewer
        than three).
    pseudo
        (s, 3, 3) pseudo-inverse of each basis.
    rigid
        (3 n, r) the columns shared by many nodes, r of them, the last of T.
    """

    def __init__(self, T: sp.csr_matrix, threads: int = 1) -> None:
        self._T, self._threads, self._order = T, threads, np.zeros(0, dtype=np.int64)
        self.free = T.shape[1]
        n = T.shape[0] // 3
        users = np.bincount(T.indices, minlength=T.shape[1])
        node = np.repeat(np.arange(n), T.indptr[3::3] - T.indptr[:-3:3])
        lowest, highest = np.full(T.shape[1], n), np.full(T.shape[1], -1)
        np.minimum.at(lowest, T.indices, node)
        np.maximum.at(highest, T.indices, node)
        own = (users > 0) & (lowest == highest)
        self.own = int(np.argmin(np.r_[own, False]))  # unknowns of single nodes; the others are shared
        if (np.diff(lowest[: self.own]) < 0).any():
            raise ValueError("the unknowns must follow the nodes, those of the rigid regions last")
        self.count = np.bincount(lowest[: self.own], minlength=n)
        self.first = (np.cumsum(self.count) - self.count).astype(np.int32)
        self._plain = plain = self.count == 3
        place = (self.first[plain][:, None] + np.arange(3)).ravel()
        entries = np.diff(T.indptr)
        one = np.repeat(plain, 3)
        at = T.indptr[:-1][one]
        if not ((entries[one] == 1).all() and (T.data[at] == 1.0).all() and np.array_equal(T.indices[at], place)):
            raise ValueError("a node with three unknowns of its own must have them plain")
        self.special = np.flatnonzero(~plain)
        self.rigid = T[:, self.own :].tocsr()
        rows = (3 * self.special[:, None] + np.arange(3)).ravel()
        self._rows, self._part = rows, T[rows]
        self.basis = np.zeros((self.special.size, 3, 3))
        part = self._part.tocoo(copy=True)
        s, own_column = part.row // 3, part.col < self.own
        s, i = s[own_column], part.row[own_column] % 3
        local = part.col[own_column] - self.first[self.special[s]]
        self.basis[s, i, local] = part.data[own_column]
        self.pseudo = np.linalg.pinv(self.basis)
        part.data[own_column] = self.pseudo[s, local, i]
        self._lift = part.tocsr()
        if self.rigid.shape[1]:
            R = self.rigid[rows].toarray()
            inverse = sp.csr_matrix(R @ np.linalg.inv(R.T @ R))
            self._lift = sp.hstack([self._lift[:, : self.own], inverse]).tocsr()
        self._used = np.unique(self._part.indices)
        self._transpose()

    def _transpose(self) -> None:
        self._back = self._part.T.tocsr()[self._used]
        self._down = self._lift.T.tocsr()[self._used]
        self._project = self._part[:, self._used]

    @property
    def T(self) -> sp.csr_matrix:
        """(3 n, f)."""
        return self._T if not self._order.size else self.motions(np.arange(self._order.size))

    def motions(self, nodes: NDArray[np.integer]) -> sp.csr_matrix:
        """(3 k, f) rows of T of some nodes (k,)."""
        if self._order.size:
            nodes = self._order[nodes]
        return self._T[(3 * nodes[:, None] + np.arange(3)).ravel()]

    def in_order(self, nodes: NDArray[np.integer]) -> Elimination:
        """The same of the nodes in another order: new node i is the old node ``nodes[i]``. The unknowns stay."""
        new = copy(self)
        new._order = self._order[nodes] if self._order.size else np.asarray(nodes, dtype=np.int64)
        new.first, new.count, new._plain = self.first[nodes], self.count[nodes], self._plain[nodes]
        new.special = np.flatnonzero(~new._plain)
        place = np.empty(self._plain.size, dtype=np.int64)
        place[self.special] = np.arange(self.special.size)
        s = place[nodes[new.special]]
        new.basis, new.pseudo = self.basis[s], self.pseudo[s]
        old = (3 * s[:, None] + np.arange(3)).ravel()
        new._rows = (3 * new.special[:, None] + np.arange(3)).ravel()
        new._part, new._lift = self._part[old], self._lift[old]
        if self.rigid.shape[1]:
            new.rigid = self.rigid[(3 * nodes[:, None] + np.arange(3)).ravel()]
        new._transpose()
        return new

    def expand(self, y: Array) -> Array:
        """T y: (f, ...) to (3 n, ...)."""
        return self._spread(y, self._part)

    def gather(self, f: Array) -> Array:
        """T^T f: (3 n, ...) to (f, ...)."""
        return self._collect(f, self._back)

    def lift(self, r: Array) -> Array:
        """T (T^T T)^-1 r: forces (3 n, ...) on the nodes whose `gather` is r (f, ...)."""
        return self._spread(r, self._lift)

    def reduce(self, u: Array) -> Array:
        """(T^T T)^-1 T^T u: the unknowns (f, ...) of a held motion u (3 n, ...)."""
        return self._collect(u, self._down)

    def _spread(self, y: Array, special: sp.csr_matrix) -> Array:
        flat = np.ascontiguousarray(y).reshape(y.shape[0], -1)
        u = np.empty((3 * self.count.size, flat.shape[1]), dtype=y.dtype)
        parts = ranges(self.count.size)
        run(lambda a, b: _spread(a, b, self.first, self._plain, flat, u), parts, self._threads)
        u[self._rows] = special @ flat
        return u.reshape(-1, *y.shape[1:])

    def _collect(self, u: Array, special: sp.csr_matrix) -> Array:
        flat = np.ascontiguousarray(u).reshape(u.shape[0], -1)
        y = np.zeros((self.free, flat.shape[1]), dtype=u.dtype)
        parts = ranges(self.count.size)
        run(lambda a, b: _collect(a, b, self.first, self._plain, flat, y), parts, self._threads)
        y[self._used] = special @ flat[self._rows]
        return y.reshape(-1, *u.shape[1:])

    def project(self, u: Array) -> None:
        """Make u (3 n, k) a held motion where rounding has made it leave them; nodes wholly held become still."""
        if self._rows.size:
            u[self._rows] = self._project @ (self._down @ u[self._rows])

    def square(self, K: BlockMatrix) -> sp.csr_matrix:
        """Upper triangle, diagonal included, of T^T K T (f, f); columns rise in each row."""
        which = np.full(self.count.size, -1, dtype=np.int32)
        which[self.special] = np.arange(self.special.size, dtype=np.int32)
        shared = np.zeros((self.free, 0))
        if self.rigid.shape[1]:
            shared = self.gather(K @ self.rigid.toarray())
        counts = self.count.astype(np.int32)
        extra = np.count_nonzero(shared[: self.own], axis=1)
        indptr = np.zeros(self.free + 1, dtype=np.int64)
        nodes = ranges(counts.size)
        run(lambda a, b: _row_lengths(a, b, K.indptr, K.indices, self.first, counts, indptr), nodes, K.threads)
        indptr[1 : self.own + 1] += extra
        indptr[self.own + 1 :] = np.arange(self.rigid.shape[1], 0, -1)
        np.cumsum(indptr, out=indptr)
        if indptr[-1] > np.iinfo(np.int32).max:
            raise MemoryError(f"{indptr[-1]} entries do not fit the solver's 32-bit indices")
        indices = np.empty(indptr[-1], dtype=np.int32)
        data = np.empty(indptr[-1])
        of_node = (self.first, counts, which, self.basis)
        run(
            lambda a, b: _fill_rows(a, b, K.indptr, K.indices, K.blocks, *of_node, indptr, indices, data),
            nodes,
            K.threads,
        )
        for k in range(self.rigid.shape[1]):
            row = self.own + k
            indices[indptr[row] : indptr[row + 1]] = np.arange(row, self.free)
            data[indptr[row] : indptr[row + 1]] = shared[row, k:]
        if self.rigid.shape[1]:
            rows, columns = np.nonzero(shared[: self.own])
            rank = np.arange(rows.size) - np.repeat(np.cumsum(extra) - extra, extra)
            at = indptr[rows + 1] - np.repeat(extra, extra) + rank
            indices[at] = self.own + columns
            data[at] = shared[rows, columns]
        return sp.csr_matrix((data, indices, indptr.astype(np.int32)), shape=(self.free, self.free))


@kernel
def _spread(begin, end, first, plain, y, u):  # type: ignore[no-untyped-def]
    """Motions of the plain nodes."""
    for i in range(begin, end):
        if plain[i]:
            for d in range(3):
                for c in range(y.shape[1]):
                    u[3 * i + d, c] = y[first[i] + d, c]


@kernel
def _collect(begin, end, first, plain, u, y):  # type: ignore[no-untyped-def]
    """Unknowns of the plain nodes."""
    for i in range(begin, end):
        if plain[i]:
            for d in range(3):
                for c in range(y.shape[1]):
                    y[first[i] + d, c] = u[3 * i + d, c]


@kernel
def _row_lengths(begin, end, indptr, indices, first, count, length):  # type: ignore[no-untyped-def]
    """Entries of row r of the upper triangle, in length[r + 1]."""
    for i in range(begin, end):
        right = 0
        for k in range(indptr[i] + 1, indptr[i + 1]):
            right += count[indices[k]]
        for a in range(count[i]):
            length[first[i] + a + 1] = right + count[i] - a


@kernel
def _fill_rows(  # type: ignore[no-untyped-def]
    begin, end, indptr, indices, blocks, first, count, which, basis, starts, columns, data
):
    """Q_i^T K_ij Q_j of every block, Q_i the basis of node i (the identity where which[i] is -1)."""
    B = np.empty((3, 3))
    C = np.empty((3, 3))
    for i in range(begin, end):
        if count[i] == 0:
            continue
        done = 0  # entries before this block in the rows of i, counted in row 0
        for k in range(indptr[i], indptr[i + 1]):
            j = indices[k]
            if count[j] == 0:
                continue
            for a in range(3):
                for b in range(3):
                    B[a, b] = blocks[k, a, b]
            if which[i] >= 0:
                for a in range(3):
                    for b in range(3):
                        C[a, b] = 0.0
                        for c in range(3):
                            C[a, b] += basis[which[i], c, a] * B[c, b]
                B[:, :] = C
            if which[j] >= 0:
                for a in range(3):
                    for b in range(3):
                        C[a, b] = 0.0
                        for c in range(3):
                            C[a, b] += B[a, c] * basis[which[j], c, b]
                B[:, :] = C
            for a in range(count[i]):
                at = starts[first[i] + a] + done
                if i == j:
                    for b in range(a, count[i]):
                        columns[at + b - a] = first[j] + b
                        data[at + b - a] = B[a, b]
                else:
                    at -= a  # the row of the a-th unknown has a entries fewer in the diagonal block
                    for b in range(count[j]):
                        columns[at + b] = first[j] + b
                        data[at + b] = B[a, b]
            done += count[j]


def block_matrix(K: sp.csr_matrix) -> BlockMatrix:
    """Upper half in blocks of a whole symmetric matrix (3 n, 3 n)."""
    blocks = K.tobsr((3, 3))
    blocks.sort_indices()
    rows = np.repeat(np.arange(blocks.indptr.size - 1), np.diff(blocks.indptr))
    kept = blocks.indices >= rows
    starts = np.concatenate([[0], np.cumsum(kept)])[blocks.indptr]
    return BlockMatrix(starts.astype(np.int32), blocks.indices[kept].astype(np.int32), blocks.data[kept])
