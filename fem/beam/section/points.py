"""Values and stresses of a solved section at single points."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree
from skfem import Basis, ElementTriP2

from fem.beam.section.saint_venant import SaintVenant

Array = NDArray[np.float64]


def values_at(solved: SaintVenant, points: Array) -> Array:
    """(k,) warping function about the centroid, mm^2, at (2, k) points from the centroid, mm."""
    return np.array([float(np.asarray(_one(solved, p).interpolate(solved.omega)).ravel()[0]) for p in points.T])


def shear_stress_at(solved: SaintVenant, points: Array) -> Array:
    """(3, 2, k) shear stress (tau_xy, tau_xz) for unit Vy and Vz through the shear centre and unit T.

    `points` (2, k) in the outline's coordinates, mm. A point outside the mesh is taken to the nearest
    triangle when it is off by less than 1e-3 of it (rounding on a curved edge), else ValueError.
    """
    local = np.asarray(points, dtype=float) - solved.centroid[:, None]
    return np.stack([solved.shear_at(_one(solved, p))[:, :, 0, 0] for p in local.T], axis=-1)


def _one(solved: SaintVenant, point: Array) -> Basis:
    """Basis with one quadrature point: the place of `point` in its triangle."""
    element, X = locate(solved, point)
    return Basis(solved.mesh, solved.basis.elem, elements=np.array([element]),
                 quadrature=(X[:, None], np.array([1.0])))


def locate(solved: SaintVenant, point: Array, candidates: int = 24) -> tuple[int, Array]:
    """Triangle that holds `point` (from the centroid) and its reference coordinates (2,), by Newton's method."""
    mesh = solved.mesh
    nodes = mesh.doflocs[:, mesh.dofs.element_dofs]  # (2, 6, m)
    _, near = cKDTree(nodes.mean(axis=1).T).query(point, k=min(candidates, nodes.shape[2]))
    near = np.atleast_1d(near)
    X = np.full((2, len(near)), 1.0 / 3.0)
    element = ElementTriP2()
    for _ in range(12):
        shape = [element.lbasis(X, i) for i in range(6)]
        value = sum(nodes[:, i, near] * shape[i][0] for i in range(6))
        slopes = [np.broadcast_to(np.asarray(slope), X.shape) for _, slope in shape]
        jacobian = sum(nodes[:, None, i, near] * slopes[i][None] for i in range(6))
        X = X + np.linalg.solve(jacobian.transpose(2, 0, 1), (point[:, None] - value).T[:, :, None])[:, :, 0].T
        X = np.clip(X, -3.0, 3.0)
    outside = np.maximum(-X, 0.0).sum(axis=0) + np.maximum(X.sum(axis=0) - 1.0, 0.0)
    best = int(np.argmin(outside))
    if outside[best] > 1e-3:
        raise ValueError(f"the point ({point[0]:g}, {point[1]:g}) mm from the centroid lies outside the section.")
    return int(near[best]), X[:, best]
