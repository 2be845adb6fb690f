"""What the elements at a section's ragged interface exert, the material between it and the plane.

All of them sum over elements in the order of the mesh: the result of one call is the same in any thread.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.quadratic import barycentric_slopes, node_slopes, shape_values
from fem.solid.shape import Array, tet_quadrature

Int = NDArray[np.int32]
Bool = NDArray[np.bool_]
_PAIRS = np.array([[0, 1], [0, 2], [0, 3], [1, 2], [1, 3], [2, 3]])
"""Edges of a tetrahedron: the one opposite to k is 5 - k."""
Rules = tuple[Array, Array, Array, Array]


@cache
def rules(straight: int, curved: int) -> Rules:
    """Points (q, 4) and weights (q,) of the rules for straight and for curved elements, exact to these orders."""
    (a, v), (b, w) = tet_quadrature(straight), tet_quadrature(curved)
    return np.ascontiguousarray(a.T), np.ascontiguousarray(v), np.ascontiguousarray(b.T), np.ascontiguousarray(w)


@kernel
def node_reach(tets, middle, inside, lowest, highest):  # type: ignore[no-untyped-def]
    """Least and greatest of `middle` (m,) over the elements `inside` at each node; untouched nodes keep their value."""
    for e in range(tets.shape[0]):
        if inside[e]:
            for a in range(10):
                i = tets[e, a]
                lowest[i] = min(lowest[i], middle[e])
                highest[i] = max(highest[i], middle[e])


@kernel
def _stress(lam, mu, free, u, g, H, S):  # type: ignore[no-untyped-def]
    """Stress S (3, 3) of element displacements u (10, 3) with gradients g (10, 3); `free` is taken off the diagonal."""
    for i in range(3):
        for j in range(3):
            v = 0.0
            for a in range(10):
                v += u[a, i] * g[a, j]
            H[i, j] = v
    normal = lam * (H[0, 0] + H[1, 1] + H[2, 2]) - free
    for i in range(3):
        S[i, i] = normal + 2.0 * mu * H[i, i]
        for j in range(i):
            S[i, j] = S[j, i] = mu * (H[i, j] + H[j, i])


@kernel
def interface_forces(  # type: ignore[no-untyped-def]
    tets, curved, points, low, high, middle, level, code, reach, u, lam, mu, free, body, L1, w1, L2, w2, point, out
):  # fmt: skip
    """Add to out (c, 6) the force and the moment about `point` of the nodal forces at an interface.

    Elements with middle < level count with their nodes of code 1, the others with those of code 2 and the sign
    reversed: int B^T sigma dV less the share of the force for a volume, `body` (c, 3). reach: range along the member of
    the interface's nodes. u (c, 3, n); free (c,): stress of a prevented expansion.
    """
    count = u.shape[0]
    ue, L, N, g = np.empty((count, 10, 3)), np.empty(4), np.empty(10), np.empty((10, 3))
    J, slopes, H, S = np.empty((3, 3)), np.empty((4, 3)), np.empty((3, 3)), np.empty((3, 3))
    picked, arms = np.empty(10, np.bool_), np.empty((10, 3))
    G, M, R, F = np.empty(3), np.empty((3, 3)), np.empty(3), np.empty(6)
    for e in range(tets.shape[0]):
        if high[e] < reach[0] or low[e] > reach[1]:
            continue
        near = middle[e] < level
        want, sign = (1, 1.0) if near else (2, -1.0)
        some = False
        for a in range(10):
            picked[a] = code[tets[e, a]] == want
            some |= picked[a]
        if not some:
            continue
        for a in range(10):
            k = tets[e, a]
            for i in range(3):
                arms[a, i] = points[k, i] - point[i]
                for c in range(count):
                    ue[c, a, i] = u[c, i, k]
        weights, at = (w2, L2) if curved[e] else (w1, L1)
        det = 0.0
        for q in range(weights.size):
            L[:] = at[q]
            if curved[e] or q == 0:
                det = barycentric_slopes(points, tets, e, L, curved[e], J, slopes)
            w = sign * weights[q] * det
            node_slopes(L, slopes, g)
            shape_values(L, N)
            share = 0.0
            G[:], M[:], R[:] = 0.0, 0.0, 0.0
            for a in range(10):
                if picked[a]:
                    share += N[a]
                    for i in range(3):
                        G[i] += g[a, i]
                        R[i] += N[a] * arms[a, i]
                        for j in range(3):
                            M[i, j] += arms[a, i] * g[a, j]
            for c in range(count):
                _stress(lam, mu, free[c], ue[c], g, H, S)
                for i in range(3):
                    F[i] = S[i, 0] * G[0] + S[i, 1] * G[1] + S[i, 2] * G[2] - body[c, i] * share
                F[3] = F[4] = F[5] = 0.0
                for k in range(3):
                    F[3] += M[1, k] * S[2, k] - M[2, k] * S[1, k]
                    F[4] += M[2, k] * S[0, k] - M[0, k] * S[2, k]
                    F[5] += M[0, k] * S[1, k] - M[1, k] * S[0, k]
                F[3] -= R[1] * body[c, 2] - R[2] * body[c, 1]
                F[4] -= R[2] * body[c, 0] - R[0] * body[c, 2]
                F[5] -= R[0] * body[c, 1] - R[1] * body[c, 0]
                for i in range(6):
                    out[c, i] += w * F[i]


@kernel
def _add_simplex(points, tets, e, curved, corners, sign, L1, w1, J, slopes, L, N, out):  # type: ignore[no-untyped-def]
    """Add volume and first moment of the part of an element with barycentric corners (4, 4) to out (4,)."""
    # determinant of three edges; the coordinates add up to one, so any three of the four will do
    ax, ay, az = corners[1, 1] - corners[0, 1], corners[1, 2] - corners[0, 2], corners[1, 3] - corners[0, 3]
    bx, by, bz = corners[2, 1] - corners[0, 1], corners[2, 2] - corners[0, 2], corners[2, 3] - corners[0, 3]
    cx, cy, cz = corners[3, 1] - corners[0, 1], corners[3, 2] - corners[0, 2], corners[3, 3] - corners[0, 3]
    size = sign * abs(ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx))
    if not curved:
        for c in range(4):
            L[c] = (corners[0, c] + corners[1, c] + corners[2, c] + corners[3, c]) / 4.0
        volume = size * barycentric_slopes(points, tets, e, L, False, J, slopes) / 6.0
        out[0] += volume
        for i in range(3):
            x = 0.0
            for c in range(4):
                x += L[c] * points[tets[e, c], i]
            out[1 + i] += volume * x
        return
    for q in range(w1.size):
        for c in range(4):
            L[c] = 0.0
            for k in range(4):
                L[c] += L1[q, k] * corners[k, c]
        volume = size * w1[q] * barycentric_slopes(points, tets, e, L, True, J, slopes)
        shape_values(L, N)
        out[0] += volume
        for i in range(3):
            x = 0.0
            for a in range(10):
                x += N[a] * points[tets[e, a], i]
            out[1 + i] += volume * x


@kernel
def between(  # type: ignore[no-untyped-def]
    tets, curved, inside, points, low, high, middle, level, x, at, tolerance, L1, w1, out
):  # fmt: skip
    """Volume and first moment (2, 4) of the material between the interface and the plane at a station.

    out[0]: elements with middle < level, what of them lies beyond the plane; out[1]: the others, what lies before it. A
    plane cuts an element where it cuts its straight-edged copy. x (n,) along the member.
    """
    eye, corners = np.eye(4), np.empty((4, 4))
    J, slopes, L, N, d = np.empty((3, 3)), np.empty((4, 3)), np.empty(4), np.empty(10), np.empty(4)
    out[:] = 0.0
    for e in range(tets.shape[0]):
        if not inside[e]:
            continue
        near = middle[e] < level
        if (near and high[e] < at) or (not near and low[e] > at):
            continue
        sign = 1.0 if near else -1.0
        count, some = 0, False
        for k in range(4):
            v = x[tets[e, k]] - at
            d[k] = 0.0 if abs(v) < tolerance else sign * v
            count += d[k] >= 0.0
            some |= d[k] > 0.0
        if not some:
            continue
        row = out[0 if near else 1]
        if count >= 3:
            _add_simplex(points, tets, e, curved[e], eye, 1.0, L1, w1, J, slopes, L, N, row)
        if count == 4:
            continue
        if count != 2:
            for k in range(4):
                if (d[k] >= 0.0) == (count == 1):
                    for j in range(4):
                        share = 0.0 if j == k else d[k] / (d[k] - d[j])
                        for c in range(4):
                            corners[j, c] = eye[k, c] * (1.0 - share) + eye[j, c] * share
                    _add_simplex(points, tets, e, curved[e], corners, 2.0 - count, L1, w1, J, slopes, L, N, row)
            continue
        for s in range(6):
            i, j = _PAIRS[s, 0], _PAIRS[s, 1]
            if d[i] >= 0.0 and d[j] >= 0.0:
                k, m = _PAIRS[5 - s, 0], _PAIRS[5 - s, 1]
                ik, im = d[i] / (d[i] - d[k]), d[i] / (d[i] - d[m])
                jk, jm = d[j] / (d[j] - d[k]), d[j] / (d[j] - d[m])
                for wedge in range(3):
                    for c in range(4):
                        corners[0, c] = eye[i, c]
                        corners[1, c] = eye[j, c] if wedge == 0 else eye[i, c] * (1.0 - ik) + eye[k, c] * ik
                        if wedge == 2:
                            corners[2, c] = eye[i, c] * (1.0 - im) + eye[m, c] * im
                        else:
                            corners[2, c] = eye[j, c] * (1.0 - jk) + eye[k, c] * jk
                        corners[3, c] = eye[j, c] * (1.0 - jm) + eye[m, c] * jm
                    _add_simplex(points, tets, e, curved[e], corners, 1.0, L1, w1, J, slopes, L, N, row)


@kernel
def facet_owners(tets, marked, keys, third, owner, node_count):  # type: ignore[no-untyped-def]
    """Element of each facet: keys (k,) of the two lesser corners, rising, and the third corner.

    marked (n,): the facets' corners; owner (k,) keeps -1 where there is none.
    """
    t = np.empty(3, np.int64)
    for e in range(tets.shape[0]):
        for left in range(4):
            n = 0
            for k in range(4):
                if k != left and marked[tets[e, k]]:
                    t[n] = tets[e, k]
                    n += 1
            if n < 3:
                continue
            for i, j in ((0, 1), (1, 2), (0, 1)):
                if t[i] > t[j]:
                    t[i], t[j] = t[j], t[i]
            key = t[0] * node_count + t[1]
            k = np.searchsorted(keys, key)
            while k < keys.size and keys[k] == key:
                if third[k] == t[2]:
                    owner[k] = e
                k += 1
