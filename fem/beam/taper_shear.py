"""Shear in a tapered member: inclined sides carry part of the shear force.

Longitudinal stress is taken as N/A + M (z - zc)/I on every section; the shear flow through a level z then follows
from the equilibrium of the part above it,

    q(z) = - d/dx [ N A_above/A + M S_above/I ]  at fixed z
         = - [ N (A_above/A)' + (V - zc' N) S_above/I + M (S_above/I)' ],

which for a section that scales with its depth h gives the well-known V - M h'/h of the web (F. Bleich, Stahlhochbauten,
1932; G. Balduzzi, M. Aminbaghai, E. Sacco, J. Fuessl, J. Eberhardsteiner and F. Auricchio, Int. J. Solids Struct. 90
(2016) 236-250, for the same energy in a bilateral taper). With the level's width b(z) the energy int q^2/b dz is a
quadratic form of (V, N, M); it is scaled so that its V-V entry is the shear compliance of the section's finite-element
analysis, which knows what a level's mean does not. The product of inertia is left out of q.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from fem.beam.interpolate import loops
from geometry.outline import Arc, Line, Outline

Array = NDArray[np.float64]
_GAUSS = np.polynomial.legendre.leggauss(6)
ARC_CHORDS = 12


def polygon_edges(outline: Outline, axis: int) -> Array:
    """(k, 4) edges (a1, b1, a2, b2), b the coordinate along which the shear acts, a across it; arcs in chords.

    `axis` is 1 for shear along z, 0 along y. Material lies to the left (the mirror image for axis 0 is turned round).
    """
    edges = [e for loop in loops(outline) for e in loop]
    straight = np.array([(*e.start, *e.end) for e in edges if isinstance(e, Line)]).reshape(-1, 4)
    arcs = np.array([(*e.centre, *e.start, *e.end, 1.0 if e.ccw else -1.0) for e in edges if isinstance(e, Arc)])
    found = np.vstack([straight, _chords(arcs.reshape(-1, 7))])
    return found if axis == 1 else found[:, ::-1]


def _chords(arcs: Array) -> Array:
    """(k, 4) chords of arcs (m, 7): centre, start, end, and 1 for those that turn counter-clockwise, else -1."""
    centre, start, end, way = arcs[:, None, :2], arcs[:, None, 2:4], arcs[:, None, 4:6], arcs[:, 6:]
    first, last = (np.arctan2(p[..., 1], p[..., 0]) for p in (start - centre, end - centre))
    turn = (way * (last - first)) % (2.0 * np.pi)
    turn = way * np.where(turn < 1e-12, 2.0 * np.pi, turn)
    angle = first + turn * np.linspace(0.0, 1.0, ARC_CHORDS + 1)
    radius = np.hypot(*(start - centre)[:, 0].T)[:, None, None]
    p = centre + radius * np.stack([np.cos(angle), np.sin(angle)], axis=-1)
    return np.concatenate([p[:, :-1], p[:, 1:]], axis=-1).reshape(-1, 4)


def above(edges: Array, levels: Array) -> tuple[Array, Array, Array]:
    """Area (l,), first moment int b dA (l,) of what lies above each level, and width (l,) at it."""
    a1, b1, a2, b2 = (c[:, None] for c in edges.T)
    flat = b1 == b2
    slope = np.where(flat, 0.0, (a2 - a1) / np.where(flat, 1.0, b2 - b1))
    s, e = np.maximum(b1, levels), np.maximum(b2, levels)
    # int a db and int a b db along what is above the level, a = a1 + slope (b - b1)
    base = a1 - slope * b1
    s2, e2 = s * s, e * e
    area = base * (e - s) + slope * (e2 - s2) / 2.0
    first = base * (e2 - s2) / 2.0 + slope * (e2 * e - s2 * s) / 3.0
    crossing = ((b1 < levels) != (b2 < levels)) * np.sign(b2 - b1)
    width = (crossing * (base + slope * levels)).sum(axis=0)
    return area.sum(axis=0), first.sum(axis=0), width


def level_form(outline_at: Callable[[float], Outline], x: float, step: float, axis: int) -> tuple[Array, float]:
    """Quadratic form (3, 3) of int q^2/b db over (V, N, M), and b of the centroid's own level (for checks).

    M is positive with tension on the side of greater b and dM/dx = V; both about the centroid.
    """
    return _form(_nearby(outline_at, x, step), step, axis)


_Nearby = tuple[Array, Array, Array]
"""Edges for shear along z at a place, a step before it and a step after it."""


def _nearby(outline_at: Callable[[float], Outline], x: float, step: float) -> _Nearby:
    middle, before, after = (polygon_edges(outline_at(x + d), 1) for d in (0.0, -step, step))
    return middle, before, after


def _seen(edges: _Nearby, axis: int) -> _Nearby:
    return edges if axis == 1 else (edges[0][:, ::-1], edges[1][:, ::-1], edges[2][:, ::-1])


def _form(nearby: _Nearby, step: float, axis: int) -> tuple[Array, float]:
    edges = _seen(nearby, axis)
    levels, weights = _levels(edges[0])
    middle, before, after = (_shares(e, levels) for e in edges)
    F_x, S_x = ((n - p) / (2.0 * step) for n, p in zip(after[:2], before[:2], strict=True))
    centroid_x = (after[3] - before[3]) / (2.0 * step)
    S, width = middle[1], middle[2]
    rows = np.stack([S, F_x - centroid_x * S, S_x])
    good = width > 1e-9 * np.ptp(edges[0][:, [1, 3]])
    form = np.einsum("il,jl,l->ij", rows[:, good], rows[:, good], weights[good] / width[good])
    return form, float(middle[3])


def level_shear(outline_at: Callable[[float], Outline], x: float, step: float) -> tuple[Array, Array]:
    """(3,) each: mean shear stress at the centroid's level for unit V, N and M, along z and along y, positive along
    the axis of the shear."""
    nearby = _nearby(outline_at, x, step)
    along_z, along_y = (_level_shear(_seen(nearby, axis), step) for axis in (1, 0))
    return along_z, along_y


def _level_shear(edges: _Nearby, step: float) -> Array:
    level = np.array([_shares(edges[0], np.zeros(1))[3]])
    middle, before, after = (_shares(e, level) for e in edges)
    F_x, S_x = ((n - p) / (2.0 * step) for n, p in zip(after[:2], before[:2], strict=True))
    slope = (after[3] - before[3]) / (2.0 * step)
    return np.array([middle[1][0], F_x[0] - slope * middle[1][0], S_x[0]]) / middle[2][0]


def _shares(edges: Array, levels: Array) -> tuple[Array, Array, Array, float]:
    """A_above / A, S_above / I (about the centroid), width, and the centroid's level."""
    low = np.array([edges[:, [1, 3]].min() - 1.0])
    A, first, _ = above(edges, low)
    c = float(first[0] / A[0])
    second = _second(edges) - A[0] * c * c
    area, moment, width = above(edges, levels)
    return area / A[0], (moment - c * area) / second, width, c


