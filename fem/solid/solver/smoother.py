"""Chebyshev iteration with the diagonal blocks as preconditioner, in single precision.

The polynomials of the fourth kind need only a bound of the largest eigenvalue (J. Lottes, Numer. Linear Algebra Appl.
30 (2023) e2518; recurrence from memory, checked by the iteration counts).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix, SingleBlockMatrix
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import inverse as inverse_of
from fem.solid.solver.elimination import Elimination

Single = NDArray[np.float32]
_LANCZOS = 12
_SAFETY = 1.05


class BlockJacobi:
    """D^-1 on the held motions: 3 x 3 blocks (n, 3, 3) in single precision, and the shared unknowns of the rigid
    regions as one block.

    For a partly held node with the basis Q it is Q (Q^T K Q)^-1 Q^T, so that what comes out is a held motion.
    """

    def __init__(self, K: BlockMatrix, held: Elimination, threads: int) -> None:
        self.threads = threads
        D = K.diagonal_blocks()
        inverse, _ = inverse_of(D)
        Q = held.basis
        inner = Q.transpose(0, 2, 1) @ D[held.special] @ Q
        unused = ~Q.any(axis=1)
        s, i = np.nonzero(unused)
        inner[s, i, i] = 1.0
        inverse[held.special] = Q @ np.linalg.inv(inner) @ Q.transpose(0, 2, 1)
        self.blocks = inverse.astype(np.float32)
        self._rows = np.flatnonzero(np.diff(held.rigid.indptr))
        self._rigid = held.rigid[self._rows].toarray()
        if self._rows.size:
            R = held.rigid.toarray()
            self._inner = np.linalg.inv(R.T @ (K @ R))

    def step(self, r: Single, w: Single | None, d: Single, z: Single, old: float, new: float) -> None:
        """d = old d + new D^-1 (r - w);  z += d. All (3 n, k)."""
        shared = None
        if self._rows.size:
            left = r[self._rows] if w is None else r[self._rows] - w[self._rows]
            shared = (self._rigid @ (self._inner @ (self._rigid.T @ left.astype(float)))).astype(np.float32)
            shared *= np.float32(new)
        parts = ranges(self.blocks.shape[0])
        a, b = np.float32(old), np.float32(new)
        run(lambda i, j: _step(i, j, self.blocks, r, r if w is None else w, w is None, d, z, a, b), parts, self.threads)
        if shared is not None:
            d[self._rows] += shared
            z[self._rows] += shared

    def largest(self, K: SingleBlockMatrix, seed: int) -> float:
        """Estimate from above of the largest eigenvalue of D^-1 K: Lanczos, from the coefficients of CG."""
        rng = np.random.default_rng(seed)
        r = rng.standard_normal((K.shape[0], 1), dtype=np.float32)
        z, p, q = np.zeros_like(r), np.zeros_like(r), np.zeros_like(r)
        alphas, betas, rz = [], [], 0.0
        for k in range(_LANCZOS):
            z[:] = 0
            self.step(r, None, q, z, 0.0, 1.0)
            new = float(np.vdot(r, z))
            if not new > 0:
                break
            beta = new / rz if k else 0.0
            p = z + np.float32(beta) * p
            K.product(p[:, 0], q[:, 0], self.threads)
            alpha = new / float(np.vdot(p, q))
            r -= np.float32(alpha) * q
            alphas.append(alpha)
            betas.append(beta)
            rz = new
        a, b = np.array(alphas), np.array(betas)
        diagonal = 1 / a
        diagonal[1:] += b[1:] / a[:-1]
        off = np.sqrt(b[1:]) / a[:-1]
        return _SAFETY * float(np.linalg.eigvalsh(np.diag(diagonal) + np.diag(off, 1) + np.diag(off, -1))[-1])


@kernel
def _step(first, last, blocks, r, w, fresh, d, z, old, new):  # type: ignore[no-untyped-def]
    for i in range(first, last):
        t = 3 * i
        for c in range(r.shape[1]):
            u, v, x = r[t, c], r[t + 1, c], r[t + 2, c]
            if not fresh:
                u -= w[t, c]
                v -= w[t + 1, c]
                x -= w[t + 2, c]
            for k in range(3):
                g = new * (blocks[i, k, 0] * u + blocks[i, k, 1] * v + blocks[i, k, 2] * x)
                if old != 0:
                    g += old * d[t + k, c]
                d[t + k, c] = g
                z[t + k, c] += g
