"""Stiffness of 10-node tetrahedra, summed into the upper half of the block matrix.

With the gradients g_a of the shape functions, P_ab = int g_a g_b^T dV gives every isotropic stiffness:
K_ab = lambda P + mu P^T + mu tr(P) 1. In a straight element g_a is a sum of one or two barycentric gradients times
linear functions, so P_ab needs at most four products with exact factors, and a row of the matrix is summed
node by node without ever holding element matrices. Curved elements are integrated with a quadrature rule, some
thousand at a time, and then added.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jacobian import barycentric_gradients, inverse_jacobian
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.kernels.pattern import find
from fem.solid.shape import TET_EDGES, Array

Int = NDArray[np.int32]
_CURVED_AT_ONCE = 2048


def _straight_tables() -> tuple[Int, Array]:
    """carriers (10, 2): the barycentric gradients in g_a; factors (10, 10, 2, 2): int of their coefficients over V / 5.

    g_a = (4 L_a - 1) grad L_a at a corner, 4 L_i grad L_j + 4 L_j grad L_i on an edge; int L_s L_t = V (1 + delta)/20.
    Fifths make them whole numbers: rounded ones have the same error in every element, and a thousand alike add up to
    a spurious stiffness against turning that is seen in very slender parts.
    """
    carriers, linear, constant = np.zeros((10, 2), np.int32), np.zeros((10, 2), int), np.zeros(10)
    used = np.ones((10, 2))
    for a in range(10):
        i, j = (a, a) if a < 4 else TET_EDGES[a - 4]
        carriers[a], linear[a] = (i, j), (j, i)
        if a < 4:
            constant[a], used[a, 1] = 1.0, 0.0
    same = linear[:, None, :, None] == linear[None, :, None, :]
    c, d = constant[:, None, None, None], constant[None, :, None, None]
    return carriers, (4.0 * (1.0 + same) - 5.0 * (c + d - c * d)) * used[:, None, :, None] * used[None, :, None, :]


CARRIERS, FACTORS = _straight_tables()


@kernel
def _straight_gradients(first, last, points, tets, out):  # type: ignore[no-untyped-def]
    """Gradients of L_0 to L_3, and a fifth of the volume in out[e, 4, 0]."""
    for e in range(first, last):
        out[e, 4, 0] = barycentric_gradients(points, tets, e, out[e]) / 30.0


@kernel
def _straight_rows(  # type: ignore[no-untyped-def]
    first, last, tets, curved, gradients, carriers, factors, starts, places, indptr, indices, slot, blocks, lam, mu
):
    """Block rows first to last: sums of P over the straight elements, then the isotropic combination of it."""
    for i in range(first, last):
        for k in range(indptr[i], indptr[i + 1]):
            slot[indices[k]] = k
        for s in range(starts[i], starts[i + 1]):
            e = places[s] // 10
            if curved[e]:
                continue
            a = places[s] - 10 * e
            p, q = carriers[a, 0], carriers[a, 1]
            V = gradients[e, 4, 0]
            px, py, pz = V * gradients[e, p, 0], V * gradients[e, p, 1], V * gradients[e, p, 2]
            qx, qy, qz = V * gradients[e, q, 0], V * gradients[e, q, 1], V * gradients[e, q, 2]
            for b in range(10):
                j = tets[e, b]
                if j < i:
                    continue
                r, t = carriers[b, 0], carriers[b, 1]
                rx, ry, rz = gradients[e, r, 0], gradients[e, r, 1], gradients[e, r, 2]
                tx, ty, tz = gradients[e, t, 0], gradients[e, t, 1], gradients[e, t, 2]
                f, g, h, o = factors[a, b, 0, 0], factors[a, b, 0, 1], factors[a, b, 1, 0], factors[a, b, 1, 1]
                vx, vy, vz = f * rx + g * tx, f * ry + g * ty, f * rz + g * tz
                wx, wy, wz = h * rx + o * tx, h * ry + o * ty, h * rz + o * tz
                k = slot[j]
                blocks[k, 0, 0] += px * vx + qx * wx
                blocks[k, 0, 1] += px * vy + qx * wy
                blocks[k, 0, 2] += px * vz + qx * wz
                blocks[k, 1, 0] += py * vx + qy * wx
                blocks[k, 1, 1] += py * vy + qy * wy
                blocks[k, 1, 2] += py * vz + qy * wz
                blocks[k, 2, 0] += pz * vx + qz * wx
                blocks[k, 2, 1] += pz * vy + qz * wy
                blocks[k, 2, 2] += pz * vz + qz * wz
        for k in range(indptr[i], indptr[i + 1]):
            trace = mu * (blocks[k, 0, 0] + blocks[k, 1, 1] + blocks[k, 2, 2])
            for c in range(3):
                blocks[k, c, c] = (lam + mu) * blocks[k, c, c] + trace
                for d in range(c):
                    lower, upper = blocks[k, c, d], blocks[k, d, c]
                    blocks[k, c, d] = lam * lower + mu * upper
                    blocks[k, d, c] = lam * upper + mu * lower


@kernel
def _curved_elements(first, last, elements, points, tets, slopes, weights, lam, mu, out):  # type: ignore[no-untyped-def]
    """Element matrices (30, 30) by quadrature, upper blocks; slopes (q, 10, 3), weights (q,)."""
    g, J, C = np.empty(30), np.empty((3, 3)), np.empty((3, 3))
    for n in range(first, last):
        e = np.int64(elements[n])
        P = out[n]
        P[:] = 0.0
        for q in range(weights.size):
            det = inverse_jacobian(points, tets, e, slopes[q], J, C)
            weight = weights[q] * det  # a rule may have negative weights
            for a in range(10):
                for i in range(3):
                    g[3 * a + i] = C[i, 0] * slopes[q, a, 0] + C[i, 1] * slopes[q, a, 1] + C[i, 2] * slopes[q, a, 2]
            for r in range(30):
                factor = weight * g[r]
                for c in range(r - r % 3, 30):
                    P[r, c] += factor * g[c]
        for a in range(0, 30, 3):
            for b in range(a, 30, 3):
                trace = mu * (P[a, b] + P[a + 1, b + 1] + P[a + 2, b + 2])
                for c in range(3):
                    P[a + c, b + c] = (lam + mu) * P[a + c, b + c] + trace
                    for d in range(c):
                        lower, upper = P[a + c, b + d], P[a + d, b + c]
                        P[a + c, b + d] = lam * lower + mu * upper
                        P[a + d, b + c] = lam * upper + mu * lower


@kernel
def _add_elements(first, last, elements, tets, matrices, indptr, indices, blocks):  # type: ignore[no-untyped-def]
    """Add the upper blocks of element matrices (30, 30) to the block rows first to last."""
    for n in range(elements.size):
        e = elements[n]
        for a in range(10):
            for b in range(a, 10):
                i, j = tets[e, a], tets[e, b]
                row, column = min(i, j), max(i, j)
                if row < first or row >= last:
                    continue
                low = find(indptr, indices, row, column)
                if i <= j:
                    for c in range(3):
                        for d in range(3):
                            blocks[low, c, d] += matrices[n, 3 * a + c, 3 * b + d]
                else:
                    for c in range(3):
                        for d in range(3):
                            blocks[low, c, d] += matrices[n, 3 * a + d, 3 * b + c]


def straight_blocks(
    points: Array,
    tets: Int,
    curved: NDArray[np.bool_],
    incident: tuple[Int, Int],
    pattern: tuple[Int, Int],
    lam: float,
    mu: float,
    threads: int,
) -> Array:
    """(b, 3, 3) blocks of the straight elements' stiffness in `pattern`; points (n, 3), tets (m, 10), curved (m,)."""
    gradients = np.empty((tets.shape[0], 5, 3))
    run(lambda a, b: _straight_gradients(a, b, points, tets, gradients), ranges(tets.shape[0]), threads)
    blocks = np.zeros((pattern[1].size, 3, 3))

    def rows(first: int, last: int) -> None:
        slot = np.empty(points.shape[0], dtype=np.int32)
        _straight_rows(
            first, last, tets, curved, gradients, CARRIERS, FACTORS, *incident, *pattern, slot, blocks, lam, mu
        )

    run(rows, ranges(points.shape[0]), threads)
    return blocks


def add_curved(
    blocks: Array,
    points: Array,
    tets: Int,
    elements: Int,
    rule: tuple[Array, Array],
    pattern: tuple[Int, Int],
    lam: float,
    mu: float,
    threads: int,
) -> None:
    """Add the stiffness of `elements` (k,) to `blocks`; rule: slopes dN_a/dxi_j (q, 10, 3) and weights (q,)."""
    slopes, weights = rule
    for begin in range(0, elements.size, _CURVED_AT_ONCE):
        some = elements[begin : begin + _CURVED_AT_ONCE]
        out = np.empty((some.size, 30, 30))
        args = (some, points, tets, slopes, weights, lam, mu, out)
        run(lambda a, b, args=args: _curved_elements(a, b, *args), ranges(some.size), threads)  # type: ignore[misc]
        more = (some, tets, out, *pattern, blocks)
        parts = ranges(points.shape[0], max(threads, 1))  # whatever the ranges, a block's sum has one order
        run(lambda a, b, more=more: _add_elements(a, b, *more), parts, threads)  # type: ignore[misc]
