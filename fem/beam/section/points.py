"""Values and stresses of a solved section at single points."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree
from skfem import Basis, ElementTriP2

from fem.beam.section.saint_venant import SaintVenant

Array = NDArray[np.float64]


def warping_at(solved: SaintVenant, points: Array) -> Array:
    """(k,) warping function about the shear centre, mm^2, at (2, k) points in the outline's coordinates, mm."""
    y, z = local = np.asarray(points, dtype=float) - solved.centroid[:, None]
    ys, zs = solved.shear_centre
    omega = np.asarray(_basis_at(solved, local).interpolate(solved.omega))[:, 0]
    return np.asarray(omega - zs * y + ys * z)


def shear_stress_at(solved: SaintVenant, points: Array) -> Array:
    """(3, 2, k) shear stress (tau_xy, tau_xz) for unit Vy and Vz through the shear centre and unit T.

    `points` (2, k) in the outline's coordinates, mm. A point outside the mesh is taken to the nearest
    triangle when it is off by less than 1e-3 of it (rounding on a curved edge), else ValueError.
    """
    local = np.asarray(points, dtype=float) - solved.centroid[:, None]
    return solved.shear_at(_basis_at(solved, local))[..., 0]


def _basis_at(solved: SaintVenant, points: Array) -> Basis:
    """Basis whose k-th element, with its only quadrature point, holds point k (from the centroid)."""
    elements, X = locate(solved, points)
    return Basis(solved.mesh, solved.basis.elem, elements=elements, quadrature=(X[:, :, None], np.array([1.0])))


def locate(solved: SaintVenant, points: Array, candidates: int = 24) -> tuple[NDArray[np.int64], Array]:
    """Triangles (k,) that hold points (2, k) from the centroid, and their places (2, k) in them, by Newton's method."""
    mesh = solved.mesh
    nodes = mesh.doflocs[:, mesh.dofs.element_dofs]  # (2, 6, m)
    _, near = cKDTree(nodes.mean(axis=1).T).query(points.T, k=min(candidates, nodes.shape[2]))
    near = np.asarray(near).reshape(points.shape[1], -1)
    X = np.full((2, *near.shape), 1.0 / 3.0)
    element = ElementTriP2()
    for _ in range(12):
        shape = [element.lbasis(X, i) for i in range(6)]
        value = sum(nodes[:, i, near] * shape[i][0] for i in range(6))
        slopes = [np.broadcast_to(np.asarray(slope), X.shape) for _, slope in shape]
        jacobian = sum(nodes[:, None, i, near] * slopes[i][None] for i in range(6))
        left = np.moveaxis(points[:, :, None] - value, 0, -1)[..., None]
        step = np.linalg.solve(np.moveaxis(jacobian, (0, 1), (-2, -1)), left)[..., 0]
        before, X = X, np.clip(X + np.moveaxis(step, -1, 0), -3.0, 3.0)
        if np.abs(X - before).max() < 1e-9:  # the next step would be its square
            break
    outside = np.maximum(-X, 0.0).sum(axis=0) + np.maximum(X.sum(axis=0) - 1.0, 0.0)
    best = np.argmin(outside, axis=1)
    rows = np.arange(len(best))
    for k in rows[outside[rows, best] > 1e-3]:
        y, z = points[:, k] + solved.centroid
        raise ValueError(f"the point ({y:g}, {z:g}) mm lies outside the section.")
    return near[rows, best], X[:, rows, best]
