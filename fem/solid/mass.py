"""Consistent mass of the solid: the matrix, and the integrals of the shape functions that body forces act through."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.jacobian import shape_integrals
from fem.solid.kernels.linear import add_straight_integrals
from fem.solid.kernels.nodal import add_masses
from fem.solid.scalar_matrix import ScalarMatrix
from fem.solid.shape import Array, tet_quadrature, tet_values
from fem.solid.stiffness import ElementGroup, KernelMesh, curved_elements, mesh_arrays, point_slopes

MASS_ORDER = 6
"""Of curved elements: products of shape functions have degree 4, and the determinant of the map up to 3."""
_EXACT_ORDER = 4


def mass_matrix(groups: list[ElementGroup], density: float, like: BlockMatrix) -> ScalarMatrix:
    """Consistent mass (3 n, 3 n), t, of a density in t/mm^3; exact for straight elements.

    `like` is the stiffness of the same mesh, whose pattern and number of threads are taken over: the numbers of the one
    and the blocks of the other stand at the same places.
    """
    values = np.zeros(like.indices.size)
    points, tets = mesh_arrays(groups[0].nodes, groups[0].tets)
    for group in groups:
        L, w = tet_quadrature(MASS_ORDER if group.curved else _EXACT_ORDER)
        N = tet_values(L).T
        products, slopes = N[:, :, None] * N[:, None, :], point_slopes(L)
        if not group.curved:  # the determinant is constant: one point with the sum of them all
            products, slopes, w = np.tensordot(w, products, axes=1)[None], slopes[:1], np.ones(1)
        rule = np.ascontiguousarray(density * products), slopes, w
        pattern = like.indptr, like.indices
        add_masses(values, points, tets, group.elements.astype(np.int32), rule, pattern, like.threads)
    return ScalarMatrix(like.indptr, like.indices, values, like.threads)


def node_integrals(groups: list[ElementGroup], threads: int = 1, shared: KernelMesh | None = None) -> Array:
    """(n, 4) int N_a dV, mm^3, and int dN_a/dx_i dV, mm^2, of every node; `shared` where it is made already."""
    out = np.zeros((groups[0].nodes.shape[1], 4))
    shared = shared or KernelMesh(groups[0].nodes, groups[0].tets, threads)
    for group in groups:
        if group.curved:
            rule = np.ascontiguousarray(tet_values(group.points).T), point_slopes(group.points), group.rule
            elements = group.elements.astype(np.int32)
            shape_integrals(shared.points, shared.tets, elements, rule, out, threads)
        else:
            curved = curved_elements(groups, shared.tets.shape[0])
            add_straight_integrals(shared.gradients, curved, shared.incident, out, threads)
    return out


def node_volumes(shares: Array, nodes: Array) -> tuple[float, NDArray[np.float64]]:
    """Volume, mm^3, and its first moment (3,), mm^4, from the integrals (n,) of the shape functions: positions are
    interpolated with them."""
    return float(shares.sum()), nodes @ shares
