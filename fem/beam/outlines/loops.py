"""Closed loops of lines and arcs: rounded polygons, moved and rounded copies."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import NamedTuple

from geometry.outline import Arc, Edge, Line, Outline, Point
from geometry.problem import RunError

_TINY = 1e-9


class OutlineError(RunError):
    """The dimensions do not make an outline."""

    def __init__(self, message: str) -> None:
        super().__init__("beam", message)


class Corner(NamedTuple):
    """Corner of a polygon, mm, and the radius that rounds it (0: sharp)."""

    y: float
    z: float
    radius: float = 0.0


def rounded_polygon(corners: Sequence[Corner]) -> tuple[Edge, ...]:
    """Loop through `corners`, each rounded by its own radius, in their order.

    Works for convex and re-entrant corners of any angle. Raises `OutlineError` when two neighbouring
    radii need more than the length of the side between them, or when two corners coincide.
    """
    n = len(corners)
    pieces = [_corner_arc(corners[i - 1], corners[i], corners[(i + 1) % n]) for i in range(n)]
    edges: list[Edge] = []
    for i, (_, corner, after) in enumerate(pieces):
        if corner is not None:
            edges.append(corner)
        following = pieces[(i + 1) % n][0]
        a, b = corners[i], corners[(i + 1) % n]
        along = ((following[0] - after[0]) * (b.y - a.y) + (following[1] - after[1]) * (b.z - a.z))
        length = math.hypot(b.y - a.y, b.z - a.z)
        if along < -_TINY * length * max(length, 1.0):
            raise OutlineError(
                f"the radii {a.radius:g} mm and {b.radius:g} mm at both ends of a side {length:.6g} mm long do not "
                f"fit: they need {length - along / length:.6g} mm. Make the radii smaller or the side longer."
            )
        if along > _TINY * length * max(length, 1.0):
            edges.append(Line(after, following))
    return tuple(edges)


def _corner_arc(a: Corner, b: Corner, c: Corner) -> tuple[Point, Arc | None, Point]:
    """Where the rounding of corner `b` begins, its arc (None when sharp) and where it ends."""
    ua, la = _unit(b, a)
    uc, lc = _unit(b, c)
    if min(la, lc) < _TINY:
        raise OutlineError(f"two corners of the outline coincide at ({b.y:g}, {b.z:g}) mm: give that side a length.")
    turn = ua[0] * uc[1] - ua[1] * uc[0]
    if b.radius <= 0.0 or abs(turn) < _TINY:
        return (b.y, b.z), None, (b.y, b.z)
    half = 0.5 * math.acos(max(-1.0, min(1.0, ua[0] * uc[0] + ua[1] * uc[1])))
    cut = b.radius / math.tan(half)
    begin = (b.y + cut * ua[0], b.z + cut * ua[1])
    end = (b.y + cut * uc[0], b.z + cut * uc[1])
    by, bz = ua[0] + uc[0], ua[1] + uc[1]
    scale = b.radius / math.sin(half) / math.hypot(by, bz)
    # travelling a -> b -> c turns left (counter-clockwise) exactly when the cross product of the
    # two sides seen from b is negative
    return begin, Arc(begin, end, (b.y + scale * by, b.z + scale * bz), ccw=turn < 0.0), end


def _unit(a: Corner, b: Corner) -> tuple[Point, float]:
    length = math.hypot(b.y - a.y, b.z - a.z)
    if length < _TINY:
        return (0.0, 0.0), 0.0
    return ((b.y - a.y) / length, (b.z - a.z) / length), length


def circle(radius: float, ccw: bool = True) -> tuple[Edge, ...]:
    """Full circle about the origin, as two arcs."""
    right, left = (radius, 0.0), (-radius, 0.0)
    return Arc(right, left, (0.0, 0.0), ccw), Arc(left, right, (0.0, 0.0), ccw)


def reversed_loop(loop: Sequence[Edge]) -> tuple[Edge, ...]:
    """The same loop run the other way round."""
    return tuple(
        Line(e.end, e.start) if isinstance(e, Line) else Arc(e.end, e.start, e.centre, not e.ccw)
        for e in reversed(loop)
    )


def moved(outline: Outline, dy: float, dz: float) -> Outline:
    """`outline` shifted by (dy, dz), mm."""

    def point(p: Point) -> Point:
        return p[0] + dy, p[1] + dz

    return _mapped(outline, point)


def turned(outline: Outline, angle: float) -> Outline:
    """`outline` turned counter-clockwise about the origin, rad."""
    c, s = math.cos(angle), math.sin(angle)

    def point(p: Point) -> Point:
        return c * p[0] - s * p[1], s * p[0] + c * p[1]

    return _mapped(outline, point)


def _mapped(outline: Outline, point: Callable[[Point], Point]) -> Outline:
    def loop(edges: Sequence[Edge]) -> tuple[Edge, ...]:
        return tuple(
            Line(point(e.start), point(e.end))
            if isinstance(e, Line)
            else Arc(point(e.start), point(e.end), point(e.centre), e.ccw)
            for e in edges
        )

    return Outline(loop(outline.outer), tuple(loop(inner) for inner in outline.inner))
