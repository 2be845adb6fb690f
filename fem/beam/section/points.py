"""Values and stresses of a solved section at single points."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree
from skfem import Basis

from fem.beam.section.saint_venant import SaintVenant
from fem.beam.section.space import element_of, shape_functions

Array = NDArray[np.float64]


def warping_at(solved: SaintVenant, points: Array) -> Array:
    """(k,) warping function about the shear centre, mm^2, at (2, k) points in the outline's coordinates, mm."""
    y, z = local = np.asarray(points, dtype=float) - solved.centroid[:, None]
    ys, zs = solved.shear_centre
    elements, X = locate(solved, local)
    values, _ = shape_functions(solved.space.order, X)
    omega = (solved.omega[solved.space.element_dofs[:, elements]] * values).sum(axis=0)
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
    quadrature = (X[:, :, None], np.array([1.0]))
    return Basis(solved.mesh, element_of(solved.space.order), elements=elements, quadrature=quadrature)


def locate(solved: SaintVenant, points: Array, candidates: int = 24) -> tuple[NDArray[np.int64], Array]:
    """Triangles (k,) that hold points (2, k) from the centroid, and their places (2, k) in them, by Newton's method."""
    nodes = solved.space.nodes  # (2, 6, m)
    _, near = cKDTree(nodes.mean(axis=1).T).query(points.T, k=min(candidates, nodes.shape[2]))
    near = np.asarray(near).reshape(points.shape[1], -1)
    X = np.full((2, *near.shape), 1.0 / 3.0)
    mine = nodes[:, :, near]
    for _ in range(12):
        values, slopes = shape_functions(2, X)
        jacobian = (mine[:, None] * slopes[None]).sum(axis=2)
        left = np.moveaxis(points[:, :, None] - (mine * values).sum(axis=1), 0, -1)[..., None]
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
