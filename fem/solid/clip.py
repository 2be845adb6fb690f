"""Quadrature on the part of elements and facets that lies beyond a plane, in barycentric coordinates.

A linear simplex with one corner beyond the plane leaves a smaller simplex there; with all but one beyond, the whole
less a smaller one; a tetrahedron with two beyond leaves a wedge of three tetrahedra.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import NDArray

from fem.solid.shape import Array, tet_quadrature, triangle_quadrature


def _meet(distance: Array, i: int, j: int) -> Array:
    """(k, d) point of the edge from corner i to corner j on the plane."""
    t = (distance[:, i] / (distance[:, i] - distance[:, j]))[:, None]
    eye = np.eye(distance.shape[1])
    return eye[i] * (1 - t) + eye[j] * t


def clip_beyond(distance: Array, order: int) -> tuple[NDArray[np.int64], Array, Array]:
    """Quadrature on the part with distance >= 0.

    Parameters
    ----------
    distance
        (k, d) distance of the corners from the plane, d = 3 (triangles) or 4 (tetrahedra).

    Returns
    -------
    owner
        (p,) simplex of each point.
    bary
        (d, p) its barycentric coordinates.
    weights
        (p,) reference weight (whole simplex: 1/2 or 1/6); to be multiplied by the Jacobian. Some are negative.
    """
    size = distance.shape[1]
    beyond = distance >= 0
    count = beyond.sum(axis=1)
    parts: list[tuple[NDArray[np.int64], Array, float]] = []
    whole = np.flatnonzero(count == size)
    parts.append((whole, np.broadcast_to(np.eye(size), (whole.size, size, size)), 1.0))
    for lone in range(size):
        for want, sign in ((1, 1.0), (size - 1, -1.0)):
            here = np.flatnonzero((count == want) & (beyond[:, lone] == (want == 1)))
            if not here.size:
                continue
            corner = np.broadcast_to(np.eye(size)[lone], (here.size, size))
            rest = [_meet(distance[here], lone, j) for j in range(size) if j != lone]
            small = np.stack([corner, *rest], axis=1)
            if sign < 0:
                parts.append((here, np.broadcast_to(np.eye(size), (here.size, size, size)), 1.0))
            parts.append((here, small, sign))
    if size == 4:
        for a, b in ((0, 1), (0, 2), (0, 3), (1, 2), (1, 3), (2, 3)):
            here = np.flatnonzero((count == 2) & beyond[:, a] & beyond[:, b])
            if not here.size:
                continue
            c, d = (i for i in range(4) if i not in (a, b))
            A, B = (np.broadcast_to(np.eye(4)[i], (here.size, 4)) for i in (a, b))
            ac, ad, bc, bd = (_meet(distance[here], i, j) for i, j in ((a, c), (a, d), (b, c), (b, d)))
            for wedge in ((A, B, bc, bd), (A, ac, bc, bd), (A, ac, ad, bd)):
                parts.append((here, np.stack(wedge, axis=1), 1.0))
    L, w = (tet_quadrature if size == 4 else triangle_quadrature)(order)
    owner = np.concatenate([here for here, _, _ in parts])
    corners = np.concatenate([corners for _, corners, _ in parts])
    content = np.repeat([sign for _, _, sign in parts], [here.size for here, _, _ in parts])
    content[whole.size :] *= np.abs(np.linalg.det(corners[whole.size :]))
    bary = np.matmul(corners.transpose(2, 0, 1), L).reshape(size, -1)
    return np.repeat(owner, w.size), bary, (content[:, None] * w).ravel()


@cache
def smaller_triangles(levels: int) -> Array:
    """(4 ** levels, 3, 3) barycentric corners of the smaller triangles: [child, corner, coordinate]."""
    triangles = np.eye(3)[None]
    for _ in range(levels):
        a, b, c = triangles.transpose(1, 0, 2)
        ab, bc, ac = (a + b) / 2, (b + c) / 2, (a + c) / 2
        parts = ((a, ab, ac), (ab, b, bc), (ac, bc, c), (ab, bc, ac))
        triangles = np.concatenate([np.stack(p, axis=1) for p in parts])
    return triangles
