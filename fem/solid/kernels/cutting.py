"""Plane cuts of tetrahedra: the triangles of a section, and its integrals as weights of the nodes' displacements."""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.quadratic import barycentric_slopes, node_slopes, shape_values
from fem.solid.shape import TET_EDGES, Array, tet_values, triangle_quadrature

Int = NDArray[np.int32]
CURVED_LEVELS = 2
"""A curved element is cut as 8 ** this many smaller ones whose corners lie on it."""
ORDER = 4
EDGES = TET_EDGES.astype(np.int32)


def _codes() -> tuple[Int, Int]:
    """(16,) corners of the cut (0, 3 or 4) and (16, 4, 2) edges it passes, by which corners lie beyond (bits)."""
    sizes, edges = np.zeros(16, np.int32), np.zeros((16, 4, 2), np.int32)
    for code in range(1, 15):
        lone, rest = ([i for i in range(4) if (code >> i & 1) == bit] for bit in (1, 0))
        if len(lone) == 3:
            lone, rest = rest, lone
        if len(lone) == 1:
            pairs = [(lone[0], r) for r in rest]
        else:
            pairs = [(lone[0], rest[0]), (lone[0], rest[1]), (lone[1], rest[1]), (lone[1], rest[0])]
        sizes[code] = len(pairs)
        edges[code, : len(pairs)] = pairs
    return sizes, edges


SIZES, CROSSED = _codes()


@cache
def smaller_tets(levels: int) -> Array:
    """(8 ** levels, 4, 4) barycentric corners of the smaller tetrahedra: [child, corner, coordinate]."""
    tets = np.eye(4)[None]
    for _ in range(levels):
        a, b, c, d = tets.transpose(1, 0, 2)
        ab, bc, ac, ad, bd, cd = ((x + y) / 2 for x, y in ((a, b), (b, c), (a, c), (a, d), (b, d), (c, d)))
        parts = (
            (a, ab, ac, ad),
            (ab, b, bc, bd),
            (ac, bc, c, cd),
            (ad, bd, cd, d),
            (ab, ac, ad, bd),
            (ab, ac, bc, bd),
            (ac, ad, bd, cd),
            (ac, bc, bd, cd),
        )
        tets = np.concatenate([np.stack(p, axis=1) for p in parts])
    return tets


@cache
def _pieces() -> tuple[Array, Array]:
    """Barycentric corners (t, 4, 4) and shape functions there (t, 4, 10): the whole element, then the smaller ones."""
    corners = np.concatenate([np.eye(4)[None], smaller_tets(CURVED_LEVELS)])
    return corners, np.ascontiguousarray(tet_values(corners.reshape(-1, 4).T).T.reshape(-1, 4, 10))


@cache
def _rule() -> tuple[Array, Array]:
    L, w = triangle_quadrature(ORDER)
    return np.ascontiguousarray(L.T), w


@kernel
def curved_flags(points, tets, edges, tolerance, out):  # type: ignore[no-untyped-def]
    """Whether a mid-edge node leaves the middle of its edge by more than `tolerance` of its length."""
    for e in range(tets.shape[0]):
        out[e] = False
        for k in range(6):
            i, j, a = tets[e, edges[k, 0]], tets[e, edges[k, 1]], tets[e, 4 + k]
            off, size = 0.0, 0.0
            for c in range(3):
                off += (points[a, c] - (points[i, c] + points[j, c]) / 2) ** 2
                size += (points[j, c] - points[i, c]) ** 2
            if np.sqrt(off) > tolerance * np.sqrt(size):
                out[e] = True
                break


@kernel
def element_ranges(x, tets, low, high, middle):  # type: ignore[no-untyped-def]
    """Least and greatest of a coordinate x (n,) over each element's nodes, and its mean over the corners."""
    for e in range(tets.shape[0]):
        a = b = x[tets[e, 0]]
        for k in range(1, 10):
            v = x[tets[e, k]]
            a, b = min(a, v), max(b, v)
        low[e], high[e] = a, b
        middle[e] = (x[tets[e, 0]] + x[tets[e, 1]] + x[tets[e, 2]] + x[tets[e, 3]]) / 4


