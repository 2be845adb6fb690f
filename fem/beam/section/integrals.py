"""Area, centroid, second moments and extreme points of an outline, from its boundary alone."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

from geometry.outline import Arc, Edge, Outline, Point

_LINE = np.polynomial.legendre.leggauss(3)
_ARC = np.polynomial.legendre.leggauss(24)


SweptEdge = tuple[Edge, tuple[float, float, float] | None]
"""An edge, with the radius and the angles of an arc (see `sweep`)."""


@dataclass(frozen=True)
class OutlineIntegrals:
    """Exact integrals over an outline (or several), mm.

    ``Iyy`` = int z^2 dA, ``Izz`` = int y^2 dA, ``Iyz`` = int y z dA, all about the centroid.
    """

    area: float
    yc: float
    zc: float
    Iyy: float
    Izz: float
    Iyz: float
    I1: float
    I2: float
    principal_angle: float
    edges: Sequence[SweptEdge] = field(repr=False, compare=False)

    @cached_property
    def extremes(self) -> NDArray[np.float64]:
        """(4, 2) the points top, bottom, left, right. Found when asked for: most sections along a member never are."""
        points = _extremes(self.edges)
        points.flags.writeable = False
        return points

    @property
    def W_top(self) -> float:
        """Iyy / |z - zc| at the top, mm^3; the others likewise, with Izz and y at the left and right."""
        return self.Iyy / self._reach(0)

    @property
    def W_bottom(self) -> float:
        return self.Iyy / self._reach(1)

    @property
    def W_left(self) -> float:
        return self.Izz / self._reach(2)

    @property
    def W_right(self) -> float:
        return self.Izz / self._reach(3)

    def _reach(self, which: int) -> float:
        axis = 1 if which < 2 else 0
        return float(abs(self.extremes[which, axis] - (self.yc, self.zc)[axis]))


def outline_integrals(outline: Outline | Sequence[Outline]) -> OutlineIntegrals:
    """Integrals of one outline, or of several disjoint ones taken as one section.

    Green's theorem turns each area integral into one along the boundary. The integrands are polynomials
    on a line (three Gauss points are exact) and trigonometric polynomials of order 4 on an arc (24 points
    over at most a full turn: rounding error only). Shifting the origin to a point of the outline first
    keeps the digits of a section drawn far from its origin.
    """
    return _integrals((outline,) if isinstance(outline, Outline) else tuple(outline))


@lru_cache(maxsize=1024)
def _integrals(outlines: tuple[Outline, ...]) -> OutlineIntegrals:
    """Kept, as the same sections are asked for again and again along a member."""
    origin = outlines[0].outer[0].start
    edges = [(edge, sweep(edge) if isinstance(edge, Arc) else None) for edge in _edges(outlines)]
    m = _moments(edges, origin)
    area, sy, sz, syy, syz, szz = (float(v) for v in m)
    y, z = sy / area, sz / area
    Izz, Iyz, Iyy = syy - area * y * y, syz - area * y * z, szz - area * z * z
    yc, zc = y + origin[0], z + origin[1]
    I1, I2, angle = principal_moments(Iyy, Izz, Iyz)
    return OutlineIntegrals(area, yc, zc, Iyy, Izz, Iyz, I1, I2, angle, edges)


def principal_moments(Iyy: float, Izz: float, Iyz: float) -> tuple[float, float, float]:
    """I1 >= I2 and the angle (rad, -pi/2 to pi/2) from y to the axis about which I1 is taken."""
    mean, half = (Iyy + Izz) / 2, (Iyy - Izz) / 2
    radius = math.hypot(half, Iyz)
    # about an axis at angle a from y: I(a) = mean + half cos 2a - Iyz sin 2a; rounding must not
    # turn the axes of a symmetric section
    angle = 0.0 if radius <= 1e-12 * mean else 0.5 * math.atan2(-Iyz, half)
    return mean + radius, mean - radius, angle


def _edges(outlines: Sequence[Outline]) -> Iterator[Edge]:
    for outline in outlines:
        for loop in (outline.outer, *outline.inner):
            yield from loop


def sweep(arc: Arc) -> tuple[float, float, float]:
    """Radius, start angle and signed angle turned through, rad (never zero: coincident ends are a full turn)."""
    cy, cz = arc.centre
    first = math.atan2(arc.start[1] - cz, arc.start[0] - cy)
    last = math.atan2(arc.end[1] - cz, arc.end[0] - cy)
    turn = (last - first) % (2 * math.pi) if arc.ccw else -((first - last) % (2 * math.pi))
    if abs(turn) < 1e-12:
        turn = 2 * math.pi if arc.ccw else -2 * math.pi
    return math.hypot(arc.start[0] - cy, arc.start[1] - cz), first, turn


def _moments(edges: Sequence[SweptEdge], origin: Point) -> NDArray[np.float64]:
    """(6,) A, int y, int z, int y^2, int y z, int z^2 about `origin`: all edges' Gauss points in one go."""
    lines = np.array([(*e.start, *e.end) for e, arc in edges if arc is None]).reshape(-1, 4)
    arcs = np.array([(*e.centre, *arc) for e, arc in edges if isinstance(e, Arc) and arc is not None]).reshape(-1, 5)
    y0, z0, y1, z1 = lines.T[:, :, None]
    s = 0.5 * (_LINE[0] + 1)
    cy, cz, radius, first, turn = arcs.T[:, :, None]
    angle = first + 0.5 * turn * (_ARC[0] + 1)
    across, up = radius * np.cos(angle), radius * np.sin(angle)
    y = np.concatenate([(y0 - origin[0] + s * (y1 - y0)).ravel(), (cy - origin[0] + across).ravel()])
    z = np.concatenate([(z0 - origin[1] + s * (z1 - z0)).ravel(), (cz - origin[1] + up).ravel()])
    dz = np.concatenate([(0.5 * _LINE[1] * (z1 - z0)).ravel(), (_ARC[1] * 0.5 * turn * across).ravel()])
    ydz, yydz = y * dz, y * y * dz
    return np.array([dz @ y, y @ ydz / 2, z @ ydz, y @ yydz / 3, z @ yydz / 2, z @ (z * ydz)])


