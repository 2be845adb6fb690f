"""The linear level of a large model without its factor: aggregates of nodes that move as rigid bodies.

The nodes are gathered into groups of strongly coupled neighbours (P. Vanek, J. Mandel, M. Brezina, Computing 56 (1996)
179), each with its six rigid motions as coarse unknowns. The motions are not smoothed: the coarse matrix stays small
and is cheap to make, and a few steps of Chebyshev iteration make up for the slower cycle.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.factor import Cholesky
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.kernels.pattern import find
from fem.solid.shape import Array
from fem.solid.solver.cycle import Cycle, largest
from fem.solid.solver.elimination import Elimination
from fem.solid.solver.smoother import BlockJacobi, highest, ritz_values
from fem.solid.support import rigid_map
from geometry.budget import Budget

STRONG = 0.05
"""Blocks above this part of the geometric mean of their two diagonal blocks couple nodes strongly."""
DEGREE, STEPS = 2, 2
_DEPENDENT = 1e-6
_LANCZOS = 10
_FEW = 4
"""Ranges of rows of a vector: it is short."""
Single = NDArray[np.float32]


class Aggregates:
    """Prolongation from the rigid motions of groups of nodes.

    Attributes
    ----------
    group
        (n,) int32 group of each node.
    motions
        (n, 3, 6) displacement of a node for its group's unknowns, which are orthonormal.
    """

    def __init__(self, K: BlockMatrix, held: Elimination, nodes: Array, threads: int) -> None:
        self._threads = threads
        self.group = _groups(K)
        count = int(self.group.max()) + 1
        self.count = count
        size = np.bincount(self.group, minlength=count)
        centre = np.array([np.bincount(self.group, weights=x, minlength=count) for x in nodes]) / size
        r = nodes - centre[:, self.group]
        radius = np.sqrt(np.bincount(self.group, weights=(r**2).sum(axis=0), minlength=count) / size)
        motion = rigid_map(r, np.zeros(3))
        motion[:, :, 3:] /= np.where(radius > 0, radius, 1.0)[self.group][:, None, None]
        motion[held.special] = (held.basis @ held.pseudo) @ motion[held.special]
        gram = np.zeros((count, 6, 6))
        np.add.at(gram, self.group, motion.transpose(0, 2, 1) @ motion)
        weight, vectors = np.linalg.eigh(gram)
        kept = weight > _DEPENDENT * weight[:, -1:]
        kept &= weight > 0
        self.dropped = np.flatnonzero(~kept.ravel())
        vectors *= np.where(kept, 1 / np.sqrt(np.where(kept, weight, 1.0)), 0.0)[:, None, :]
        self.motions = motion @ vectors[self.group]
        self._light = self.motions.astype(np.float32)
        order = np.argsort(self.group, kind="stable").astype(np.int32)
        self._members = np.concatenate([[0], np.cumsum(size)]).astype(np.int32), order

    def restrict(self, r: Single) -> Array:
        """(6 g, k) of (3 n, k)."""
        y = np.zeros((6 * self.count, r.shape[1]))
        run(lambda a, b: _restrict(a, b, *self._members, self._light, r, y), ranges(self.count), self._threads)
        return y

    def prolong(self, y: Array, z: Single) -> None:
        """z (3 n, k) = P y of y (6 g, k)."""
        parts = ranges(self.group.size)
        run(lambda a, b: _prolong(a, b, self.group, self._light, y.astype(z.dtype), z), parts, self._threads)

    def square(self, K: BlockMatrix) -> sp.csr_matrix:
        """Upper triangle of P^T K P (6 g, 6 g), with ones for the motions that a group does not have."""
        rows = np.repeat(np.arange(K.indptr.size - 1), np.diff(K.indptr))
        ends = np.sort(np.stack([self.group[rows], self.group[K.indices]]), axis=0)
        graph = sp.csr_matrix((np.ones(ends.shape[1], np.int32), (ends[0], ends[1])), shape=(self.count, self.count))
        graph.sort_indices()
        blocks = np.zeros((graph.indices.size, 6, 6))
        _square(K.indptr, K.indices, K.blocks, self.group, self.motions, graph.indptr, graph.indices, blocks)
        size = 6 * self.count
        whole = sp.bsr_matrix((blocks, graph.indices, graph.indptr), shape=(size, size)).tocsr()
        missing = np.zeros(size)
        missing[self.dropped] = 1.0
        upper = sp.csr_matrix(sp.triu(whole + sp.diags(missing)))
        upper.sort_indices()
        return upper


class AggregateSolver:
    """A fixed symmetric positive approximation of A^-1 on the linear level, near enough to take its place.

    Only for parts without mean rows and shared unknowns.
    """

    def __init__(self, K: BlockMatrix, held: Elimination, nodes: Array, budget: Budget, backend: str) -> None:
        self._held, self._threads = held, budget.threads
        self._single = K.single()
        groups = Aggregates(K, held, nodes, budget.threads)
        self._factor = Cholesky(groups.square(K), budget, backend, upper=True)
        jacobi = BlockJacobi(K, held, budget.threads)

        def coarse(r: Single, d: Single) -> None:
            groups.prolong(self._factor.solve(groups.restrict(r)), d)

        self._cycle = Cycle(self._single, jacobi, coarse, DEGREE, budget.seed)
        self._low, self._high = self._spectrum(K, budget.seed)

    def _spectrum(self, K: BlockMatrix, seed: int) -> tuple[float, float]:
        """Least and largest eigenvalue of M A, by the coefficients of conjugate gradients (Lanczos)."""
        r = self._held.lift(np.random.default_rng(seed).standard_normal((self._held.free, 1)))
        p, z = np.zeros_like(r), np.zeros_like(r)
        alphas, betas, before = [], [], 0.0
        for k in range(_LANCZOS + 1):
            self._cycle(r, z)
            rz = float(np.vdot(r, z))
            betas.append(rz / before if k else 0.0)
            if k == _LANCZOS:
                break
            p = z + betas[-1] * p
            q = K @ p
            alphas.append(rz / float(np.vdot(p, q)))
            r -= alphas[-1] * q
            before = rz
        return float(ritz_values(alphas, betas)[0]), highest(alphas, betas)

    def solve(self, rhs: Array) -> Array:
        """(f, k) of right-hand sides (f, k)."""
        r = self._held.lift(rhs)
        scale = largest(r, self._threads)
        scale = np.where(scale > 0, scale, 1.0)
        return self._held.reduce(self.correct((r / scale).astype(np.float32)) * scale)

    def correct(self, r: Single) -> Single:
        """Motions (3 n, k) for forces (3 n, k) on the nodes, which are spent on it.

        `STEPS` steps of Chebyshev iteration on the interval of the spectrum.
        """
        centre, half = (self._high + self._low) / 2, (self._high - self._low) / 2
        x, z, p, w = (np.empty_like(r) for _ in range(4))
        alpha = 0.0
        for k in range(STEPS):
            self._cycle.correct(r, z)
            beta = 0.0 if k == 0 else (half * alpha) ** 2 / (2 if k == 1 else 4)
            alpha = 1 / (centre - (beta / alpha if k else 0.0))
            _ahead(z, np.float32(alpha), np.float32(beta), k == 0, p, x, self._threads)
            if k + 1 < STEPS:
                self._single.product(p, w, self._threads)
                _less(np.float32(alpha), w, r, self._threads)
        return x

    def close(self) -> None:
        """Give memory back."""
        self._factor.close()
        self._cycle.close()


def _ahead(z: Single, alpha: np.float32, beta: np.float32, begin: bool, p: Single, x: Single, threads: int) -> None:
    """p = z + beta p;  x += alpha p, or both from nothing."""
    run(lambda a, b: _go(a, b, z, alpha, beta, begin, p, x), ranges(z.shape[0], _FEW), threads)


def _less(alpha: np.float32, w: Single, r: Single, threads: int) -> None:
    """r -= alpha w."""
    run(lambda a, b: _take(a, b, alpha, w, r), ranges(r.shape[0], _FEW), threads)


@kernel
def _go(first, last, z, alpha, beta, begin, p, x):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for c in range(z.shape[1]):
            p[i, c] = z[i, c] if begin else z[i, c] + beta * p[i, c]
            x[i, c] = alpha * p[i, c] if begin else x[i, c] + alpha * p[i, c]


@kernel
def _take(first, last, alpha, w, r):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        for c in range(r.shape[1]):
            r[i, c] -= alpha * w[i, c]


def _groups(K: BlockMatrix) -> NDArray[np.int32]:
    """(n,) group of each node: a node with all its strong neighbours while they are free, then the rest to theirs."""
    size = np.sqrt((K.blocks**2).sum(axis=(1, 2)))
    own = size[K.indptr[:-1]]
    n = own.size
    rows = np.repeat(np.arange(n), np.diff(K.indptr))
    strong = (size > STRONG * np.sqrt(own[rows] * own[K.indices])) & (rows != K.indices)
    graph = sp.csr_matrix((size[strong], (rows[strong], K.indices[strong])), shape=(n, n))
    graph = sp.csr_matrix(graph + graph.T)
    group = np.full(n, -1, dtype=np.int32)
    _gather(graph.indptr, graph.indices, graph.data, group)
    return group


@kernel
def _gather(indptr, indices, weights, group):  # type: ignore[no-untyped-def]
    n = group.size
    count = 0
    for i in range(n):
        free = group[i] < 0
        for k in range(indptr[i], indptr[i + 1]):
            free = free and group[indices[k]] < 0
        if free:
            group[i] = count
            for k in range(indptr[i], indptr[i + 1]):
                group[indices[k]] = count
            count += 1
    first = group.copy()
    for i in range(n):
        if group[i] < 0:
            best = 0.0
            for k in range(indptr[i], indptr[i + 1]):
                if first[indices[k]] >= 0 and weights[k] > best:
                    best = weights[k]
                    group[i] = first[indices[k]]
            if group[i] < 0:
                group[i] = count
                count += 1


@kernel
def _restrict(first, last, starts, members, motions, r, y):  # type: ignore[no-untyped-def]
    for g in range(first, last):
        for s in range(starts[g], starts[g + 1]):
            i = members[s]
            for d in range(3):
                for m in range(6):
                    for c in range(r.shape[1]):
                        y[6 * g + m, c] += motions[i, d, m] * r[3 * i + d, c]


@kernel
def _prolong(first, last, group, motions, y, z):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        g = 6 * group[i]
        for d in range(3):
            for c in range(z.shape[1]):
                total = z.dtype.type(0.0)
                for m in range(6):
                    total += motions[i, d, m] * y[g + m, c]
                z[3 * i + d, c] = total


@kernel
def _square(indptr, indices, blocks, group, motions, starts, columns, out):  # type: ignore[no-untyped-def]
    B = np.empty((3, 6))
    for i in range(indptr.size - 1):
        for k in range(indptr[i], indptr[i + 1]):
            j = indices[k]
            row, column = group[i], group[j]
            place = find(starts, columns, min(row, column), max(row, column))
            for a in range(3):
                for m in range(6):
                    B[a, m] = 0.0
                    for b in range(3):
                        B[a, m] += blocks[k, a, b] * motions[j, b, m]
            for p in range(6):
                for m in range(6):
                    total = 0.0
                    for a in range(3):
                        total += motions[i, a, p] * B[a, m]
                    if row <= column:
                        out[place, p, m] += total
                    if row > column or (row == column and i != j):
                        out[place, m, p] += total
