"""Area, centroid and second moments of a section's loops, by line integrals along their edges."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from geometry.outline import Arc, Edge
from geometry.solid.lofts import radius_of, sweep_of
from geometry.solid.profile import Profile

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(16)


@dataclass(frozen=True, slots=True)
class AreaIntegrals:
    """Area (mm^2), centroid (y, z), and second moments about the centroid: int z^2, int y^2, int y z (mm^4)."""

    area: float
    y: float
    z: float
    Iyy: float
    Izz: float
    Iyz: float


def _points(edge: Edge) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    t = 0.5 * (_NODES + 1.0)
    if isinstance(edge, Arc):
        r, turn = radius_of(edge), sweep_of(edge) * (1.0 if edge.ccw else -1.0)
        angle = math.atan2(edge.start[1] - edge.centre[1], edge.start[0] - edge.centre[0]) + turn * t
        y, z = edge.centre[0] + r * np.cos(angle), edge.centre[1] + r * np.sin(angle)
        return y, z, -r * turn * np.sin(angle), r * turn * np.cos(angle)
    dy, dz = edge.end[0] - edge.start[0], edge.end[1] - edge.start[1]
    return edge.start[0] + t * dy, edge.start[1] + t * dz, np.full_like(t, dy), np.full_like(t, dz)


def section_integrals(profile: Profile) -> AreaIntegrals:
    """Integrals over a section by Green's theorem (16-point Gauss on each edge: exact to rounding)."""
    return _integrals(side.edge for loop in profile.loops for side in loop)


def _integrals(edges: Iterable[Edge]) -> AreaIntegrals:
    a = sy = sz = yy = zz = yz = 0.0
    for edge in edges:
        y, z, dy, dz = _points(edge)
        w = 0.5 * _WEIGHTS
        a += float(w @ (0.5 * (y * dz - z * dy)))
        sy += float(w @ (0.5 * y * y * dz))
        sz -= float(w @ (0.5 * z * z * dy))
        yy += float(w @ (y**3 / 3.0 * dz))
        zz -= float(w @ (z**3 / 3.0 * dy))
        yz += float(w @ (0.5 * y * y * z * dz))
    cy, cz = sy / a, sz / a
    return AreaIntegrals(a, cy, cz, zz - a * cz * cz, yy - a * cy * cy, yz - a * cy * cz)
