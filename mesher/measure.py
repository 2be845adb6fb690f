"""Length, area and volume of curved second-order simplices, by quadrature."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from mesher.numbering import TRI_EDGES

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


def simplex_rule(dimension: int, points: int) -> tuple[Floats, Floats]:
    """Conical product of Gauss rules on the reference triangle or tetrahedron.

    Returns the points (dimension, points^dimension) and weights; exact to degree ``2 points - dimension``.
    """
    x, w = np.polynomial.legendre.leggauss(points)
    x, w = (x + 1.0) / 2.0, w / 2.0
    if dimension == 2:
        u, v = (a.ravel() for a in np.meshgrid(x, x, indexing="ij"))
        return np.array([u, (1 - u) * v]), np.outer(w, w).ravel() * (1 - u)
    u, v, s = (a.ravel() for a in np.meshgrid(x, x, x, indexing="ij"))
    weights = np.einsum("i,j,k->ijk", w, w, w).ravel() * (1 - u) ** 2 * (1 - v)
    return np.array([u, (1 - u) * v, (1 - u) * (1 - v) * s]), weights


def triangle_gradients(X: Floats) -> Floats:
    """Derivatives of the six shape functions (corners, 01, 12, 02) at X (2, q): (6, 2, q)."""
    x, y = X
    o = np.zeros_like(x)
    return np.array(
        [
            [4 * x + 4 * y - 3, 4 * x + 4 * y - 3],
            [4 * x - 1, o],
            [o, 4 * y - 1],
            [4 - 8 * x - 4 * y, -4 * x],
            [4 * y, 4 * x],
            [-4 * y, 4 - 4 * x - 8 * y],
        ]
    )


def tetrahedron_gradients(X: Floats) -> Floats:
    """Derivatives of the ten shape functions (corners, 01, 12, 02, 03, 13, 23) at X (3, q): (10, 3, q)."""
    x, y, z = X
    o = np.zeros_like(x)
    first = 4 * (x + y + z) - 3
    return np.array(
        [
            [first, first, first],
            [4 * x - 1, o, o],
            [o, 4 * y - 1, o],
            [o, o, 4 * z - 1],
            [4 - 8 * x - 4 * y - 4 * z, -4 * x, -4 * x],
            [4 * y, 4 * x, o],
            [-4 * y, 4 - 4 * x - 8 * y - 4 * z, -4 * y],
            [-4 * z, -4 * z, 4 - 4 * x - 4 * y - 8 * z],
            [4 * z, o, 4 * x],
            [o, 4 * z, 4 * y],
        ]
    )


def facet_areas(nodes: Floats, facets: Ints, points: int = 6) -> Floats:
    """(k,) areas of curved triangles in space, mm^2; `points` along each way. `nodes` (3, n), `facets` (6, k)."""
    at = np.ascontiguousarray(nodes.T[facets.T].transpose(2, 0, 1))
    bow = [at[:, :, 3 + k] - 0.5 * (at[:, :, a] + at[:, :, b]) for k, (a, b) in enumerate(TRI_EDGES)]
    curved = (np.abs(bow) > 1e-12 * np.abs(nodes).max()).any(axis=(0, 1))
    areas = np.empty(facets.shape[1])
    for which, count in ((~curved, 1), (curved, points)):  # one point is exact for a straight one
        X, w = simplex_rule(2, count)
        slopes = triangle_gradients(X)
        s, t = (at[:, which] @ slopes[:, d] for d in range(2))
        normals = (s[1] * t[2] - s[2] * t[1], s[2] * t[0] - s[0] * t[2], s[0] * t[1] - s[1] * t[0])
        areas[which] = np.sqrt(normals[0] ** 2 + normals[1] ** 2 + normals[2] ** 2) @ w
    return areas


def triangle_areas(nodes: Floats, tris: Ints) -> Floats:
    """(m,) signed areas of curved plane triangles, mm^2. `nodes` (2, n), `tris` (6, m). Exact."""
    X, w = simplex_rule(2, 2)
    F = np.einsum("cim,idq->cdmq", nodes[:, tris], triangle_gradients(X))
    return (F[0, 0] * F[1, 1] - F[0, 1] * F[1, 0]) @ w


def tetrahedron_volumes(nodes: Floats, tets: Ints) -> Floats:
    """(m,) signed volumes of curved tetrahedra, mm^3. `nodes` (3, n), `tets` (10, m). Exact."""
    X, w = simplex_rule(3, 3)
    slopes = tetrahedron_gradients(X)
    at = np.ascontiguousarray(nodes.T[tets.T].transpose(2, 0, 1))
    a, b, c = (at @ slopes[:, d] for d in range(3))
    determinant = (
        a[0] * (b[1] * c[2] - b[2] * c[1]) + a[1] * (b[2] * c[0] - b[0] * c[2]) + a[2] * (b[0] * c[1] - b[1] * c[0])
    )
    return np.asarray(determinant @ w)
