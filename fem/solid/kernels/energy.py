"""Elastic energy of displacement fields, several load cases side by side."""

from __future__ import annotations

from collections.abc import Callable
from typing import cast

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.interface import Rules
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.lanes import load, minus, plus, product, store, times, times_plus
from fem.solid.kernels.parallel import ranges, run
from fem.solid.kernels.quadratic import barycentric_slopes, node_slopes
from fem.solid.shape import Array

Int = NDArray[np.int32]


def _energies(width: int) -> Callable[..., None]:
    @kernel
    def energy(  # type: ignore[no-untyped-def]
        first, last, tets, curved, points, u, nu, lam, mu, free, L1, w1, L2, w2, column, columns, out
    ):
        """Add to out (2 columns), of `width` cases from `column` on, int E sigma : C^-1 : sigma dV and the integral of
        the trace of the stress over elements first to last; u (3 n, columns), free (columns,)."""
        L, g = np.empty(4), np.empty((10, 3))
        J, slopes = np.empty((3, 3)), np.empty((4, 3))
        wide, begin = np.uint64(columns), np.uint64(column)
        second = begin + wide
        off = load(free, begin, width)
        squares, traces = load(out, begin, width), load(out, second, width)
        for e in range(first, last):
            weights, at = (w2, L2) if curved[e] else (w1, L1)
            det = 0.0
            for q in range(weights.size):
                L[:] = at[q]
                if curved[e] or q == 0:
                    det = barycentric_slopes(points, tets, e, L, curved[e], J, slopes)
                dV = weights[q] * det
                node_slopes(L, slopes, g)
                place = np.uint64(3 * tets[e, 0]) * wide + begin
                x, y, z = load(u, place, width), load(u, place + wide, width), load(u, place + wide + wide, width)
                xx, xy, xz = times(g[0, 0], x), times(g[0, 1], x), times(g[0, 2], x)
                yx, yy, yz = times(g[0, 0], y), times(g[0, 1], y), times(g[0, 2], y)
                zx, zy, zz = times(g[0, 0], z), times(g[0, 1], z), times(g[0, 2], z)
                for a in range(1, 10):
                    place = np.uint64(3 * tets[e, a]) * wide + begin
                    x, y, z = load(u, place, width), load(u, place + wide, width), load(u, place + wide + wide, width)
                    p, r, s = g[a, 0], g[a, 1], g[a, 2]
                    xx, xy, xz = times_plus(p, x, xx), times_plus(r, x, xy), times_plus(s, x, xz)
                    yx, yy, yz = times_plus(p, y, yx), times_plus(r, y, yy), times_plus(s, y, yz)
                    zx, zy, zz = times_plus(p, z, zx), times_plus(r, z, zy), times_plus(s, z, zz)
                normal = minus(times(lam, plus(plus(xx, yy), zz)), off)
                xx, yy = times_plus(2.0 * mu, xx, normal), times_plus(2.0 * mu, yy, normal)
                zz = times_plus(2.0 * mu, zz, normal)
                xy, yz, zx = times(mu, plus(xy, yx)), times(mu, plus(yz, zy)), times(mu, plus(zx, xz))
                trace = plus(plus(xx, yy), zz)
                shear = plus(plus(product(xy, xy), product(yz, yz)), product(zx, zx))
                size = plus(plus(product(xx, xx), product(yy, yy)), product(zz, zz))
                size = times_plus(2.0, shear, size)
                size = times_plus(-nu, product(trace, trace), times(1.0 + nu, size))
                squares = times_plus(dV, size, squares)
                traces = times_plus(dV, trace, traces)
        store(out, begin, squares)
        store(out, second, traces)

    return cast(Callable[..., None], energy)


_WIDTHS = (8, 4, 2, 1)
_ENERGY = {width: _energies(width) for width in _WIDTHS}


def elastic_energy(
    tets: Int,
    curved: NDArray[np.bool_],
    points: Array,
    u: Array,
    constants: tuple[float, float, float, float],
    free: Array,
    quadrature: Rules,
    threads: int,
) -> tuple[Array, Array]:
    """(c,) elastic energy and (c,) int of the trace of the stress, N mm.

    u (3 n, c), c of 1, 2, 4 or a multiple of 8; constants E, nu, lambda, mu; free (c,) stress of a prevented expansion.
    """
    columns, E = u.shape[1], constants[0]
    width = min(columns, _WIDTHS[0])
    if width not in _WIDTHS or columns % width:
        raise ValueError(f"{columns} cases are none of 1, 2, 4 or a multiple of 8")
    flat = np.ascontiguousarray(u).reshape(-1)

    def some(first: int, last: int) -> Array:
        out = np.zeros(2 * columns)
        for column in range(0, columns, width):
            _ENERGY[width](
                first, last, tets, curved, points, flat, *constants[1:], free, *quadrature, column, columns, out
            )
        return out

    total = np.zeros(2 * columns)
    for part in run(some, ranges(tets.shape[0]), threads):
        total += part
    return total[:columns] / (2.0 * E), total[columns:]
