"""Quality of curved 10-node tetrahedra.

The Jacobian determinant of such an element is a cubic polynomial, so its 20 Bezier coefficients bound it from
below (Johnen, Remacle, Geuzaine, J. Comput. Phys. 233 (2013) 359-372). An element is called valid only when
that bound is positive.
"""

from __future__ import annotations

from functools import cache
from math import factorial

import numpy as np
from numpy.typing import NDArray

from mesher.measure import tetrahedron_gradients
from mesher.numbering import TET_EDGES

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]

_CORNER_EDGES = ((0, 2, 3), (0, 1, 4), (1, 2, 5), (3, 4, 5))
"""The three edges (in the order of `TET_EDGES`) that meet at each corner."""


@cache
def _lattice() -> tuple[Floats, Floats]:
    """The 20 points of the cubic lattice, (3, 20), and the matrix from values there to Bezier coefficients."""
    powers = [(i, j, k, 3 - i - j - k) for i in range(4) for j in range(4 - i) for k in range(4 - i - j)]
    points = np.array([p[:3] for p in powers]).T / 3.0
    barycentric = np.array([*points, 1 - points.sum(axis=0)])
    bernstein = np.array(
        [
            factorial(3) / np.prod([factorial(n) for n in p]) * np.prod(barycentric.T ** np.array(p), axis=1)
            for p in powers
        ]
    )
    return points, np.linalg.inv(bernstein)


def quality_and_volume(nodes: Floats, tets: Ints, chunk: int = 20000) -> tuple[Floats, Floats]:
    """(m,) least scaled Jacobian (see `scaled_jacobian`) and (m,) signed volume, mm^3, of each element; both exact."""
    parts = [_measured(nodes, tets[:, i : i + chunk]) for i in range(0, tets.shape[1], chunk)]
    quality, volume = (np.concatenate(p) for p in zip(*parts, strict=True)) if parts else (np.empty(0), np.empty(0))
    return quality, volume


def _measured(nodes: Floats, tets: Ints) -> tuple[Floats, Floats]:
    """Straight elements have one Jacobian; only curved ones are looked at in twenty points."""
    at = np.ascontiguousarray(nodes.T[tets.T].transpose(2, 0, 1))  # (3, m, 10)
    bow = [at[:, :, 4 + k] - 0.5 * (at[:, :, a] + at[:, :, b]) for k, (a, b) in enumerate(TET_EDGES)]
    curved = (np.abs(bow) > 1e-12 * np.abs(nodes).max()).any(axis=(0, 1))
    quality, volume = np.empty(tets.shape[1]), np.empty(tets.shape[1])
    for which, points in ((~curved, np.full((3, 1), 0.25)), (curved, _lattice()[0])):
        quality[which], volume[which] = _jacobians(at[:, which], points)
    return quality, volume


def scaled_jacobian(nodes: Floats, tets: Ints) -> Floats:
    """(m,) least scaled Jacobian of each curved element: 1 for the regular one, <= 0 when it may be inverted.

    At each of the 20 lattice points the determinant is divided by the largest product of three edge lengths
    that meet at a corner of the tangent element there, times sqrt 2; the least value is returned. Where the
    Bezier bound is not positive, the bound (scaled alike) is returned instead, so that no inverted element passes
    between the points. `nodes` (3, n), `tets` (10, m).
    """
    return quality_and_volume(nodes, tets)[0]


def _jacobians(at: Floats, X: Floats) -> tuple[Floats, Floats]:
    """Of elements with nodes `at` (3, m, 10), from one point `X` of straight ones or from all points of the lattice."""
    slopes = tetrahedron_gradients(X)
    F = [at @ slopes[:, d] for d in range(3)]  # each (3, m, q)
    determinant = (
        F[0][0] * (F[1][1] * F[2][2] - F[1][2] * F[2][1])
        + F[0][1] * (F[1][2] * F[2][0] - F[1][0] * F[2][2])
        + F[0][2] * (F[1][0] * F[2][1] - F[1][1] * F[2][0])
    )
    squares = []
    for a, b in TET_EDGES:  # corner k > 0 lies on axis k - 1 of the reference element
        edge = F[b - 1] if a == 0 else F[b - 1] - F[a - 1]
        squares.append(edge[0] * edge[0] + edge[1] * edge[1] + edge[2] * edge[2])
    products = [squares[i] * squares[j] * squares[k] for i, j, k in _CORNER_EDGES]
    scale = np.sqrt(np.maximum(np.maximum(products[0], products[1]), np.maximum(products[2], products[3])))
    least = np.min(np.sqrt(2.0) * determinant / scale, axis=1)
    if X.shape[1] == 1:
        return least, determinant[:, 0] / 6.0
    bezier = determinant @ _lattice()[1]
    bound = np.min(bezier, axis=1) * np.sqrt(2.0) / scale.mean(axis=1)
    # The integral of a polynomial is the mean of its Bezier coefficients times the volume of the reference element.
    return np.where(bound > 0, least, np.minimum(least, bound)), bezier.mean(axis=1) / 6.0
