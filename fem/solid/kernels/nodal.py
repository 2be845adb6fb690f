"""Matrices that treat the three directions alike, one number for each pair of nodes: mass and geometric stiffness."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.elastic import CARRIERS
from fem.solid.kernels.jacobian import barycentric_gradients, inverse_jacobian
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.kernels.pattern import find
from fem.solid.shape import Array

Int = NDArray[np.int32]
_AT_ONCE = 8192


@kernel
def _masses(first, last, elements, points, tets, products, slopes, weights, out):  # type: ignore[no-untyped-def]
    """int N_a N_b dV: sum over q of w det products (q, 10, 10); a straight element has one point."""
    J, C = np.empty((3, 3)), np.empty((3, 3))
    for n in range(first, last):
        e = np.int64(elements[n])
        out[n] = 0.0
        for q in range(weights.size):
            w = weights[q] * inverse_jacobian(points, tets, e, slopes[q], J, C)
            for a in range(10):
                for b in range(a, 10):
                    out[n, a, b] += w * products[q, a, b]


@kernel
def _straight_geometric(first, last, elements, points, tets, carriers, factors, stress, out):  # type: ignore[no-untyped-def]
    """int s_ij dN_a/dx_i dN_b/dx_j dV of a linear stress (k, 6, 4), factors (4, 10, 10, 2, 2) over the volume."""
    g, h = np.empty((4, 3)), np.empty((4, 4, 4))
    for n in range(first, last):
        e = np.int64(elements[n])
        volume = barycentric_gradients(points, tets, e, g) / 6.0
        for q in range(4):
            xx, yy, zz = stress[n, 0, q], stress[n, 1, q], stress[n, 2, q]
            xy, yz, zx = stress[n, 3, q], stress[n, 4, q], stress[n, 5, q]
            for p in range(4):
                x, y, z = volume * g[p, 0], volume * g[p, 1], volume * g[p, 2]
                tx, ty, tz = xx * x + xy * y + zx * z, xy * x + yy * y + yz * z, zx * x + yz * y + zz * z
                for r in range(4):
                    h[q, p, r] = tx * g[r, 0] + ty * g[r, 1] + tz * g[r, 2]
        for a in range(10):
            for b in range(a, 10):
                total = 0.0
                for q in range(4):
                    for c in range(2):
                        for d in range(2):
                            total += factors[q, a, b, c, d] * h[q, carriers[a, c], carriers[b, d]]
                out[n, a, b] = total


@kernel
def _curved_geometric(first, last, elements, points, tets, slopes, weights, stress, out):  # type: ignore[no-untyped-def]
    """As `_straight_geometric` by quadrature, of stress (k, 6, q) at the points of the rule."""
    J, C, g = np.empty((3, 3)), np.empty((3, 3)), np.empty((10, 3))
    for n in range(first, last):
        e = np.int64(elements[n])
        out[n] = 0.0
        for q in range(weights.size):
            w = weights[q] * inverse_jacobian(points, tets, e, slopes[q], J, C)
            xx, yy, zz = w * stress[n, 0, q], w * stress[n, 1, q], w * stress[n, 2, q]
            xy, yz, zx = w * stress[n, 3, q], w * stress[n, 4, q], w * stress[n, 5, q]
            for a in range(10):
                for i in range(3):
                    g[a, i] = C[i, 0] * slopes[q, a, 0] + C[i, 1] * slopes[q, a, 1] + C[i, 2] * slopes[q, a, 2]
            for a in range(10):
                x, y, z = g[a, 0], g[a, 1], g[a, 2]
                tx, ty, tz = xx * x + xy * y + zx * z, xy * x + yy * y + yz * z, zx * x + yz * y + zz * z
                for b in range(a, 10):
                    out[n, a, b] += tx * g[b, 0] + ty * g[b, 1] + tz * g[b, 2]


@kernel
def _add_numbers(first, last, elements, tets, values, indptr, indices, out):  # type: ignore[no-untyped-def]
    """Add element values (k, 10, 10), upper half, to the numbers in the rows first to last."""
    for n in range(elements.size):
        e = elements[n]
        for a in range(10):
            for b in range(a, 10):
                row, column = min(tets[e, a], tets[e, b]), max(tets[e, a], tets[e, b])
                if row >= first and row < last:
                    out[find(indptr, indices, row, column)] += values[n, a, b]


def _add(elements: Int, tets: Int, values: Array, pattern: tuple[Int, Int], out: Array, threads: int) -> None:
    args = (elements, tets, values, *pattern, out)
    parts = ranges(pattern[0].size - 1, max(threads, 1))  # whatever the ranges, a number's sum has one order
    run(lambda a, b: _add_numbers(a, b, *args), parts, threads)


def add_masses(
    values: Array,
    points: Array,
    tets: Int,
    elements: Int,
    rule: tuple[Array, Array, Array],
    pattern: tuple[Int, Int],
    threads: int,
) -> None:
    """Add int N_a N_b dV of `elements` to `values` (b,).

    rule: products N_a N_b (q, 10, 10), slopes (q, 10, 3), weights.
    """
    for begin in range(0, elements.size, _AT_ONCE):
        some = elements[begin : begin + _AT_ONCE]
        out = np.empty((some.size, 10, 10))
        args = (some, points, tets, *rule, out)
        run(lambda a, b, args=args: _masses(a, b, *args), ranges(some.size), threads)  # type: ignore[misc]
        _add(some, tets, out, pattern, values, threads)


def add_geometric(
    values: Array,
    points: Array,
    tets: Int,
    elements: Int,
    rule: tuple[Array, Array] | Array,
    stress: Array,
    pattern: tuple[Int, Int],
    threads: int,
) -> None:
    """Add int s_ij dN_a/dx_i dN_b/dx_j dV of `elements` with stress (k, 6, q) to `values` (b,).

    rule: of curved elements slopes (q, 10, 3) and weights (q,); of straight ones the factors (4, 10, 10, 2, 2).
    """
    for begin in range(0, elements.size, _AT_ONCE):
        part = slice(begin, begin + _AT_ONCE)
        some, s = elements[part], np.ascontiguousarray(stress[part])
        out = np.empty((some.size, 10, 10))
        if isinstance(rule, tuple):
            args = (some, points, tets, *rule, s, out)
            run(lambda a, b, args=args: _curved_geometric(a, b, *args), ranges(some.size), threads)  # type: ignore[misc]
        else:
            more = (some, points, tets, CARRIERS, rule, s, out)
            run(lambda a, b, more=more: _straight_geometric(a, b, *more), ranges(some.size), threads)  # type: ignore[misc]
        _add(some, tets, out, pattern, values, threads)
