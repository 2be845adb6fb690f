"""The map from the reference tetrahedron: inverse Jacobians, curved elements, integrals of the shape functions."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import TET_EDGES, Array

Int = NDArray[np.int32]
_EDGES = TET_EDGES.astype(np.int32)
_AT_ONCE = 16384


@kernel
def inverse_jacobian(points, tets, e, slopes, J, C):  # type: ignore[no-untyped-def]
    """C[i, j] = dxi_j / dx_i where the slopes dN_a/dxi_j (10, 3) are taken; the determinant. J is scratch."""
    J[:, :] = 0.0
    for a in range(10):
        node = tets[e, a]
        for i in range(3):
            x = points[node, i]
            for j in range(3):
                J[i, j] += x * slopes[a, j]
    C[0, 0] = J[1, 1] * J[2, 2] - J[1, 2] * J[2, 1]
    C[0, 1] = J[1, 2] * J[2, 0] - J[1, 0] * J[2, 2]
    C[0, 2] = J[1, 0] * J[2, 1] - J[1, 1] * J[2, 0]
    C[1, 0] = J[2, 1] * J[0, 2] - J[2, 2] * J[0, 1]
    C[1, 1] = J[2, 2] * J[0, 0] - J[2, 0] * J[0, 2]
    C[1, 2] = J[2, 0] * J[0, 1] - J[2, 1] * J[0, 0]
    C[2, 0] = J[0, 1] * J[1, 2] - J[0, 2] * J[1, 1]
    C[2, 1] = J[0, 2] * J[1, 0] - J[0, 0] * J[1, 2]
    C[2, 2] = J[0, 0] * J[1, 1] - J[0, 1] * J[1, 0]
    det = J[0, 0] * C[0, 0] + J[0, 1] * C[0, 1] + J[0, 2] * C[0, 2]
    s = 1.0 / det
    for i in range(3):
        for j in range(3):
            C[i, j] *= s
    return det


@kernel
def barycentric_gradients(points, tets, e, g):  # type: ignore[no-untyped-def]
    """Gradients (4, 3) of L_0 to L_3 in a straight element; the determinant, six times the volume."""
    o, p, q, r = tets[e, 0], tets[e, 1], tets[e, 2], tets[e, 3]
    ax, ay, az = points[p, 0] - points[o, 0], points[p, 1] - points[o, 1], points[p, 2] - points[o, 2]
    bx, by, bz = points[q, 0] - points[o, 0], points[q, 1] - points[o, 1], points[q, 2] - points[o, 2]
    cx, cy, cz = points[r, 0] - points[o, 0], points[r, 1] - points[o, 1], points[r, 2] - points[o, 2]
    ux, uy, uz = by * cz - bz * cy, bz * cx - bx * cz, bx * cy - by * cx
    vx, vy, vz = cy * az - cz * ay, cz * ax - cx * az, cx * ay - cy * ax
    wx, wy, wz = ay * bz - az * by, az * bx - ax * bz, ax * by - ay * bx
    det = ax * ux + ay * uy + az * uz
    s = 1.0 / det
    g[1, 0], g[1, 1], g[1, 2] = s * ux, s * uy, s * uz
    g[2, 0], g[2, 1], g[2, 2] = s * vx, s * vy, s * vz
    g[3, 0], g[3, 1], g[3, 2] = s * wx, s * wy, s * wz
    for k in range(3):
        g[0, k] = -(g[1, k] + g[2, k] + g[3, k])
    return det


@kernel
def _classify(first, last, points, tets, edges, slopes, tolerance, curved, least):  # type: ignore[no-untyped-def]
    """Whether a mid-edge node leaves the middle of its edge, and the least determinant at the slopes' points."""
    J, C, g = np.empty((3, 3)), np.empty((3, 3)), np.empty((4, 3))
    for e in range(first, last):
        curved[e] = False
        for k in range(6):
            p, q, middle = tets[e, edges[k, 0]], tets[e, edges[k, 1]], tets[e, 4 + k]
            off, size = 0.0, 0.0
            for i in range(3):
                off += (points[middle, i] - 0.5 * (points[p, i] + points[q, i])) ** 2
                size += (points[q, i] - points[p, i]) ** 2
            if off > tolerance * tolerance * size:
                curved[e] = True
        least[e] = barycentric_gradients(points, tets, e, g)
        if curved[e]:
            least[e] = np.inf
            for q in range(slopes.shape[0]):
                det = inverse_jacobian(points, tets, e, slopes[q], J, C)
                if not det >= least[e]:  # also where it is not a number
                    least[e] = det


@kernel
def _integrals(first, last, elements, points, tets, values, slopes, weights, out):  # type: ignore[no-untyped-def]
    """int N_a dV and int dN_a/dx_i dV of each element: out (k, 10, 4)."""
    J, C = np.empty((3, 3)), np.empty((3, 3))
    for n in range(first, last):
        e = np.int64(elements[n])
        out[n] = 0.0
        for q in range(weights.size):
            w = weights[q] * inverse_jacobian(points, tets, e, slopes[q], J, C)
            for a in range(10):
                out[n, a, 0] += w * values[q, a]
                u, v, t = w * slopes[q, a, 0], w * slopes[q, a, 1], w * slopes[q, a, 2]
                for i in range(3):
                    out[n, a, 1 + i] += C[i, 0] * u + C[i, 1] * v + C[i, 2] * t


@kernel
def _add_to_nodes(elements, tets, values, out):  # type: ignore[no-untyped-def]
    for n in range(elements.size):
        for a in range(10):
            for k in range(out.shape[1]):
                out[tets[elements[n], a], k] += values[n, a, k]


def classify(
    points: Array, tets: Int, slopes: Array, tolerance: float, threads: int
) -> tuple[NDArray[np.bool_], Array]:
    """curved (m,) and the least Jacobian determinant (m,) mm^3: of a curved element at the slopes (q, 10, 3)."""
    curved, least = np.empty(tets.shape[0], dtype=np.bool_), np.empty(tets.shape[0])
    args = (points, tets, _EDGES, slopes, tolerance, curved, least)
    run(lambda a, b: _classify(a, b, *args), ranges(tets.shape[0]), threads)
    return curved, least


def shape_integrals(
    points: Array, tets: Int, elements: Int, rule: tuple[Array, Array, Array], out: Array, threads: int
) -> None:
    """Add int N_a dV and int dN_a/dx_i dV of curved `elements` to the nodes: out (n, 4). rule: values (q, 10), slopes
    (q, 10, 3), weights (q,)."""
    for begin in range(0, elements.size, _AT_ONCE):
        some = elements[begin : begin + _AT_ONCE]
        values = np.empty((some.size, 10, 4))
        args = (some, points, tets, *rule, values)
        run(lambda a, b, args=args: _integrals(a, b, *args), ranges(some.size), threads)  # type: ignore[misc]
        _add_to_nodes(some, tets, values, out)
