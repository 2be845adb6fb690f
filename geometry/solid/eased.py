"""Radii on a section's outer corners named by the side they end: ``top left`` and the like."""

from __future__ import annotations

import math
from collections.abc import Mapping

from geometry.outline import Arc, Line, Point
from geometry.problem import SolidError
from geometry.solid.profile import Profile, Side

NAMES = ("top left", "top right", "bottom left", "bottom right")


def edge_name(text: str) -> str:
    """`text` in the order of `NAMES` (``left top`` is ``top left``), or empty when it is no edge along the member."""
    words = set(text.split())
    return next((name for name in NAMES if set(name.split()) == words), "")


def eased(profile: Profile, radii: Mapping[str, float]) -> Profile:
    """`profile` with the named corners rounded: the left- or rightmost corner of its top or bottom side.

    A corner radius that is already there is replaced. The radius lies in the section's plane, so that the
    section is the same whether the member tapers or not.

    Raises
    ------
    SolidError
        The section has no such corner between straight sides, or the radius does not fit.
    """
    outer = profile.outer
    for name, radius in radii.items():
        outer = _eased_corner(outer, name, radius)
    return Profile(outer, profile.inner)


def _eased_corner(outer: tuple[Side, ...], name: str, radius: float) -> tuple[Side, ...]:
    side, hand = name.split()
    at_end = (side == "top") == (hand == "left")
    outwards = -1.0 if hand == "left" else 1.0
    ends = [
        (outwards * (s.edge.end if at_end else s.edge.start)[0], i)
        for i, s in enumerate(outer)
        if side in s.labels and isinstance(s.edge, Line)
    ]
    if not ends:
        raise SolidError(f"radius on {name}: the section has no straight {side} side.")
    n, i = len(outer), max(ends)[1]
    step = 1 if at_end else -1
    j = (i + step) % n
    dropped = j if isinstance(outer[j].edge, Arc) else None
    if dropped is not None:
        j = (j + step) % n
    first, second = (i, j) if at_end else (j, i)
    a, b = outer[first].edge, outer[second].edge
    if not (isinstance(a, Line) and isinstance(b, Line)):
        raise SolidError(f"radius on {name}: the corner there does not lie between two straight sides.")
    into, arc = _arc_between(a, b, radius, name)
    arc_side = Side(arc, (), f"edge radius {name}")
    sides: list[Side] = []
    for k, s in enumerate(outer):
        if k == first:
            sides += [Side(Line(a.start, into), s.labels, s.wall), arc_side]
        elif k == second:
            sides.append(Side(Line(arc.end, b.end), s.labels, s.wall))
        elif k != dropped:
            sides.append(s)
    return tuple(sides)


def _arc_between(a: Line, b: Line, radius: float, name: str) -> tuple[Point, Arc]:
    """End of the shortened `a`, and the arc from there to `b`."""
    u, v = _direction(a.end, a.start), _direction(b.start, b.end)
    cross = u[0] * v[1] - u[1] * v[0]
    if abs(cross) < 1e-9:
        raise SolidError(f"radius on {name}: the two sides there are parallel.")
    # Where the two straight sides would meet.
    t = ((b.start[0] - a.start[0]) * v[1] - (b.start[1] - a.start[1]) * v[0]) / cross
    corner = (a.start[0] + t * u[0], a.start[1] + t * u[1])
    half = 0.5 * math.acos(max(-1.0, min(1.0, u[0] * v[0] + u[1] * v[1])))
    reach, depth = radius / math.tan(half), radius / math.sin(half)
    room = min(math.dist(corner, a.start), math.dist(corner, b.end))
    if reach > room * (1.0 + 1e-9):
        fits = room * math.tan(half)
        raise SolidError(
            f"radius on {name}: a radius of {radius:g} mm does not fit; the largest that fits is about {fits:.3g} mm."
        )
    w = _direction((0.0, 0.0), (u[0] + v[0], u[1] + v[1]))
    start = (corner[0] + reach * u[0], corner[1] + reach * u[1])
    end = (corner[0] + reach * v[0], corner[1] + reach * v[1])
    return start, Arc(start, end, (corner[0] + depth * w[0], corner[1] + depth * w[1]), cross < 0.0)


def _direction(a: Point, b: Point) -> Point:
    size = math.dist(a, b)
    return ((b[0] - a[0]) / size, (b[1] - a[1]) / size) if size > 0.0 else (0.0, 0.0)