def _second(edges: Array) -> float:
    """int b^2 dA."""
    a1, b1, a2, b2 = edges.T
    t, w = (_GAUSS[0] + 1.0) / 2.0, _GAUSS[1] / 2.0
    a, b = a1[:, None] + t * (a2 - a1)[:, None], b1[:, None] + t * (b2 - b1)[:, None]
    return float(((a * b * b) @ w * (b2 - b1)).sum())


def _levels(edges: Array) -> tuple[Array, Array]:
    """Gauss levels and weights between the levels of the corners."""
    marks = np.unique(np.round(edges[:, [1, 3]].ravel(), 9))
    marks = marks[np.concatenate([[True], np.diff(marks) > 1e-3 * np.ptp(marks) / len(marks)])]
    mid, half = 0.5 * (marks[1:] + marks[:-1]), 0.5 * np.diff(marks)
    return ((mid[:, None] + half[:, None] * _GAUSS[0]).ravel(), (half[:, None] * _GAUSS[1]).ravel())


def tapered_shear(outline_at: Callable[[float], Outline], x: float, step: float, compliance: Array) -> Array:
    """(5, 5) form Q of `LineProperties.shear` of a tapered section from its `compliance` (2, 2), 1/mm^2."""
    Q = np.zeros((5, 5))
    nearby = _nearby(outline_at, x, step)
    for axis, (V, M, sign) in ((1, (1, 3, 1.0)), (0, (0, 4, -1.0))):
        form, _ = _form(nearby, step, axis)
        form = form * compliance[axis, axis] / form[0, 0]
        # About z, tension on the +y side belongs to a negative Mz, and -Mz grows with Vy.
        index, signs = np.array([V, 2, M]), np.array([1.0, 1.0, sign])
        Q[np.ix_(index, index)] += form * signs[:, None] * signs[None, :]
    Q[0, 1] = Q[1, 0] = compliance[0, 1]
    return Q
