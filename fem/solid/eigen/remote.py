"""Masses and dead forces at remote points, through the mean motion of the region that they are coupled to."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp

from fem.solid.region import Region, surface_region
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


def lever_form(mesh: NamedMesh, point: RemotePoint, force: Array, moment: Array) -> Array:
    """(3, 3) symmetric E: theta . E theta / 2 is what a dead force and moment at the point add, as the region turns by
    theta, to the second variation of the potential, N mm.

    The geometric stiffness takes every load for a dead traction on the surface. Force and moment come as the traction
    t = force / A + w x r over the region, which moves by theta x r + theta x (theta x r) / 2 and does the second-order
    work theta . (sym S_t - tr S_t 1) theta / 2 with the lever S_t = int t r^T dA, r from the region's centroid. In
    truth the force acts at the end of the arm and does the same work with the lever S_F = force arm^T; the moment does
    none, if theta is the rotation vector. The energy is the difference, with tr S_t = 0. What the
    region's own strain does to its mean rotation is left out.
    """
    region = surface_region(mesh, point.on)
    arm = np.array(point.point, dtype=float) - region.centroid
    w = np.asarray(np.linalg.solve(region.second, moment + np.cross(arm, force)), dtype=float)
    spread = np.trace(region.second) / 2.0 * np.eye(3) - region.second  # int r r^T dA
    true, traction = np.outer(force, arm), cross_matrix(w) @ spread
    return _energy(traction) - _energy(true)


def rigid_form(nodes: Array, centre: Array, held: Array) -> Array:
    """(3, 3) the same of a rigid region, whose nodes (3, k) move by theta x r + theta x (theta x r) / 2 themselves:
    `held` (k, 3) is what keeps them rigid, the forces on the nodes beside the loads, N."""
    return _energy(held.T @ (nodes - centre[:, None]).T)


def _energy(lever: Array) -> Array:
    """Symmetric form of the second-order work of forces with the lever sum f r^T on a turn."""
    return np.asarray((lever + lever.T) / 2 - np.trace(lever) * np.eye(3))


def turn_rows(mesh: NamedMesh, region: Region) -> sp.csr_matrix:
    """(3, 3 n): mean rotation of a region."""
    rows = region.mean_rows()[1].reshape(3, -1)
    columns = (3 * region.nodes[:, None] + np.arange(3)).ravel()
    return sp.csr_matrix((rows.ravel(), (np.repeat(np.arange(3), columns.size), np.tile(columns, 3))),
                         shape=(3, 3 * mesh.nodes.shape[1]))  # fmt: skip


def form_rows(form: Array, turn: sp.csr_matrix) -> tuple[Array, sp.csr_matrix]:
    """(3,) weights and (3, 3 n) rows of the stiffness sum_i w_i b_i^T b_i of theta . form theta / 2, theta = turn u."""
    weights, Q = np.linalg.eigh(form)
    return weights, sp.csr_matrix(sp.csr_matrix(Q.T) @ turn)
