"""From section properties to the differential equations of the member, referred to the declared line.

State of a section: displacements d = (ux, uy, uz, rx, ry, rz[, chi]) of the line's point, chi = twist rate
(amplitude of warping), and forces f = (N, Vy, Vz, T, My, Mz[, B]) on the face with outward normal +x, moments
and torque about the line, B = E Iw chi' the bimoment. N, mm, rad.

Strains follow from the complementary energy per length
``N^2/2EA + M^T K M/2E + s^T Q s/2G + Ts^2/2GJ`` with moments about the centroid and the torque
``Ts = T + zs Vy - ys Vz`` about the shear centre; V. Z. Vlasov, Thin-walled elastic beams, 1961, for the seventh
freedom. Every section is referred to the same straight line, so that an inclined centroid line needs no term of
its own in bending. In torsion it does: a bar twists about its own direction e = (1, yc', zc'), so that with the
moments M about the centroid the torque is M . e and the turn is along e (to first order in the slope; exact
statics of a prismatic bar that lies askew to the line). Bending takes the moments square to e.
"""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
FORCES = ("N", "Vy", "Vz", "T", "My", "Mz")
SHEAR_FORCES = ("Vy", "Vz", "N", "My about the centroid", "Mz about the centroid")


@dataclass(frozen=True, slots=True)
class LineProperties:
    """Properties at m points of the line; (m,) each unless stated. mm.

    ``y_slope``, ``z_slope``: inclination of the centroid line, dyc/dx and dzc/dx, of the section without cuts.
    ``shear`` (m, 5, 5): shear energy per length is s^T Q s / 2G with s in the order of `SHEAR_FORCES`; only the first
    two rows and columns (the shear compliance) are filled where the member is prismatic.
    """

    area: Array
    yc: Array
    zc: Array
    Iyy: Array
    Izz: Array
    Iyz: Array
    ys: Array
    zs: Array
    J: Array
    Iw: Array
    shear: Array
    y_slope: Array
    z_slope: Array

    def at(self, index: Array | slice | NDArray[np.int64]) -> LineProperties:
        """The properties at some of the points."""
        return LineProperties(*(getattr(self, f.name)[index] for f in fields(self)))


def section_flexibility(p: LineProperties, E: float, G: float) -> Array:
    """(m, 6, 6) strains (e0, gy, gz, kx, ky, kz) of the line for (N, Vy, Vz, T, My, Mz), torsion left out."""
    m = len(p.area)
    to_centroid = np.zeros((m, 3, 6))  # N, My, Mz about the centroid
    to_centroid[:, 0, 0] = 1.0
    to_centroid[:, 1, 0], to_centroid[:, 1, 4] = -p.zc, 1.0
    to_centroid[:, 2, 0], to_centroid[:, 2, 5] = p.yc, 1.0
    bending = np.zeros((m, 3, 3))
    # sigma = E (e0 + z ky - y kz): (My, Mz) = E [[Iyy, -Iyz], [-Iyz, Izz]] (ky, kz)
    det = p.Iyy * p.Izz - p.Iyz**2
    bending[:, 0, 0] = 1.0 / (E * p.area)
    bending[:, 1, 1], bending[:, 2, 2] = p.Izz / (E * det), p.Iyy / (E * det)
    bending[:, 1, 2] = bending[:, 2, 1] = p.Iyz / (E * det)
    shear = np.zeros((m, 5, 6))
    shear[:, 0, 1] = shear[:, 1, 2] = 1.0
    shear[:, 2:, :] = to_centroid
    torque = np.zeros((m, 6))
    torque[:, 1], torque[:, 2], torque[:, 3] = p.zc, -p.yc, 1.0
    to_centroid[:, 1] -= p.y_slope[:, None] * torque
    to_centroid[:, 2] -= p.z_slope[:, None] * torque
    return (np.swapaxes(to_centroid, 1, 2) @ bending @ to_centroid
            + np.swapaxes(shear, 1, 2) @ p.shear @ shear / G)


def torque_row(p: LineProperties) -> Array:
    """(m, 6) row t with t . f = torque about the shear centre, along the direction of the centroid line."""
    row = np.zeros((len(p.area), 6))
    row[:, 1], row[:, 2], row[:, 3] = p.zs, -p.ys, 1.0
    row[:, 4], row[:, 5] = p.y_slope, p.z_slope
    row[:, 0] = p.z_slope * p.yc - p.y_slope * p.zc
    return row


def system_matrices(p: LineProperties, E: float, G: float, warping: bool) -> Array:
    """(m, 2n + 13, 2n + 13) matrices A of s' = A s, n = 7 with `warping`, else 6.

    s = (d, f, c, c', e_free): c (6) is the distributed load per length (force, moment about the line), growing
    linearly with x; e_free is the free axial strain (temperature).
    """
    m, n = len(p.area), 7 if warping else 6
    flexibility, t = section_flexibility(p, E, G), torque_row(p)
    A = np.zeros((m, 2 * n + 13, 2 * n + 13))
    A[:, 1, 5], A[:, 2, 4] = 1.0, -1.0
    A[:, :6, n:n + 6] = flexibility
    if warping:
        A[:, :6, 6] += t
        A[:, 6, 2 * n - 1] = 1.0 / (E * p.Iw)
        A[:, 2 * n - 1, 6] = G * p.J
        A[:, 2 * n - 1, n:n + 6] = -t
    else:
        A[:, :6, n:n + 6] += t[:, :, None] * t[:, None, :] / (G * p.J)[:, None, None]
    A[:, n + 4, n + 2], A[:, n + 5, n + 1] = 1.0, -1.0
    A[:, n:n + 6, 2 * n:2 * n + 6] = -np.eye(6)
    A[:, 2 * n:2 * n + 6, 2 * n + 6:2 * n + 12] = np.eye(6)
    A[:, 0, 2 * n + 12] = 1.0
    return A
