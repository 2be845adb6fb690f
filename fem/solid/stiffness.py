"""Stiffness matrix, strains and internal forces of quadratic tetrahedra, isotropic linear elasticity.

The gradients g[a, i] = dN_a/dx_i at a quadrature point, taken as one vector of 30, give the element's matrix of
products P = sum_q w g g^T. Isotropic stiffness is three rearrangements of P:
K[a i, b j] = lambda P[a i, b j] + mu P[a j, b i] + mu delta_ij sum_k P[a k, b k].
Straight elements are integrated exactly (four points, order 2, do that too), curved ones with `CURVED_ORDER`. The work
on whole meshes is done in `fem.solid.kernels`; the functions on element arrays here are for a few elements.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.elastic import add_curved, straight_blocks, straight_gradients
from fem.solid.kernels.jacobian import classify
from fem.solid.kernels.linear import add_curved_linear, linear_blocks
from fem.solid.kernels.pattern import incidence, upper_pattern
from fem.solid.kernels.recovery import point_stress
from fem.solid.shape import CURVED_TOLERANCE, NODE_BARY, Array, inverse, tet_gradients, tet_quadrature
from geometry.problem import SolveError

CURVED_ORDER = 4
STRAIGHT_ORDER = 2


@dataclass(frozen=True, slots=True)
class ElementGroup:
    """Elements integrated with one rule. Nothing is kept for each point of each element: kernels make it as they go.

    Attributes
    ----------
    elements
        (m',) rising.
    points, rule
        Barycentric points (4, q) and weights (q,) that sum to 1/6.
    curved
        Whether the Jacobian changes within these elements.
    nodes, tets
        Of the whole mesh, (3, n) and (10, m).
    """

    elements: NDArray[np.int64]
    points: Array
    rule: Array
    curved: bool
    nodes: Array
    tets: NDArray[np.int64]

    @property
    def gradients(self) -> Array:
        """(m', 30, q) gradients, row 3 a + i, made anew at every call: 240 bytes for a point."""
        return element_gradients(self.nodes, self.tets[:, self.elements], self.points)[0]

    @property
    def weights(self) -> Array:
        """(m', q) weights in mm^3, made anew at every call."""
        return element_gradients(self.nodes, self.tets[:, self.elements], self.points)[1] * self.rule


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
        raise SolveError(_no_volume(nodes, tets, np.unique(np.nonzero(~(det > 0))[0])))
    g = np.empty((m, 30, q))
    for k in range(q):
        g[:, :, k] = np.matmul(dN[:, :, k], inverted[:, k]).reshape(m, 30)
    return g, det


def element_groups(
    nodes: Array, tets: NDArray[np.int64], threads: int = 1, shared: KernelMesh | None = None
) -> list[ElementGroup]:
    """Straight and curved elements; `shared` where it is made already.

    Raises
    ------
    SolveError
        When an element is inverted or flat at a point of its rule or at one of its nodes.
    """
    L, _ = tet_quadrature(CURVED_ORDER)
    slopes = point_slopes(np.hstack([L, NODE_BARY]))
    shared = shared or KernelMesh(nodes, tets, threads)
    curved, least = classify(shared.points, shared.tets, slopes, CURVED_TOLERANCE, threads)
    if not (least > 0).all():
        raise SolveError(_no_volume(nodes, tets, np.flatnonzero(~(least > 0))))
    groups = []
    for bent, order in ((False, STRAIGHT_ORDER), (True, CURVED_ORDER)):
        elements = np.flatnonzero(curved == bent)
        if elements.size:
            groups.append(ElementGroup(elements, *tet_quadrature(order), bent, nodes, tets))
    return groups


def _no_volume(nodes: Array, tets: NDArray[np.int64], bad: NDArray[np.int64]) -> str:
    where = nodes[:, tets[:4, bad[0]]].mean(axis=1)
    return (
        f"{bad.size} of {tets.shape[1]} elements have no positive volume, the first one near "
        f"{np.round(where, 3).tolist()} mm. Mesh the part again with another recipe."
    )


def mesh_arrays(nodes: Array, tets: NDArray[np.int64]) -> tuple[Array, NDArray[np.int32]]:
    """Points (n, 3) and elements (m, 10), contiguous: the form that the kernels take."""
    return np.ascontiguousarray(nodes.T), np.ascontiguousarray(tets.T, dtype=np.int32)


def point_slopes(L: Array) -> Array:
    """(q, 10, 3) derivatives dN_a/dxi_j at barycentric points (4, q): the form that the kernels take."""
    return np.ascontiguousarray(tet_gradients(L).transpose(2, 0, 1))


class KernelMesh:
    """A mesh in the form that the kernels take, with what several of them need: made once, in the order of the need.

    Attributes
    ----------
    points, tets
        (n, 3), and (m, 10) int32.
    gradients
        (m, 16) of the straight elements; see `fem.solid.kernels.elastic.straight_gradients`. 128 bytes an element.
    incident
        Where each node occurs in the elements; see `fem.solid.kernels.pattern.incidence`.
    """

    def __init__(self, nodes: Array, tets: NDArray[np.int64], threads: int = 1) -> None:
        self.points, self.tets = mesh_arrays(nodes, tets)
        self._threads = threads

    @cached_property
    def gradients(self) -> Array:
        return straight_gradients(self.points, self.tets, self._threads)

    @cached_property
    def incident(self) -> tuple[NDArray[np.int32], NDArray[np.int32]]:
        return incidence(self.tets, self.points.shape[0])


def curved_elements(groups: list[ElementGroup], count: int) -> NDArray[np.bool_]:
    """(count,) which elements are curved."""
    curved = np.zeros(count, dtype=np.bool_)
    for group in groups:
        curved[group.elements] = group.curved
    return curved


def stiffness_matrix(
    nodes: Array,
    tets: NDArray[np.int64],
    groups: list[ElementGroup],
    E: float,
    nu: float,
    threads: int = 1,
    shared: KernelMesh | None = None,
) -> BlockMatrix:
    """Stiffness matrix (3 n, 3 n), N/mm, of nodes (3, n) and tets (10, m), unknown 3 node + direction.

    Straight elements are exact, curved ones integrated with the rule of their group. `shared` where it is made already.
    """
    lam, mu = lame(E, nu)
    shared = shared or KernelMesh(nodes, tets, threads)
    points, elements, incident = shared.points, shared.tets, shared.incident
    pattern = upper_pattern(elements, *incident, threads)
    curved = curved_elements(groups, elements.shape[0])
    blocks = straight_blocks(shared.gradients, elements, curved, incident, pattern, lam, mu, threads)
    for group in groups:
        if group.curved:
            rule = point_slopes(group.points), group.rule
            add_curved(blocks, points, elements, group.elements.astype(np.int32), rule, pattern, lam, mu, threads)
    return BlockMatrix(*pattern, blocks, threads, lambda corners: linear_stiffness(corners, groups, E, nu, threads))


def linear_stiffness(
    corner_nodes: NDArray[np.integer], groups: list[ElementGroup], E: float, nu: float, threads: int = 1
) -> BlockMatrix:
    """Stiffness (3 n', 3 n'), N/mm, of the same mesh with displacements linear in each element's coordinates.

    corner_nodes (n',) all the mesh's corners, in the order that they shall have. It is E^T K E of the quadratic
    stiffness K, E the mean of an edge's ends for the node between them, on curved elements too.
    """
    lam, mu = lame(E, nu)
    points, elements = mesh_arrays(groups[0].nodes, groups[0].tets)
    number = np.empty(points.shape[0], dtype=np.int32)
    number[corner_nodes] = np.arange(corner_nodes.size, dtype=np.int32)
    corners = number[elements[:, :4]]
    incident = incidence(corners, corner_nodes.size)
    pattern = upper_pattern(corners, *incident, threads)
    curved = curved_elements(groups, corners.shape[0])
    gradients = straight_gradients(points, elements, threads)
    blocks = linear_blocks(gradients, corners, curved, incident, pattern, lam, mu, threads)
    for group in groups:
        if group.curved:
            which, rule = group.elements.astype(np.int32), (point_slopes(group.points), group.rule)
            add_curved_linear(blocks, points, elements, corners, which, rule, pattern, lam, mu, threads)
    return BlockMatrix(*pattern, blocks, threads)


def group_stresses(
    groups: list[ElementGroup], u: Array, E: float, nu: float, thermal_strain: Array, threads: int = 1
) -> list[Array]:
    """(c, m', 6, q) stress of displacements u (c, 3, n) at the points of each group; `thermal_strain` as in `stresses`.

    Of a mesh of 390 000 straight elements 75 MB a case.
    """
    lam, mu = lame(E, nu)
    free = (3 * lam + 2 * mu) * np.asarray(thermal_strain, dtype=float)
    if not groups:
        return []
    points, elements = mesh_arrays(groups[0].nodes, groups[0].tets)
    field = np.ascontiguousarray(u.transpose(2, 0, 1))
    out = []
    for group in groups:
        which, slopes = group.elements.astype(np.int32), point_slopes(group.points)
        out.append(point_stress(points, elements, which, group.curved, slopes, field, (lam, mu), free, threads))
    return out


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
