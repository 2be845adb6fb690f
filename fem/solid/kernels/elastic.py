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
from fem.solid.kernels.lanes import load, store, times, times_plus
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
    """Gradients of L_0 to L_3, four numbers apart, and a fifth of the volume in out[e, 3]."""
    g = np.empty((4, 3))
    for e in range(first, last):
        fifth = barycentric_gradients(points, tets, e, g) / 30.0
        for k in range(4):
            for c in range(3):
                out[e, 4 * k + c] = g[k, c]
            out[e, 4 * k + 3] = 0.0
        out[e, 3] = fifth


@kernel
def isotropic(P, at, lam, mu, blocks, k):  # type: ignore[no-untyped-def]
    """blocks[k] = lambda P + mu P^T + mu tr(P) 1 of the block whose rows stand in P, four numbers apart, from `at`."""
    one, two, four = np.uint64(1), np.uint64(2), np.uint64(4)
    xx, xy, xz = P[at], P[at + one], P[at + two]
    at += four
    yx, yy, yz = P[at], P[at + one], P[at + two]
    zx, zy, zz = P[at + four], P[at + four + one], P[at + four + two]
    trace, both = mu * (xx + yy + zz), lam + mu
    blocks[k, 0, 0], blocks[k, 1, 1], blocks[k, 2, 2] = both * xx + trace, both * yy + trace, both * zz + trace
    blocks[k, 0, 1], blocks[k, 1, 0] = lam * xy + mu * yx, lam * yx + mu * xy
    blocks[k, 0, 2], blocks[k, 2, 0] = lam * xz + mu * zx, lam * zx + mu * xz
    blocks[k, 1, 2], blocks[k, 2, 1] = lam * yz + mu * zy, lam * zy + mu * yz


@kernel
def _straight_rows(  # type: ignore[no-untyped-def]
    first, last, tets, curved, gradients, carriers, factors, starts, places, indptr, indices, slot, P, blocks, lam, mu
):
    """Block rows first to last: sums of P over the straight elements, then the isotropic combination of it.

    A row of P has a fourth number that nobody reads, so that it fills a register.
    """
    one, two, three, four = np.uint64(1), np.uint64(2), np.uint64(3), np.uint64(4)
    for i in range(first, last):
        begin, count = indptr[i], indptr[i + 1] - indptr[i]
        for k in range(count):
            slot[indices[begin + k]] = 12 * k
        P[: 12 * count] = 0.0
        for s in range(starts[i], starts[i + 1]):
            e = places[s] // 10
            if curved[e]:
                continue
            a = np.uint64(places[s] - 10 * e)
            own = np.uint64(16 * np.int64(e))
            V = gradients[own + three]
            p, q = own + four * np.uint64(carriers[a, 0]), own + four * np.uint64(carriers[a, 1])
            px, py, pz = V * gradients[p], V * gradients[p + one], V * gradients[p + two]
            qx, qy, qz = V * gradients[q], V * gradients[q + one], V * gradients[q + two]
            for b in range(10):
                j = tets[e, b]
                if j < i:
                    continue
                r = load(gradients, own + four * np.uint64(carriers[b, 0]), 4)
                t = load(gradients, own + four * np.uint64(carriers[b, 1]), 4)
                v = times_plus(factors[a, b, 0, 0], r, times(factors[a, b, 0, 1], t))
                w = times_plus(factors[a, b, 1, 0], r, times(factors[a, b, 1, 1], t))
                at = np.uint64(slot[j])
                store(P, at, times_plus(px, v, times_plus(qx, w, load(P, at, 4))))
                at += four
                store(P, at, times_plus(py, v, times_plus(qy, w, load(P, at, 4))))
                at += four
                store(P, at, times_plus(pz, v, times_plus(qz, w, load(P, at, 4))))
        for k in range(count):
            isotropic(P, np.uint64(12 * k), lam, mu, blocks, begin + k)


@kernel
def isotropic_matrix(P, lam, mu):  # type: ignore[no-untyped-def]
    """Turn the upper blocks of P = int grad N_a grad N_b^T dV into those of an element's stiffness, in place."""
    for a in range(0, P.shape[0], 3):
        for b in range(a, P.shape[0], 3):
            trace = mu * (P[a, b] + P[a + 1, b + 1] + P[a + 2, b + 2])
            for c in range(3):
                P[a + c, b + c] = (lam + mu) * P[a + c, b + c] + trace
                for d in range(c):
                    lower, upper = P[a + c, b + d], P[a + d, b + c]
                    P[a + c, b + d] = lam * lower + mu * upper
                    P[a + d, b + c] = lam * upper + mu * lower


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
        isotropic_matrix(P, lam, mu)


@kernel
def add_elements(first, last, elements, tets, matrices, indptr, indices, blocks):  # type: ignore[no-untyped-def]
    """Add the upper blocks of element matrices (30, 30), or (12, 12), to the block rows first to last."""
    width = tets.shape[1]
    for n in range(elements.size):
        e = elements[n]
        for a in range(width):
            for b in range(a, width):
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


def straight_gradients(points: Array, tets: Int, threads: int) -> Array:
    """(m, 16): of every element, taken as straight, the gradients of the barycentric coordinates in columns 4 k to
    4 k + 2, 1/mm, and in column 3 a fifth of its volume, mm^3."""
    out = np.empty((tets.shape[0], 16))
    run(lambda a, b: _straight_gradients(a, b, points, tets, out), ranges(tets.shape[0]), threads)
    return out


def straight_blocks(
    gradients: Array,
    tets: Int,
    curved: NDArray[np.bool_],
    incident: tuple[Int, Int],
    pattern: tuple[Int, Int],
    lam: float,
    mu: float,
    threads: int,
) -> Array:
    """(b, 3, 3) blocks of the straight elements' stiffness in `pattern`; gradients (m, 16) as of `straight_gradients`,
    tets (m, 10), curved (m,)."""
    blocks = np.empty((pattern[1].size, 3, 3))
    nodes, widest = pattern[0].size - 1, int(np.diff(pattern[0]).max(initial=0))
    flat = gradients.reshape(-1)

    def rows(first: int, last: int) -> None:
        slot, P = np.empty(nodes, dtype=np.int32), np.empty(12 * widest)
        _straight_rows(
            first, last, tets, curved, flat, CARRIERS, FACTORS, *incident, *pattern, slot, P, blocks, lam, mu
        )

    run(rows, ranges(nodes), threads)
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
        run(lambda a, b, more=more: add_elements(a, b, *more), parts, threads)  # type: ignore[misc]
