"""Geometric stiffness of the line: what the stress of the loads does when sections move by more than a little.

Sections move as rigid bodies with a finite rotation theta; strains are Green's. With the linear strains of the line
(e, a, b) along x, y, z and its curvatures (k1, k2, k3), and with the section forces f of the linear solution, the
energy of second order per length is

    f . (G2, K2) + int sigma |h|^2 / 2 dA,   h = (e + k2 z - k3 y, a - k1 z, b + k1 y),
    G2 = -theta x u' + theta x (theta x e1) / 2,   K2 = -theta x theta' / 2,

less the work of the loads (`fem.beam.modes.levers`). It holds bending and twist about any line: the polar term of
H. Wagner (the fibres of a twisted bar are helices), the height of transverse loads, the moments of beam-columns, and
Engesser's rule for shear. Derived here; special cases: S. P. Timoshenko and J. M. Gere, Theory of Elastic Stability,
1961, ch. 2, 5, 6; V. Z. Vlasov, Thin-walled elastic beams, 1961. Deflection before buckling and the stress of
restrained warping are left out.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.beam.element import GAUSS
from fem.beam.law import LineProperties, section_flexibility, torque_row
from fem.beam.mesh import BeamMesh
from fem.beam.modes.levers import Levers
from fem.beam.modes.shape_functions import ShapeFunctions, simpson
from fem.beam.modes.stress_moments import stress_moments

Array = NDArray[np.float64]
E0, A, B, K1, K2, K3 = range(3, 9)
"""Places of e, a, b, k1, k2, k3 behind the three turns."""


def second_order(forces: Array, moments: Array, strains: bool) -> Array:
    """(k, 9, 9) H of the energy z^T H z / 2 per length, z = (theta, e, a, b, k1, k2, k3).

    Parameters
    ----------
    forces
        (k, 6) N, Vy, Vz, T, My, Mz about the line.
    moments
        (k, 3) of `stress_moments`.
    strains
        Whether the squares of the strains along x are taken, which a slender member does not feel (of the size of the
        stress over E).
    """
    N, Vy, Vz, T, My, Mz = forces.T
    yy, zz, yz = moments.T
    H = np.zeros((len(N), 9, 9))

    def put(i: int, j: int, value: Array) -> None:
        H[:, i, j] += value
        if i != j:
            H[:, j, i] += value

    for i, j, value in (
        (2, A, N), (1, B, -N), (1, 1, N), (2, 2, N),
        (2, E0, -Vy), (0, B, Vy), (0, 1, -0.5 * Vy), (1, E0, Vz), (0, A, -Vz), (0, 2, -0.5 * Vz),
        (1, K3, -0.5 * T), (2, K2, 0.5 * T), (2, K1, -0.5 * My), (0, K3, 0.5 * My), (0, K2, -0.5 * Mz),
        (1, K1, 0.5 * Mz),
        (A, A, N), (B, B, N), (A, K1, -My), (B, K1, -Mz), (K1, K1, yy + zz),
    ):
        put(i, j, value)
    if strains:
        for i, j, value in ((E0, E0, N), (E0, K2, My), (E0, K3, Mz), (K2, K2, zz), (K3, K3, yy), (K2, K3, -yz)):
            put(i, j, value)
    return H


def strain_operator(p: LineProperties, E: float, G: float, warps: NDArray[np.bool_]) -> Array:
    """(k, 9, 14) z = (theta, strains of the line) from displacements (7) and forces (7)."""
    t = torque_row(p)
    Z = np.zeros((len(t), 9, 14))
    Z[:, 0:3, 3:6] = np.eye(3)
    Z[:, 3:, 7:13] = section_flexibility(p, E, G)
    Z[:, 3:, 7:13] += np.where(warps, 0.0, 1.0 / (G * p.J))[:, None, None] * t[:, :, None] * t[:, None, :]
    Z[:, 3:, 6] = np.where(warps[:, None], t, 0.0)
    return Z


def geometric_stiffness(shapes: ShapeFunctions, forces: Array, third: Array, levers: Levers) -> Array:
    """(n, n) geometric stiffness of one state of stress.

    Parameters
    ----------
    forces
        (m, 3, 6) section forces at the points of each length.
    third
        (3 m, 4) third moments of the sections there.
    levers
        Of all loads, reactions and ties of the state.
    """
    mesh: BeamMesh = shapes.mesh
    x, _ = simpson(mesh)
    p, material = mesh.stiffness(x.ravel()), mesh.part.material
    flat = forces.reshape(-1, 6)
    H = second_order(flat, stress_moments(p, third, flat), mesh.shear)
    share = (x - mesh.x[:-1, None]) / np.diff(mesh.x)[:, None]
    share = ((share - GAUSS[0]) / (GAUSS[1] - GAUSS[0]))[:, :, None, None]
    along = (1.0 - share) * levers.along[:, :1] + share * levers.along[:, 1:]
    H[:, :3, :3] -= turning(along).reshape(-1, 3, 3)
    Z = strain_operator(p, material.E, material.E / (2.0 * (1.0 + material.nu)), np.repeat(mesh.line.warping, 3))
    out = shapes.weighed((np.swapaxes(Z, 1, 2) @ H @ Z).reshape(*x.shape, 14, 14))
    for rows, lever in levers.turns:
        own = shapes.row(rows)
        out -= own.T @ turning(lever) @ own
    return out


def turning(lever: Array) -> Array:
    """(..., 3, 3) sym S - tr S 1."""
    trace = np.trace(lever, axis1=-2, axis2=-1)[..., None, None]
    return np.asarray(0.5 * (lever + np.swapaxes(lever, -1, -2)) - trace * np.eye(3))
