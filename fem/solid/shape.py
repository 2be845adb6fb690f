"""Quadratic shape functions of the 10-node tetrahedron and the 6-node triangle, and their quadrature.

Barycentric coordinates are used throughout: (4, q) in a tetrahedron, (3, q) in a triangle. Node order is that
of `mesher.named_mesh.NamedMesh`.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import NDArray
from skfem.element import ElementTetP2, ElementTriP2
from skfem.quadrature import get_quadrature

Array = NDArray[np.float64]

TET_EDGES = np.array([[0, 1], [1, 2], [0, 2], [0, 3], [1, 3], [2, 3]])
"""Corners at the ends of the edge that carries local node 4 + i."""
TRIANGLE_EDGES = np.array([[0, 1], [1, 2], [0, 2]])
"""Corners at the ends of the edge that carries local node 3 + i."""

NODE_BARY = np.vstack([np.eye(4), (np.eye(4)[TET_EDGES[:, 0]] + np.eye(4)[TET_EDGES[:, 1]]) / 2]).T
"""(4, 10) barycentric coordinates of an element's nodes."""
CURVED_TOLERANCE = 1e-10
"""An element is straight when its mid-edge nodes are off the middle by no more than this part of the edge."""

# rows: d L_k / d xi_j of the reference element
_TET_GRADIENT = np.array([[-1.0, -1.0, -1.0], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]])
_TRIANGLE_GRADIENT = np.array([[-1.0, -1.0], [1.0, 0.0], [0.0, 1.0]])


def _values(L: Array, edges: NDArray[np.int64]) -> Array:
    return np.vstack([L * (2.0 * L - 1.0), 4.0 * L[edges[:, 0]] * L[edges[:, 1]]])


def _gradients(L: Array, edges: NDArray[np.int64], dL: Array) -> Array:
    corner = (4.0 * L - 1.0)[:, None, :] * dL[:, :, None]
    i, j = edges.T
    middle = 4.0 * (L[i][:, None, :] * dL[j][:, :, None] + L[j][:, None, :] * dL[i][:, :, None])
    return np.concatenate([corner, middle])


def tet_values(L: Array) -> Array:
    """(10, q) shape functions at barycentric points L (4, q)."""
    return _values(L, TET_EDGES)


def tet_gradients(L: Array) -> Array:
    """(10, 3, q) derivatives in the reference coordinates xi_j = L_(j+1)."""
    return _gradients(L, TET_EDGES, _TET_GRADIENT)


def triangle_values(L: Array) -> Array:
    """(6, q) shape functions at barycentric points L (3, q)."""
    return _values(L, TRIANGLE_EDGES)


def triangle_gradients(L: Array) -> Array:
    """(6, 2, q) derivatives in the reference coordinates."""
    return _gradients(L, TRIANGLE_EDGES, _TRIANGLE_GRADIENT)


@cache
def tet_quadrature(order: int) -> tuple[Array, Array]:
    """Barycentric points (4, q) and weights (q,) exact to `order`; the weights sum to 1/6."""
    points, weights = get_quadrature(ElementTetP2(), order)
    return np.vstack([1.0 - points.sum(axis=0), points]), weights


@cache
def triangle_quadrature(order: int) -> tuple[Array, Array]:
    """Barycentric points (3, q) and weights (q,) exact to `order`; the weights sum to 1/2."""
    points, weights = get_quadrature(ElementTriP2(), order)
    return np.vstack([1.0 - points.sum(axis=0), points]), weights


def curved_tets(nodes: Array, tets: NDArray[np.int64], tolerance: float = CURVED_TOLERANCE) -> NDArray[np.bool_]:
    """(m,) whether a mid-edge node leaves the middle of its edge by more than `tolerance` of its length."""
    x = nodes[:, tets]
    ends = x[:, TET_EDGES]
    off = np.linalg.norm(x[:, 4:] - ends.mean(axis=2), axis=0)
    size = np.linalg.norm(ends[:, :, 1] - ends[:, :, 0], axis=0)
    return np.asarray((off > tolerance * size).any(axis=0))


def inverse(J: Array) -> tuple[Array, Array]:
    """Inverses (..., 3, 3) and determinants (...) of 3 x 3 matrices by cofactors.

    Many times faster than a factorisation of each; as accurate for the well-shaped Jacobians that a mesh may have.
    """
    J = np.moveaxis(J, (-2, -1), (0, 1))
    cofactors = np.empty_like(J, order="C")  # of J transposed
    for i, (a, b) in enumerate(((1, 2), (2, 0), (0, 1))):
        for j, (c, d) in enumerate(((1, 2), (2, 0), (0, 1))):
            cofactors[j, i] = J[a, c] * J[b, d] - J[a, d] * J[b, c]
    det = J[0, 0] * cofactors[0, 0] + J[0, 1] * cofactors[1, 0] + J[0, 2] * cofactors[2, 0]
    with np.errstate(divide="ignore", invalid="ignore"):  # the caller looks at the determinants
        cofactors /= det
    return np.moveaxis(cofactors, (0, 1), (-2, -1)), det


def facet_points(nodes: Array, facets: NDArray[np.int64], order: int = 6) -> tuple[Array, Array, Array]:
    """Quadrature on curved boundary triangles.

    Returns
    -------
    values
        (6, q) shape functions.
    points
        (3, k, q) positions, mm.
    area_normals
        (3, k, q) outward normal times the area weight, mm^2.
    """
    L, w = triangle_quadrature(order)
    N, dN = triangle_values(L), triangle_gradients(L)
    x = nodes[:, facets]
    tangents = np.einsum("iak,ajq->jikq", x, dN, optimize=True)
    normals = np.cross(tangents[0], tangents[1], axis=0) * w
    return N, np.einsum("iak,aq->ikq", x, N, optimize=True), normals
