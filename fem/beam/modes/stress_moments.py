"""Second moments of the longitudinal stress, which the geometric stiffness needs."""

from __future__ import annotations

from collections.abc import Hashable

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from fem.beam.along import EXACT_POINTS, Sections, chebyshev_points, fitted
from fem.beam.faces import curve
from fem.beam.interpolate import loops
from fem.beam.law import LineProperties
from fem.beam.section import outline_integrals
from geometry.outline import Arc, Outline

Array = NDArray[np.float64]
_LINE = np.polynomial.legendre.leggauss(3)
_ARC = np.polynomial.legendre.leggauss(24)


def third_moments(outlines: tuple[Outline, ...]) -> Array:
    """(4,) int y^3, y^2 z, y z^2, z^3 dA about the centroid, mm^5: by Green's theorem, exact on lines."""
    o = outline_integrals(outlines)
    total = np.zeros(4)
    for outline in outlines:
        for loop in loops(outline):
            for edge in loop:
                t, w = _ARC if isinstance(edge, Arc) else _LINE
                (p, slope), w = curve(edge, 0.5 * (t + 1.0)), 0.5 * w
                y, z = p[:, 0] - o.yc, p[:, 1] - o.zc
                dy, dz = slope[:, 0] * w, slope[:, 1] * w
                total += np.array([(y**4 / 4.0) @ dz, (y**3 * z / 3.0) @ dz, -(y * z**3 / 3.0) @ dy,
                                   -(z**4 / 4.0) @ dy])
    return total


def third_moments_along(sections: Sections, x: Array) -> Array:
    """(k, 4) of the net sections at `x` (k,): polynomials along smooth pieces, directly where a cut passes."""
    out = np.zeros((len(x), 4))
    for piece in sections.pieces:
        here = (x >= piece.start) & (x <= piece.end)
        if piece.constant:
            out[here] = third_moments((sections.outline(0.5 * (piece.start + piece.end)),))
        else:
            at = chebyshev_points(piece.start, piece.end, EXACT_POINTS)
            table = fitted(piece.start, piece.end, at,
                           np.array([third_moments((sections.outline(float(v)),)) for v in at]))
            t = (2.0 * x[here] - piece.start - piece.end) / (piece.end - piece.start)
            out[here] = chebyshev.chebval(t, table).T
    known: dict[Hashable, Array] = {}
    for k in np.flatnonzero([any(e.start < v < e.end for e in sections.effects) for v in x]):
        key = sections.net_key(float(x[k]))
        if key not in known:
            known[key] = third_moments(sections.net_outlines(float(x[k])))
        out[k] = known[key]
    return out


def stress_moments(p: LineProperties, third: Array, forces: Array) -> Array:
    """(k, 3) int sigma y^2, sigma z^2, sigma y z dA about the line, N mm^2.

    `forces` (k, 6) about the line. The stress of restrained warping is left out (it adds nothing where the section is
    symmetric about both axes).
    """
    N, My, Mz = forces[:, 0], forces[:, 4] - p.zc * forces[:, 0], forces[:, 5] + p.yc * forces[:, 0]
    det = p.Iyy * p.Izz - p.Iyz**2
    ky, kz = (p.Izz * My + p.Iyz * Mz) / det, (p.Iyz * My + p.Iyy * Mz) / det
    yyy, yyz, yzz, zzz = third.T
    mean = N / p.area
    return np.stack([
        mean * p.Izz + ky * yyz - kz * yyy - 2.0 * p.yc * Mz + p.yc**2 * N,
        mean * p.Iyy + ky * zzz - kz * yzz + 2.0 * p.zc * My + p.zc**2 * N,
        mean * p.Iyz + ky * yzz - kz * yyz + p.yc * My - p.zc * Mz + p.yc * p.zc * N,
    ], axis=1)