@kernel
def edge_lengths(points, tets, edges, total, count):  # type: ignore[no-untyped-def]
    """Add to each node (n,) the mean edge length of its elements, and count them."""
    for e in range(tets.shape[0]):
        mean = 0.0
        for k in range(6):
            i, j, square = tets[e, edges[k, 0]], tets[e, edges[k, 1]], 0.0
            for c in range(3):
                square += (points[j, c] - points[i, c]) ** 2
            mean += np.sqrt(square) / 6.0
        for a in range(10):
            total[tets[e, a]] += mean
            count[tets[e, a]] += 1


@kernel
def _cut(  # type: ignore[no-untyped-def]
    elements, curved, pieces, shapes, sizes, crossed, points, tets, at, tolerance, snap, sign, fill, owner, corners,
    areas,
):  # fmt: skip
    """Triangles of the cut x = at; their number. With `fill` also owner (t,), corners (t, 3, 4) and twice the area."""
    count = 0
    d, distance, polygon, N, place = np.empty(10), np.empty(4), np.empty((4, 4)), np.empty(10), np.empty((3, 3))
    for n in range(elements.size):
        e = elements[n]
        for a in range(10):
            v = points[tets[e, a], 0] - at
            d[a] = 0.0 if abs(v) < tolerance else sign * v
        first, last = (1, pieces.shape[0]) if curved[e] else (0, 1)
        for t in range(first, last):
            code = 0
            for k in range(4):
                v = 0.0
                for a in range(10):
                    v += shapes[t, k, a] * d[a]
                distance[k] = 0.0 if abs(v) < snap else v
                if distance[k] >= 0.0:
                    code |= 1 << k
            size = sizes[code]
            if not fill:
                count += max(size - 2, 0)
                continue
            for s in range(size):
                i, j = crossed[code, s, 0], crossed[code, s, 1]
                share = distance[i] / (distance[i] - distance[j])
                for c in range(4):
                    polygon[s, c] = pieces[t, i, c] * (1.0 - share) + pieces[t, j, c] * share
            for s in range(1, size - 1):
                owner[count] = e
                for k in range(3):
                    row = 0 if k == 0 else s + k - 1
                    for c in range(4):
                        corners[count, k, c] = polygon[row, c]
                    shape_values(polygon[row], N)
                    for i in range(3):
                        place[k, i] = 0.0
                    for a in range(10):
                        for i in range(3):
                            place[k, i] += N[a] * points[tets[e, a], i]
                areas[count] = abs(
                    (place[1, 1] - place[0, 1]) * (place[2, 2] - place[0, 2])
                    - (place[1, 2] - place[0, 2]) * (place[2, 1] - place[0, 1])
                )
                count += 1
    return count


@kernel
def _quadrature(owner, corners, areas, kept, L, w, points, tets, elements, bary, weights, x):  # type: ignore[no-untyped-def]
    """Points of the rule (L (q, 3), w (q,)) in the kept triangles."""
    N, at = np.empty(10), np.empty(4)
    p = 0
    for k in range(kept.size):
        t = kept[k]
        for q in range(w.size):
            for c in range(4):
                at[c] = corners[t, 0, c] * L[q, 0] + corners[t, 1, c] * L[q, 1] + corners[t, 2, c] * L[q, 2]
                bary[c, p] = at[c]
            shape_values(at, N)
            elements[p] = owner[t]
            weights[p] = areas[t] * w[q]
            for i in range(3):
                v = 0.0
                for a in range(10):
                    v += N[a] * points[tets[owner[t], a], i]
                x[i, p] = v
            p += 1


