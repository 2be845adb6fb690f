"""Stiffness matrix, strains and internal forces of quadratic tetrahedra, isotropic linear elasticity.

The gradients g[a, i] = dN_a/dx_i at a quadrature point, taken as one vector of 30, give the element's matrix of
products P = sum_q w g g^T. Isotropic stiffness is three rearrangements of P:
K[a i, b j] = lambda P[a i, b j] + mu P[a j, b i] + mu delta_ij sum_k P[a k, b k].
Four points (order 2) are exact for a straight element, whose gradients are linear; curved elements get `CURVED_ORDER`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.shape import Array, curved_tets, inverse, tet_gradients, tet_quadrature
from geometry.problem import SolveError

CURVED_ORDER = 4
STRAIGHT_ORDER = 2
_CHUNK = 8192


@dataclass(frozen=True, slots=True)
class ElementGroup:
    """Elements integrated with one rule.

    elements (m',), gradients (m', 30, q) with row 3 a + i, weights (m', q) in mm^3.
    """

    elements: NDArray[np.int64]
    points: Array
    gradients: Array
    weights: Array


def lame(E: float, nu: float) -> tuple[float, float]:
    """Lame's lambda and mu, MPa."""
    return E * nu / ((1 + nu) * (1 - 2 * nu)), E / (2 * (1 + nu))


def element_gradients(nodes: Array, tets: NDArray[np.int64], L: Array) -> tuple[Array, Array]:
    """Global gradients (m, 30, q), row 3 a + i, and Jacobian determinants (m, q) at barycentric points L.

    Raises
    ------
    SolveError
        When an element is inverted or flat at one of the points.
    """
    dN = tet_gradients(L)
    q, m = L.shape[1], tets.shape[1]
    x = np.ascontiguousarray(nodes[:, tets].transpose(2, 0, 1))  # (m, 3, 10)
    J = (x.reshape(-1, 10) @ dN.reshape(10, -1)).reshape(m, 3, 3, q).transpose(0, 3, 1, 2)  # dx_i/dxi_j
    inverted, det = inverse(J)  # dxi_j/dx_i
    if not (det > 0).all():
        bad = np.unique(np.nonzero(~(det > 0))[0])
        raise SolveError(
            f"{bad.size} of {m} elements have no positive volume, the first one near "
            f"{np.round(x[bad[0], :, :4].mean(axis=1), 3).tolist()} mm. Mesh the part again with another recipe."
        )
    g = np.empty((m, 30, q))
    for k in range(q):
        g[:, :, k] = np.matmul(dN[:, :, k], inverted[:, k]).reshape(m, 30)
    return g, det


def element_groups(nodes: Array, tets: NDArray[np.int64]) -> list[ElementGroup]:
    """Straight and curved elements with their gradients and weights."""
    curved = curved_tets(nodes, tets)
    groups = []
    for which, order in ((~curved, STRAIGHT_ORDER), (curved, CURVED_ORDER)):
        elements = np.flatnonzero(which)
        if elements.size:
            L, w = tet_quadrature(order)
            gradients, det = element_gradients(nodes, tets[:, elements], L)
            groups.append(ElementGroup(elements, L, gradients, det * w))
    return groups


class NodePattern:
    """Block sparsity pattern of the nodes: where the 3 x 3 block of each pair of an element's nodes is added."""

    def __init__(self, tets: NDArray[np.int64], node_count: int) -> None:
        rows = np.repeat(tets, 10, axis=0).T
        columns = np.tile(tets, (10, 1)).T
        keys = (rows * node_count + columns).ravel()
        unique, self.slots = np.unique(keys, return_inverse=True)
        self.indices = (unique % node_count).astype(np.int32)
        counts = np.bincount(unique // node_count, minlength=node_count)
        self.indptr = np.concatenate([[0], np.cumsum(counts)]).astype(np.int32)
        self.node_count = node_count

    def assemble(self, element_matrices: Array, elements: NDArray[np.int64]) -> Array:
        """(blocks, 3, 3) sums of element matrices (3, 3, m', 10, 10) of `elements`."""
        slots = self.slots.reshape(-1, 100)[elements].ravel()
        blocks = np.empty((self.indices.size, 3, 3))
        for i in range(3):
            for j in range(3):
                values = element_matrices[i, j].ravel()
                blocks[:, i, j] = np.bincount(slots, weights=values, minlength=self.indices.size)
        return blocks

    def matrix(self, blocks: Array) -> sp.csr_matrix:
        """(3 n, 3 n) matrix, unknown 3 node + direction."""
        size = 3 * self.node_count
        return sp.bsr_matrix((blocks, self.indices, self.indptr), shape=(size, size)).tocsr()


def element_stiffness(gradients: Array, weights: Array, E: float, nu: float) -> Array:
    """(3, 3, m, 10, 10) element matrices, N/mm: directions first, then element and its two nodes."""
    lam, mu = lame(E, nu)
    m, _, q = gradients.shape
    g = np.ascontiguousarray(gradients.reshape(m, 10, 3, q).transpose(2, 0, 1, 3))  # (3, m, 10, q)
    weighted = g * weights[:, None, :]
    K = np.empty((3, 3, m, 10, 10))
    trace = np.zeros((m, 10, 10))
    for i in range(3):
        P = np.matmul(weighted[i], g[i].transpose(0, 2, 1))
        trace += P
        np.multiply(P, lam + mu, out=K[i, i])
        for j in range(i):
            P = np.matmul(weighted[i], g[j].transpose(0, 2, 1))
            K[i, j] = lam * P + mu * P.transpose(0, 2, 1)
            K[j, i] = K[i, j].transpose(0, 2, 1)
    trace *= mu
    for i in range(3):
        K[i, i] += trace
    return K


def stiffness_matrix(
    tets: NDArray[np.int64], node_count: int, groups: list[ElementGroup], E: float, nu: float
) -> sp.csr_matrix:
    """Stiffness matrix (3 n, 3 n), N/mm, unknown 3 node + direction."""
    pattern = NodePattern(tets, node_count)
    blocks = np.zeros((pattern.indices.size, 3, 3))
    for group in groups:
        for start in range(0, group.elements.size, _CHUNK):
            part = slice(start, start + _CHUNK)
            K = element_stiffness(group.gradients[part], group.weights[part], E, nu)
            blocks += pattern.assemble(K, group.elements[part])
    return pattern.matrix(blocks)


def stresses(gradients: Array, displacements: Array, E: float, nu: float, thermal_strain: Array) -> Array:
    """(c, m, 6, q) stress xx, yy, zz, xy, yz, zx, MPa, of element displacements (c, m, 10, 3).

    `thermal_strain` (c,) is the free expansion alpha dT of each case.
    """
    c, m = displacements.shape[:2]
    q = gradients.shape[2]
    H = np.matmul(displacements.transpose(1, 0, 3, 2).reshape(m, 3 * c, 10), gradients.reshape(m, 10, 3 * q))
    H = H.reshape(m, c, 3, 3, q).transpose(1, 2, 3, 0, 4)  # du_i/dx_j: (c, i, j, m, q)
    return isotropic_stress(H, E, nu, thermal_strain).transpose(0, 2, 1, 3)


def isotropic_stress(H: Array, E: float, nu: float, thermal_strain: Array) -> Array:
    """(c, 6, ...) stress of displacement gradients du_i/dx_j (c, 3, 3, ...); see `stresses`."""
    lam, mu = lame(E, nu)
    free = ((3 * lam + 2 * mu) * thermal_strain).reshape(-1, *[1] * (H.ndim - 3))
    normal = lam * (H[:, 0, 0] + H[:, 1, 1] + H[:, 2, 2]) - free
    out = np.empty((H.shape[0], 6, *H.shape[3:]))
    for i in range(3):
        out[:, i] = normal + 2 * mu * H[:, i, i]
    for k, (i, j) in enumerate(((0, 1), (1, 2), (2, 0)), start=3):
        out[:, k] = mu * (H[:, i, j] + H[:, j, i])
    return out


_TENSOR = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2]])
"""Place of stress component ij in xx, yy, zz, xy, yz, zx."""


def element_forces(gradients: Array, weights: Array, stress: Array) -> Array:
    """(c, m, 10, 3) nodal forces that hold each element with `stress` (c, m, 6, q): int B^T sigma dV, N."""
    c, m, _, q = stress.shape
    S = stress[:, :, _TENSOR] * weights[:, None, None, :]  # (c, m, 3, 3, q): i, j
    g = gradients.reshape(m, 10, 3 * q)
    T = S.transpose(1, 3, 4, 0, 2).reshape(m, 3 * q, 3 * c)  # rows (j, q), columns (c, i)
    return np.matmul(g, T).reshape(m, 10, c, 3).transpose(2, 0, 1, 3)
