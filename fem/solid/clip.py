"""Facets divided into smaller triangles, and the part of them that lies beyond planes, in barycentric coordinates."""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import NDArray

from fem.solid.kernels.clipping import clip_facets
from fem.solid.shape import Array, triangle_quadrature, triangle_values


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


@cache
def _divided(levels: int) -> tuple[Array, Array]:
    """(t, 3, 3) corners of the smaller triangles and (t, 3, 6) the shape functions there."""
    corners = np.ascontiguousarray(smaller_triangles(levels))
    return corners, np.ascontiguousarray(triangle_values(corners.reshape(-1, 3).T).T.reshape(-1, 3, 6))


def clip_beyond(distances: Array, order: int, levels: int = 0) -> tuple[NDArray[np.int64], Array, Array]:
    """Quadrature on the part of facets where every distance is >= 0.

    Parameters
    ----------
    distances
        (p, 6, k) of the facets' nodes from p planes. They are taken as linear in each of the 4 ** levels triangles into
        which a facet is divided: with levels 0 those of the corners count alone.

    Returns
    -------
    owner
        (s,) facet of each point.
    bary
        (3, s) its barycentric coordinates.
    weights
        (s,) reference weight (whole facet: 1/2); to be multiplied by the Jacobian.
    """
    owner, parts = clip_facets(*_divided(levels), distances)
    L, w = triangle_quadrature(order)
    bary = np.matmul(parts.transpose(2, 0, 1), L).reshape(3, -1)
    weights = (np.abs(np.linalg.det(parts))[:, None] * w).ravel()
    return np.repeat(owner, w.size), bary, weights
