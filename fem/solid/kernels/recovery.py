"""Stress of displacement fields: at points of the elements, averaged at the nodes, and its principal values."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.jacobian import inverse_jacobian
from fem.solid.kernels.jit import kernel
from fem.solid.kernels.parallel import ranges, run
from fem.solid.shape import Array

Int = NDArray[np.int32]


@kernel
def _stress(u, tets, e, slopes, C, lam, mu, free, D, s):  # type: ignore[no-untyped-def]
    """Stress s (c, 6) of displacements u (n, c, 3) in element e, where `inverse_jacobian` gave C; D is scratch."""
    for k in range(s.shape[0]):
        D[:, :] = 0.0
        for a in range(10):
            node = tets[e, a]
            for i in range(3):
                x = u[node, k, i]
                for j in range(3):
                    D[i, j] += x * slopes[a, j]
        xx = D[0, 0] * C[0, 0] + D[0, 1] * C[0, 1] + D[0, 2] * C[0, 2]
        xy = D[0, 0] * C[1, 0] + D[0, 1] * C[1, 1] + D[0, 2] * C[1, 2]
        xz = D[0, 0] * C[2, 0] + D[0, 1] * C[2, 1] + D[0, 2] * C[2, 2]
        yx = D[1, 0] * C[0, 0] + D[1, 1] * C[0, 1] + D[1, 2] * C[0, 2]
        yy = D[1, 0] * C[1, 0] + D[1, 1] * C[1, 1] + D[1, 2] * C[1, 2]
        yz = D[1, 0] * C[2, 0] + D[1, 1] * C[2, 1] + D[1, 2] * C[2, 2]
        zx = D[2, 0] * C[0, 0] + D[2, 1] * C[0, 1] + D[2, 2] * C[0, 2]
        zy = D[2, 0] * C[1, 0] + D[2, 1] * C[1, 1] + D[2, 2] * C[1, 2]
        zz = D[2, 0] * C[2, 0] + D[2, 1] * C[2, 1] + D[2, 2] * C[2, 2]
        normal = lam * (xx + yy + zz) - free[k]
        s[k, 0], s[k, 1], s[k, 2] = normal + 2 * mu * xx, normal + 2 * mu * yy, normal + 2 * mu * zz
        s[k, 3], s[k, 4], s[k, 5] = mu * (xy + yx), mu * (yz + zy), mu * (zx + xz)


@kernel
def _volumes(first, last, points, tets, slopes, out):  # type: ignore[no-untyped-def]
    """Mean determinant at the corners, six times the volume of a straight element."""
    J, C = np.empty((3, 3)), np.empty((3, 3))
    for e in range(first, last):
        out[e] = 0.0
        for a in range(4):
            out[e] += 0.25 * inverse_jacobian(points, tets, e, slopes[a], J, C)


@kernel
def _node_stress(  # type: ignore[no-untyped-def]
    first, last, points, tets, slopes, volumes, u, lam, mu, free, starts, places, mean, spread
):
    """Volume-weighted mean (n, c, 6) of the elements' stresses at the nodes first to last, and the root mean square
    of the von Mises stress of what they differ by (n, c)."""
    most = 0
    for i in range(first, last):
        most = max(most, starts[i + 1] - starts[i])
    cases = u.shape[1]
    s, J, C, D = np.empty((most, cases, 6)), np.empty((3, 3)), np.empty((3, 3)), np.empty((3, 3))
    for i in range(first, last):
        count = starts[i + 1] - starts[i]
        total = 0.0
        mean[i] = 0.0
        for n in range(count):
            e = places[starts[i] + n] // 10
            a = places[starts[i] + n] - 10 * e
            inverse_jacobian(points, tets, e, slopes[a], J, C)
            _stress(u, tets, e, slopes[a], C, lam, mu, free, D, s[n])
            total += volumes[e]
            for k in range(cases):
                for c in range(6):
                    mean[i, k, c] += volumes[e] * s[n, k, c]
        for k in range(cases):
            for c in range(6):
                mean[i, k, c] /= total
            square = 0.0
            for n in range(count):
                e = places[starts[i] + n] // 10
                xx, yy, zz = s[n, k, 0] - mean[i, k, 0], s[n, k, 1] - mean[i, k, 1], s[n, k, 2] - mean[i, k, 2]
                xy, yz, zx = s[n, k, 3] - mean[i, k, 3], s[n, k, 4] - mean[i, k, 4], s[n, k, 5] - mean[i, k, 5]
                normal = 0.5 * ((xx - yy) ** 2 + (yy - zz) ** 2 + (zz - xx) ** 2)
                square += volumes[e] * (normal + 3.0 * (xy * xy + yz * yz + zx * zx))
            spread[i, k] = np.sqrt(square / total)


@kernel
def _deviation_energy(  # type: ignore[no-untyped-def]
    first, last, points, tets, slopes, volumes, u, lam, mu, free, nu, mean, out
):
    """Add twice E times the energy of (elements' stress - mean), taken as linear, of elements first to last to (c,).

    The square of a linear field over a tetrahedron of volume V: V / 20 (sum of the corners' squares + square of the
    sum).
    """
    cases = u.shape[1]
    s, J, C, D = np.empty((5, cases, 6)), np.empty((3, 3)), np.empty((3, 3)), np.empty((3, 3))
    for e in range(first, last):
        s[4] = 0.0
        for a in range(4):
            inverse_jacobian(points, tets, e, slopes[a], J, C)
            _stress(u, tets, e, slopes[a], C, lam, mu, free, D, s[a])
            for k in range(cases):
                for c in range(6):
                    s[a, k, c] -= mean[tets[e, a], k, c]
                    s[4, k, c] += s[a, k, c]
        for k in range(cases):
            form = 0.0
            for a in range(5):
                xx, yy, zz = s[a, k, 0], s[a, k, 1], s[a, k, 2]
                shear = s[a, k, 3] ** 2 + s[a, k, 4] ** 2 + s[a, k, 5] ** 2
                form += (1.0 + nu) * (xx * xx + yy * yy + zz * zz + 2.0 * shear) - nu * (xx + yy + zz) ** 2
            out[k] += volumes[e] / 120.0 * form


@kernel
def _point_stress(first, last, elements, curved, points, tets, slopes, u, lam, mu, free, out):  # type: ignore[no-untyped-def]
    """Stress out (c, k, 6, q) at the points of the slopes (q, 10, 3)."""
    cases = u.shape[1]
    s, J, C, D = np.empty((cases, 6)), np.empty((3, 3)), np.empty((3, 3)), np.empty((3, 3))
    for n in range(first, last):
        e = np.int64(elements[n])
        for q in range(slopes.shape[0]):
            if q == 0 or curved:
                inverse_jacobian(points, tets, e, slopes[q], J, C)
            _stress(u, tets, e, slopes[q], C, lam, mu, free, D, s)
            for k in range(cases):
                for c in range(6):
                    out[k, n, c, q] = s[k, c]


@kernel
def _principal(first, last, s, out):  # type: ignore[no-untyped-def]
    """Eigenvalues of symmetric 3 x 3 tensors s (6, n), greatest first, out (3, n): cyclic Jacobi rotations."""
    A = np.empty((3, 3))
    for n in range(first, last):
        for p in range(3):
            A[p, p] = s[p, n]
            q = (p + 1) % 3
            A[p, q] = s[3 + p, n]
            A[q, p] = s[3 + p, n]
        for _ in range(30):
            off = abs(A[0, 1]) + abs(A[0, 2]) + abs(A[1, 2])
            if not off > 1e-17 * (abs(A[0, 0]) + abs(A[1, 1]) + abs(A[2, 2])):
                break
            for p in range(2):
                for q in range(p + 1, 3):
                    x, r = A[p, q], 3 - p - q
                    if x == 0.0:
                        continue
                    half = (A[q, q] - A[p, p]) / (2.0 * x)
                    t = 1.0 / (abs(half) + np.sqrt(half * half + 1.0))
                    if half < 0.0:
                        t = -t
                    c = 1.0 / np.sqrt(t * t + 1.0)
                    u, v = c * (A[p, r] - t * A[q, r]), c * (t * A[p, r] + A[q, r])
                    A[p, p] -= t * x
                    A[q, q] += t * x
                    A[p, q], A[q, p] = 0.0, 0.0
                    A[p, r], A[r, p], A[q, r], A[r, q] = u, u, v, v
        a, b, c = A[0, 0], A[1, 1], A[2, 2]
        high, low = max(a, max(b, c)), min(a, min(b, c))
        out[0, n], out[1, n], out[2, n] = high, max(min(a, b), min(max(a, b), c)), low


def nodal_stress(
    points: Array,
    tets: Int,
    incident: tuple[Int, Int],
    slopes: Array,
    u: Array,
    constants: tuple[float, float, float, float],
    free: Array,
    threads: int,
) -> tuple[Array, Array, Array]:
    """Means (n, c, 6) and spreads (n, c) at the nodes, MPa, and energies (c,) of the elements' difference, N mm.

    slopes (10, 10, 3) at the nodes of an element; u (n, c, 3); constants lambda, mu, E, nu; free (c,) stress that
    the free expansion takes off.
    """
    lam, mu, E, nu = constants
    n, cases = u.shape[:2]
    volumes = np.empty(tets.shape[0])
    elements = ranges(tets.shape[0])
    run(lambda a, b: _volumes(a, b, points, tets, slopes, volumes), elements, threads)
    mean, spread = np.empty((n, cases, 6)), np.empty((n, cases))
    args = (points, tets, slopes, volumes, u, lam, mu, free)
    run(lambda a, b: _node_stress(a, b, *args, *incident, mean, spread), ranges(n), threads)

    def energy(first: int, last: int) -> Array:
        out = np.zeros(cases)
        _deviation_energy(first, last, *args, nu, mean, out)
        return out

    total = np.zeros(cases)
    for part in run(energy, elements, threads):
        total += part
    return mean, spread, total / (2.0 * E)


def point_stress(
    points: Array,
    tets: Int,
    elements: Int,
    curved: bool,
    slopes: Array,
    u: Array,
    constants: tuple[float, float],
    free: Array,
    threads: int,
) -> Array:
    """(c, k, 6, q) stress of `elements` at the points of the slopes (q, 10, 3); see `nodal_stress`."""
    out = np.empty((u.shape[1], elements.size, 6, slopes.shape[0]))
    args = (elements, curved, points, tets, slopes, u, *constants, free, out)
    run(lambda a, b: _point_stress(a, b, *args), ranges(elements.size), threads)
    return out


def principal(s: Array, threads: int) -> Array:
    """(3, n) eigenvalues, greatest first, of the tensors (6, n)."""
    out = np.empty((3, s.shape[1]))
    run(lambda a, b: _principal(a, b, s, out), ranges(s.shape[1]), threads)
    return out
