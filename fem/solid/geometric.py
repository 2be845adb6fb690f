"""Geometric stiffness: what a stress that is there already does to further small displacements.

G_ab = int s_ij dN_a/dx_i dN_b/dx_j dV times the identity: the second variation of the work of the stress on the
quadratic part of the Green strain (Zienkiewicz, Taylor and Fox, The Finite Element Method for Solid and Structural
Mechanics; from memory). Tension stiffens: of a uniform tension every block row sums to zero and the matrix is positive.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

import numpy as np

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.elastic import CARRIERS
from fem.solid.kernels.nodal import add_geometric
from fem.solid.scalar_matrix import ScalarMatrix
from fem.solid.shape import TET_EDGES, Array, tet_quadrature
from fem.solid.stiffness import STRAIGHT_ORDER, ElementGroup, mesh_arrays, point_slopes


@cache
def _straight_factors() -> Array:
    """(4, 10, 10, 2, 2) integrals, over the volume, of a stress that is one at a point of the straight rule and zero at
    its other three, times the coefficients of two carriers (see `fem.solid.kernels.elastic`)."""
    points, _ = tet_quadrature(STRAIGHT_ORDER)
    L, w = tet_quadrature(3)
    stress = np.linalg.solve(points, L)  # linear functions from their values at the four points
    c = np.zeros((10, 2, L.shape[1]))
    for a in range(4):
        c[a, 0] = 4 * L[a] - 1
    for a, (i, j) in enumerate(TET_EDGES, start=4):
        c[a] = 4 * L[j], 4 * L[i]
    assert (CARRIERS[4:] == TET_EDGES).all()
    return np.ascontiguousarray(np.einsum("q,sq,acq,bdq->sabcd", 6 * w, stress, c, c, optimize=True))


def geometric_stiffness(groups: list[ElementGroup], stress: Sequence[Array], like: BlockMatrix) -> ScalarMatrix:
    """Geometric stiffness (3 n, 3 n), N/mm.

    Parameters
    ----------
    stress
        (m', 6, q) stress xx, yy, zz, xy, yz, zx at the points of each group, MPa: one case of
        `fem.solid.stiffness.group_stresses`. In straight elements it is linear, and the integral exact.
    like
        Stiffness of the same mesh, whose pattern and number of threads are taken over.
    """
    values = np.zeros(like.indices.size)
    points, tets = mesh_arrays(groups[0].nodes, groups[0].tets)
    for group, s in zip(groups, stress, strict=True):
        rule = (point_slopes(group.points), group.rule) if group.curved else _straight_factors()
        pattern = like.indptr, like.indices
        add_geometric(values, points, tets, group.elements.astype(np.int32), rule, s, pattern, like.threads)
    return ScalarMatrix(like.indptr, like.indices, values, like.threads)
