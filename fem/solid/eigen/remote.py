"""Masses and dead forces at remote points, through the mean motion of the region that they are coupled to."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp

from fem.solid.region import surface_region
from fem.solid.shape import Array
from geometry.part import RemotePoint
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh


def cross_matrix(a: Array) -> Array:
    """(3, 3) of a x."""
    return np.array([[0.0, -a[2], a[1]], [a[2], 0.0, -a[0]], [-a[1], a[0], 0.0]])


def point_rows(mesh: NamedMesh, point: RemotePoint) -> sp.csr_matrix:
    """(6, 3 n): displacement of the point, global, and rotation of the region that carries it.

    The mean motion of the region for either coupling: a region coupled `rigid` moves as its mean does.
    """
    region = surface_region(mesh, point.on)
    mean, turn = (rows.reshape(3, -1) for rows in region.mean_rows())
    arm = np.array(point.point, dtype=float) - region.centroid
    rows = np.vstack([mean - cross_matrix(arm) @ turn, turn])
    columns = (3 * region.nodes[:, None] + np.arange(3)).ravel()
    shape = (6, 3 * mesh.nodes.shape[1])
    return sp.csr_matrix((rows.ravel(), (np.repeat(np.arange(6), columns.size), np.tile(columns, 6))), shape=shape)


def remote_mass_rows(mesh: NamedMesh, points: list[RemotePoint]) -> sp.csr_matrix:
    """(r, 3 n) rows B whose B^T B is the mass of all remote points, t.

    Raises
    ------
    SolveError
        When an inertia has a negative principal moment.
    """
    rows = [sp.csr_matrix((0, 3 * mesh.nodes.shape[1]))]
    for point in points:
        xx, yy, zz, xy, yz, zx = point.inertia
        values, axes = np.linalg.eigh(np.array([[xx, xy, zx], [xy, yy, yz], [zx, yz, zz]]))
        if values[0] < -1e-9 * max(values[-1], 0.0):
            raise SolveError(
                f"The inertia of the remote point {point.name!r} has the principal moment {values[0]:.4g} t mm^2. "
                "No body has a negative one: look at the products of inertia."
            )
        Q = np.zeros((6, 6))
        Q[:3, :3] = np.sqrt(point.mass) * np.eye(3)
        Q[3:, 3:] = np.sqrt(np.maximum(values, 0.0))[:, None] * axes.T
        rows.append(sp.csr_matrix(Q[Q.any(axis=1)]) @ point_rows(mesh, point))
    return sp.csr_matrix(sp.vstack(rows))


def lever_rows(mesh: NamedMesh, point: RemotePoint, force: Array) -> tuple[Array, sp.csr_matrix]:
    """(3,) weights and (3, 3 n) rows of the stiffness sum_i w_i b_i^T b_i of a dead force at the end of a lever.

    The point moves by turn x (turn x arm) / 2 in second order, on which the force does work: its energy is
    -F . (turn (turn . arm) - arm turn . turn) / 2.
    """
    region = surface_region(mesh, point.on)
    arm = np.array(point.point, dtype=float) - region.centroid
    S = -((np.outer(force, arm) + np.outer(arm, force)) / 2 - (force @ arm) * np.eye(3))
    weights, Q = np.linalg.eigh(S)
    return weights, sp.csr_matrix(sp.csr_matrix(Q.T) @ point_rows(mesh, point)[3:])
