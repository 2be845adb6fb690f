"""Linear elements on the corners of a mesh of 10-node tetrahedra, and integrals of the shape functions at its nodes.

A linear field on an element, its mid-edge nodes in the mean of the edge's ends, is a linear one in the element's
coordinates also where it is curved. Its gradients are then those of the barycentric coordinates, L_k = xi_k for k = 1
to 3: rows of the inverse Jacobian.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.elastic import add_elements, isotropic, isotropic_matrix
from fem.solid.kernels.jacobian import inverse_jacobian
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.lanes import load, store, times_plus
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import TET_EDGES, Array

Int = NDArray[np.int32]
_EDGES = TET_EDGES.astype(np.int32)
_AT_ONCE = 8192


@kernel
def _linear_rows(  # type: ignore[no-untyped-def]
    first, last, tets, curved, gradients, starts, places, indptr, indices, slot, P, blocks, lam, mu
):
    """Block rows first to last of the straight elements' stiffness, V g_a g_b^T rearranged; see `_straight_rows`."""
    one, two, three, four = np.uint64(1), np.uint64(2), np.uint64(3), np.uint64(4)
    for i in range(first, last):
        begin, count = indptr[i], indptr[i + 1] - indptr[i]
        for k in range(count):
            slot[indices[begin + k]] = 12 * k
        P[: 12 * count] = 0.0
        for s in range(starts[i], starts[i + 1]):
            e = places[s] >> 2
            if curved[e]:
                continue
            own = np.uint64(16 * np.int64(e))
            a = own + four * np.uint64(places[s] & 3)
            V = 5.0 * gradients[own + three]
            x, y, z = V * gradients[a], V * gradients[a + one], V * gradients[a + two]
            for b in range(4):
                j = tets[e, b]
                if j < i:
                    continue
                g = load(gradients, own + four * np.uint64(b), 4)
                at = np.uint64(slot[j])
                store(P, at, times_plus(x, g, load(P, at, 4)))
                at += four
                store(P, at, times_plus(y, g, load(P, at, 4)))
                at += four
                store(P, at, times_plus(z, g, load(P, at, 4)))
        for k in range(count):
            isotropic(P, np.uint64(12 * k), lam, mu, blocks, begin + k)


@kernel
def _curved_linear(first, last, elements, points, tets, slopes, weights, lam, mu, out):  # type: ignore[no-untyped-def]
    """Element matrices (12, 12) of curved elements by quadrature, upper blocks; slopes (q, 10, 3), weights (q,)."""
    g, J, C = np.empty(12), np.empty((3, 3)), np.empty((3, 3))
    for n in range(first, last):
        e = np.int64(elements[n])
        P = out[n]
        P[:] = 0.0
        for q in range(weights.size):
            weight = weights[q] * inverse_jacobian(points, tets, e, slopes[q], J, C)
            for i in range(3):
                g[i] = -(C[i, 0] + C[i, 1] + C[i, 2])
                g[3 + i], g[6 + i], g[9 + i] = C[i, 0], C[i, 1], C[i, 2]
            for r in range(12):
                factor = weight * g[r]
                for c in range(r - r % 3, 12):
                    P[r, c] += factor * g[c]
        isotropic_matrix(P, lam, mu)


@kernel
def _straight_integrals(first, last, curved, gradients, edges, starts, places, out):  # type: ignore[no-untyped-def]
    """Add int N_a dV and int dN_a/dx_i dV of the straight elements to the nodes first to last: out (n, 4).

    Of a corner they are -V / 20 and nothing, of the middle of an edge ij V / 5 and V (grad L_i + grad L_j).
    """
    for i in range(first, last):
        share, x, y, z = 0.0, 0.0, 0.0, 0.0
        for s in range(starts[i], starts[i + 1]):
            e = places[s] // 10
            if curved[e]:
                continue
            a = places[s] - 10 * e
            fifth = gradients[e, 3]
            if a < 4:
                share -= 0.25 * fifth
            else:
                p, q = 4 * edges[a - 4, 0], 4 * edges[a - 4, 1]
                share += fifth
                x += 5.0 * fifth * (gradients[e, p] + gradients[e, q])
                y += 5.0 * fifth * (gradients[e, p + 1] + gradients[e, q + 1])
                z += 5.0 * fifth * (gradients[e, p + 2] + gradients[e, q + 2])
        out[i, 0] += share
        out[i, 1] += x
        out[i, 2] += y
        out[i, 3] += z


def linear_blocks(
    gradients: Array,
    corners: Int,
    curved: NDArray[np.bool_],
    incident: tuple[Int, Int],
    pattern: tuple[Int, Int],
    lam: float,
    mu: float,
    threads: int,
) -> Array:
    """(b, 3, 3) blocks of the straight elements' stiffness with linear displacements; gradients (m, 16) as of
    `straight_gradients`, corners (m, 4) numbered by themselves, as `incident` and `pattern` are."""
    blocks = np.empty((pattern[1].size, 3, 3))
    nodes, widest = pattern[0].size - 1, int(np.diff(pattern[0]).max(initial=0))
    flat = gradients.reshape(-1)

    def rows(first: int, last: int) -> None:
        slot, P = np.empty(nodes, dtype=np.int32), np.empty(12 * widest)
        _linear_rows(first, last, corners, curved, flat, *incident, *pattern, slot, P, blocks, lam, mu)

    run(rows, ranges(nodes), threads)
    return blocks


def add_curved_linear(
    blocks: Array,
    points: Array,
    tets: Int,
    corners: Int,
    elements: Int,
    rule: tuple[Array, Array],
    pattern: tuple[Int, Int],
    lam: float,
    mu: float,
    threads: int,
) -> None:
    """Add what curved `elements` (k,) of `tets` (m, 10) have of it; rule: slopes dN_a/dxi_j (q, 10, 3), weights."""
    for begin in range(0, elements.size, _AT_ONCE):
        some = elements[begin : begin + _AT_ONCE]
        out = np.empty((some.size, 12, 12))
        args = (some, points, tets, *rule, lam, mu, out)
        run(lambda a, b, args=args: _curved_linear(a, b, *args), ranges(some.size), threads)  # type: ignore[misc]
        more = (some, corners, out, *pattern, blocks)
        parts = ranges(pattern[0].size - 1, max(threads, 1))  # whatever the ranges, a block's sum has one order
        run(lambda a, b, more=more: add_elements(a, b, *more), parts, threads)  # type: ignore[misc]


def add_straight_integrals(
    gradients: Array, curved: NDArray[np.bool_], incident: tuple[Int, Int], out: Array, threads: int
) -> None:
    """Add int N_a dV and int dN_a/dx_i dV of the straight elements to the nodes: out (n, 4)."""
    args = (curved, gradients, _EDGES, *incident, out)
    run(lambda a, b: _straight_integrals(a, b, *args), ranges(out.shape[0]), threads)