def extreme_points(outlines: Sequence[Outline]) -> NDArray[np.float64]:
    """(4, 2) points top, bottom, left, right of the outlines (see `SectionProperties.extremes`)."""
    return _extremes([(edge, sweep(edge) if isinstance(edge, Arc) else None) for edge in _edges(outlines)])


def _extremes(edges: Sequence[SweptEdge]) -> NDArray[np.float64]:
    corners = [p for e, _ in edges for p in (e.start, e.end)]
    values = [p[0] for p in corners], [p[1] for p in corners]
    size = max(abs(v) for some in values for v in (min(some), max(some))) or 1.0
    return np.array([_extreme(edges, corners, values[axis], axis, sign, 1e-9 * size)
                     for axis, sign in ((1, 1), (1, -1), (0, -1), (0, 1))])


def _extreme(edges: Sequence[SweptEdge], corners: Sequence[Point], values: Sequence[float], axis: int, sign: int,
             tol: float) -> Point:
    """Farthest point along +-axis; the middle of the side when flat; of several the upper one, then the left one.

    `values` are the coordinates of the `corners` along the axis.
    """
    far = max(values) if sign > 0 else -min(values)
    rounds = _foremost_of_arcs(edges, axis, sign)
    far = max([far, *(sign * p[axis] for p in rounds)])
    level = [p for p, v in zip(corners, values, strict=True) if sign * v >= far - tol]
    level += [p for p in rounds if sign * p[axis] >= far - tol]
    flat = [((e.start[0] + e.end[0]) / 2, (e.start[1] + e.end[1]) / 2) for e, arc in edges
            if arc is None and sign * e.start[axis] >= far - 2 * tol and abs(e.start[axis] - e.end[axis]) <= tol]
    level = [p for p in flat if sign * p[axis] >= far - tol] or level
    return max(level, key=lambda p: (round(p[1] / tol), -p[0]))


def _foremost_of_arcs(edges: Sequence[SweptEdge], axis: int, sign: int) -> list[Point]:
    """The points of arcs, within their sweep, that are farthest along +-axis."""
    direction = (math.pi / 2 if axis else 0.0) + (0.0 if sign > 0 else math.pi)
    found: list[Point] = []
    for e, arc in edges:
        if isinstance(e, Arc) and arc is not None:
            radius, first, turn = arc
            ahead = (direction - first) % (2 * math.pi) if turn > 0 else -((first - direction) % (2 * math.pi))
            if abs(ahead) <= abs(turn):
                found.append((e.centre[0] + radius * math.cos(direction), e.centre[1] + radius * math.sin(direction)))
    return found
