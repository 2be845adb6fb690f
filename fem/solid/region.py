"""A region's surface: its nodes, area, centroid and second moments, by quadrature on the curved facets."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.shape import Array, facet_points
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh


@dataclass(frozen=True, slots=True)
class Region:
    """Surface of one region.

    Attributes
    ----------
    nodes
        (k,) its nodes, sorted.
    weights
        (k,) integral of each node's shape function, mm^2.
    weight_moments
        (3, k) integral of shape function times arm from the centroid, mm^3.
    area, centroid, normal
        mm^2; area centroid, mm; mean outward unit normal (zero vector for a closed surface).
    flatness
        Size of the mean normal before it was made a unit: 1 for a plane face.
    second
        (3, 3) int (r.r I - r r) dA about the centroid, mm^4: the moment of a traction w x r is second @ w.
    """

    name: str
    facets: NDArray[np.int64]
    nodes: NDArray[np.int64]
    weights: Array
    weight_moments: Array
    area: float
    centroid: Array
    normal: Array
    flatness: float
    second: Array

    def mean_rows(self) -> tuple[Array, Array]:
        """Rows that give the mean displacement and rotation of the region.

        Returns (3, k, 3) and (3, k, 3): result i = sum over nodes and directions of row[i, node, direction] u.
        The rotation is the least-squares rigid one, second^-1 int r x u dA.
        """
        k = self.nodes.size
        mean = np.zeros((3, k, 3))
        for i in range(3):
            mean[i, :, i] = self.weights / self.area
        arm = np.zeros((3, k, 3))  # (r x u)_i = eps_ijl r_j u_l
        for i, j, m in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
            arm[i, :, m] += self.weight_moments[j]
            arm[i, :, j] -= self.weight_moments[m]
        return mean, np.tensordot(np.linalg.inv(self.second), arm, axes=1)


def inertia(points: Array, weights: Array) -> Array:
    """(3, 3) sum of weights (r.r I - r r) of arms (3, ...)."""
    r, w = points.reshape(3, -1), weights.ravel()
    products = (r * w) @ r.T
    return np.trace(products) * np.eye(3) - products


def surface_region(mesh: NamedMesh, name: str) -> Region:
    """Measure a region.

    Raises
    ------
    SolveError
        When the mesh has no facets under that name.
    """
    facets = mesh.facets.get(name)
    if facets is None or facets.shape[1] == 0:
        known = ", ".join(sorted(mesh.facets))
        raise SolveError(f"The mesh has no facets of the region {name!r}. It has: {known}.")
    N, x, normals = facet_points(mesh.nodes, facets)
    dA = np.linalg.norm(normals, axis=0)
    area = float(dA.sum())
    centroid = (x * dA).sum(axis=(1, 2)) / area
    arms = x - centroid[:, None, None]
    nodes, local = np.unique(facets, return_inverse=True)
    local = local.reshape(facets.shape)

    def gather(values: Array) -> Array:
        return np.bincount(local.ravel(), weights=(N @ values.T).ravel(), minlength=nodes.size).astype(float)

    mean_normal = normals.sum(axis=(1, 2)) / area
    size = float(np.linalg.norm(mean_normal))
    unit = mean_normal / size if size > 1e-9 else np.zeros(3)
    return Region(
        name,
        facets,
        nodes,
        gather(dA),
        np.array([gather(arms[i] * dA) for i in range(3)]),
        area,
        centroid,
        unit,
        size,
        inertia(arms, dA),
    )
