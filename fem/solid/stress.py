"""Nodal stress by volume-weighted averaging of the elements' own stresses, and its invariants.

In a straight quadratic tetrahedron the stress is linear: its values at the element's nodes are taken as they are (the
same as extrapolating from the four integration points) and averaged over the elements at a node with their volumes
as weights. The spread of the elements' values about that average is kept as a measure of the discretisation error
(Zienkiewicz and Zhu 1987).
"""

from __future__ import annotations

import numpy as np

from fem.solid.kernels import recovery
from fem.solid.kernels.pattern import incidence
from fem.solid.model import SolidModel
from fem.solid.nodal_forces import turns
from fem.solid.shape import NODE_BARY, Array, inverse, tet_gradients
from fem.solid.stiffness import isotropic_stress, lame, mesh_arrays, point_slopes


def nodal_stress(model: SolidModel, u: Array) -> tuple[Array, Array, Array]:
    """(c, 6, n) averaged stress, (c, n) spread (von Mises of the deviation, root mean square), MPa, and (c,) energy
    of the deviation, N mm: an estimate of the energy of the error. u (c, 3, n)."""
    mesh, material = model.mesh, model.part.material
    lam, mu = lame(material.E, material.nu)
    points, tets = mesh_arrays(mesh.nodes, mesh.tets)
    incident, slopes = incidence(tets, points.shape[0]), point_slopes(NODE_BARY)
    free = (3 * lam + 2 * mu) * material.expansion * model.change
    c, n = u.shape[0], points.shape[0]
    mean, spread, energy = np.empty((c, 6, n)), np.empty((c, n)), np.empty(c)
    for some in turns(c):
        motions = np.ascontiguousarray(u[some].transpose(2, 0, 1))
        stress, off, energy[some] = recovery.nodal_stress(
            points, tets, incident, slopes, motions, (lam, mu, material.E, material.nu), free[some], model.threads
        )
        mean[some], spread[some] = stress.transpose(1, 2, 0), off.T
    return mean, spread, energy


def von_mises(s: Array, axis: int = 0) -> Array:
    """Von Mises stress of components along `axis`."""
    xx, yy, zz, xy, yz, zx = np.moveaxis(s, axis, 0)
    return np.asarray(np.sqrt(((xx - yy) ** 2 + (yy - zz) ** 2 + (zz - xx) ** 2) / 2 + 3 * (xy**2 + yz**2 + zx**2)))


def principal_stresses(s: Array, threads: int = 1) -> Array:
    """(c, 3, n) principal stresses, greatest first, of (c, 6, n)."""
    out = np.empty((s.shape[0], 3, s.shape[2]))
    for k in range(s.shape[0]):
        out[k] = recovery.principal(np.ascontiguousarray(s[k]), threads)
    return out


def along(s: Array, direction: Array) -> Array:
    """(..., n) normal stress in a unit direction, of s (..., 6, n)."""
    a, b, c = direction
    weights = np.array([a * a, b * b, c * c, 2 * a * b, 2 * b * c, 2 * c * a])
    return np.asarray(np.tensordot(weights, s, axes=(0, -2)))


def point_stress(model: SolidModel, u: Array, elements: np.ndarray, bary: Array) -> Array:
    """(c, 6, p) raw stress at barycentric points (4, p) of elements (p,), MPa."""
    mesh, material = model.mesh, model.part.material
    dN = tet_gradients(bary)  # (10, 3, p)
    nodes = mesh.tets[:, elements]
    J = np.einsum("iap,ajp->ijp", mesh.nodes[:, nodes], dN)
    inverted, _ = inverse(J.transpose(2, 0, 1))
    H = np.einsum("ciap,akp->cikp", u[:, :, nodes], dN)
    H = np.einsum("cikp,kjp->cijp", H, inverted.transpose(1, 2, 0))  # du_i/dx_j
    return isotropic_stress(H, material.E, material.nu, material.expansion * model.change)
