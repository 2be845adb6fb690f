"""Nodal stress by volume-weighted averaging of the elements' own stresses, and its invariants.

In a straight quadratic tetrahedron the stress is linear: its values at the element's nodes are taken as they are (the
same as extrapolating from the four integration points) and averaged over the elements at a node with their volumes
as weights. The spread of the elements' values about that average is kept as a measure of the discretisation error
(Zienkiewicz and Zhu 1987).
"""

from __future__ import annotations

import numpy as np

from fem.solid.model import SolidModel
from fem.solid.shape import TET_EDGES, Array, inverse, tet_gradients
from fem.solid.stiffness import element_gradients, isotropic_stress, stresses

_CHUNK = 8192
TENSOR = np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2]])

NODE_BARY = np.vstack([np.eye(4), (np.eye(4)[TET_EDGES[:, 0]] + np.eye(4)[TET_EDGES[:, 1]]) / 2]).T
"""(4, 10) barycentric coordinates of an element's nodes."""


def nodal_stress(model: SolidModel, u: Array) -> tuple[Array, Array, Array]:
    """(c, 6, n) averaged stress, (c, n) spread (von Mises of the deviation, root mean square), MPa, and (c,) energy
    of the deviation, N mm: an estimate of the energy of the error. u (c, 3, n)."""
    mesh, material = model.mesh, model.part.material
    c, n = u.shape[0], mesh.nodes.shape[1]
    expansion = material.expansion * model.change
    total, squares, weight, energy = np.zeros((c, 6, n)), np.zeros((c, n)), np.zeros(n), np.zeros(c)
    kept = []
    for start in range(0, mesh.tets.shape[1], _CHUNK):
        tets = mesh.tets[:, start : start + _CHUNK]
        gradients, det = element_gradients(mesh.nodes, tets, NODE_BARY)
        volume = np.repeat(det[:, :4].mean(axis=1), 10)
        ue = u[:, :, tets].transpose(0, 3, 2, 1)
        s = stresses(gradients, ue, material.E, material.nu, expansion)  # (c, m, 6, 10)
        index = tets.T.ravel()
        weight += np.bincount(index, weights=volume, minlength=n)
        for k in range(c):
            for i in range(6):
                total[k, i] += np.bincount(index, weights=s[k, :, i].ravel() * volume, minlength=n)
        kept.append((index, volume, s))
    mean = total / weight
    for index, volume, s in kept:
        for k in range(c):
            off = s[k].transpose(1, 0, 2).reshape(6, -1) - mean[k][:, index]
            squares[k] += np.bincount(index, weights=von_mises(off) ** 2 * volume, minlength=n)
            corner = off.reshape(6, -1, 10)[:, :, :4]
            # a linear field's square over a tetrahedron of volume V: V / 20 (sum of squares + square of the sum)
            forms = _energy(corner, material.E, material.nu).sum(axis=1)
            forms += _energy(corner.sum(axis=2), material.E, material.nu)
            energy[k] += float((volume[::10] / 6 / 20 * forms).sum())
    return mean, np.sqrt(squares / weight), energy


def _energy(s: Array, E: float, nu: float) -> Array:
    """Elastic energy density of stress (6, ...), N mm / mm^3."""
    trace = s[:3].sum(axis=0)
    return np.asarray(((1 + nu) * ((s[:3] ** 2).sum(axis=0) + 2 * (s[3:] ** 2).sum(axis=0)) - nu * trace**2) / (2 * E))


def von_mises(s: Array, axis: int = 0) -> Array:
    """Von Mises stress of components along `axis`."""
    xx, yy, zz, xy, yz, zx = np.moveaxis(s, axis, 0)
    return np.asarray(np.sqrt(((xx - yy) ** 2 + (yy - zz) ** 2 + (zz - xx) ** 2) / 2 + 3 * (xy**2 + yz**2 + zx**2)))


def principal_stresses(s: Array) -> Array:
    """(c, 3, n) principal stresses, greatest first, of (c, 6, n)."""
    tensor = s[:, TENSOR].transpose(0, 3, 1, 2)
    return np.ascontiguousarray(np.linalg.eigvalsh(tensor)[..., ::-1].transpose(0, 2, 1))


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