@kernel
def _node_weights(elements, bary, weights, arms, points, tets, curved, slot, nodes, shares, slopes):  # type: ignore[no-untyped-def]
    """int N_a {1, r} dA in shares (k, 4) and int dN_a/dx_j {1, r_y, r_z} dA in slopes (k, 3, 3); number of nodes."""
    count, total = 0, elements.size
    L, N, g = np.empty(4), np.empty(10), np.empty((10, 3))
    J, straight = np.empty((3, 3)), np.empty((4, 3))
    own, own_slopes, first = np.empty((10, 4)), np.empty((10, 3, 3)), np.empty((5, 3))
    for p in range(total):
        e = elements[p]
        if p == 0 or e != elements[p - 1]:
            own[:], own_slopes[:], first[:] = 0.0, 0.0, 0.0
        w = weights[p]
        x, y, z = w * arms[0, p], w * arms[1, p], w * arms[2, p]
        for c in range(4):
            L[c] = bary[c, p]
        shape_values(L, N)
        for a in range(10):
            own[a, 0] += N[a] * w
            own[a, 1] += N[a] * x
            own[a, 2] += N[a] * y
            own[a, 3] += N[a] * z
        if curved[e]:
            barycentric_slopes(points, tets, e, L, True, J, straight)
            node_slopes(L, straight, g)
            for a in range(10):
                for c in range(3):
                    own_slopes[a, 0, c] += w * g[a, c]
                    own_slopes[a, 1, c] += y * g[a, c]
                    own_slopes[a, 2, c] += z * g[a, c]
        else:  # gradients are linear: the moments of the barycentric coordinates are enough
            for c in range(4):
                first[c, 0] += w * L[c]
                first[c, 1] += y * L[c]
                first[c, 2] += z * L[c]
            first[4, 0] += w
            first[4, 1] += y
            first[4, 2] += z
        if p < total - 1 and elements[p + 1] == e:
            continue
        if not curved[e]:
            barycentric_slopes(points, tets, e, L, False, J, straight)
            for m in range(3):
                for c in range(3):
                    for a in range(4):
                        own_slopes[a, m, c] = (4.0 * first[a, m] - first[4, m]) * straight[a, c]
                    for k in range(6):
                        i, j = EDGES[k, 0], EDGES[k, 1]
                        own_slopes[4 + k, m, c] = 4.0 * (first[i, m] * straight[j, c] + first[j, m] * straight[i, c])
        for a in range(10):
            i = tets[e, a]
            s = slot[i]
            if s < 0:
                s = slot[i] = count
                nodes[s] = i
                shares[s], slopes[s] = 0.0, 0.0
                count += 1
            for c in range(4):
                shares[s, c] += own[a, c]
            for m in range(3):
                for c in range(3):
                    slopes[s, m, c] += own_slopes[a, m, c]
    return count


def section_points(
    points: Array, tets: Int, curved: NDArray[np.bool_], elements: Int, at: float, limits: tuple[float, float],
    sign: float,
) -> tuple[Int, Array, Array, Array]:  # fmt: skip
    """Quadrature on the plane x = at of the elements: elements (p,), bary (4, p), weights (p,), positions (3, p).

    points (n, 3), tets (m, 10). A node within limits[0] of the plane lies on it and, as every one with
    sign * (x - at) >= 0, counts as beyond; limits[1] is the same for the corners of the smaller tetrahedra.
    """
    pieces, shapes = _pieces()
    args = (elements, curved, pieces, shapes, SIZES, CROSSED, points, tets, at, *limits, sign)
    none = np.zeros(0, np.int32), np.zeros((0, 3, 4)), np.zeros(0)
    count = _cut(*args, False, *none)
    owner, corners, areas = np.empty(count, np.int32), np.empty((count, 3, 4)), np.empty(count)
    _cut(*args, True, owner, corners, areas)
    kept = np.flatnonzero(areas > 1e-14 * areas.max(initial=0.0))
    L, w = _rule()
    p = kept.size * w.size
    out = np.empty(p, np.int32), np.empty((4, p)), np.empty(p), np.empty((3, p))
    _quadrature(owner, corners, areas, kept, L, w, points, tets, *out)
    return out


def section_weights(
    points: Array, tets: Int, curved: NDArray[np.bool_], elements: Int, bary: Array, weights: Array, arms: Array
) -> tuple[Int, Array, Array]:
    """Nodes (k,) of a section and its integrals as their weights.

    shares (k, 4): int N_a {1, r_x, r_y, r_z} dA; slopes (k, 3, 3): int {1, r_y, r_z} dN_a/dx_j dA, [k, moment, j].
    arms r (3, p) at the quadrature points, in the axes of `points`.
    """
    n = points.shape[0]
    most = min(n, 10 * (1 + int(np.count_nonzero(np.diff(elements)))))
    slot, nodes = np.full(n, -1, np.int32), np.empty(most, np.int32)
    shares, slopes = np.empty((most, 4)), np.empty((most, 3, 3))
    k = _node_weights(elements, bary, weights, arms, points, tets, curved, slot, nodes, shares, slopes)
    return nodes[:k], shares[:k].copy(), slopes[:k].copy()
