"""Where a straight line runs inside closed loops of lines and arcs."""

from __future__ import annotations

import math
from collections.abc import Iterable

from geometry.outline import Arc, Edge
from geometry.solid.lofts import radius_of, sweep_of

Interval = tuple[float, float]


def crossings(edges: Iterable[Edge], fixed: int, value: float) -> list[float]:
    """Sorted places where the line ``coordinate[fixed] = value`` crosses the loops, in the other coordinate."""
    other, found = 1 - fixed, []
    for edge in edges:
        if isinstance(edge, Arc):
            found += _arc_crossings(edge, fixed, value)
            continue
        a, b = edge.start[fixed], edge.end[fixed]
        if (a <= value) != (b <= value):
            t = (value - a) / (b - a)
            found.append(edge.start[other] + t * (edge.end[other] - edge.start[other]))
    return sorted(found)


def _arc_crossings(arc: Arc, fixed: int, value: float) -> list[float]:
    r, c = radius_of(arc), arc.centre
    s = (value - c[fixed]) / r if r > 0.0 else 2.0
    if abs(s) >= 1.0:
        return []
    first = math.atan2(arc.start[1] - c[1], arc.start[0] - c[0])
    base = math.acos(s) if fixed == 0 else math.asin(s)
    angles = (base, -base) if fixed == 0 else (base, math.pi - base)
    found = []
    for angle in angles:
        turned = ((angle - first) if arc.ccw else (first - angle)) % (2.0 * math.pi)
        if turned < sweep_of(arc):
            found.append(c[1 - fixed] + r * (math.sin(angle) if fixed == 0 else math.cos(angle)))
    return found


def inside(edges: Iterable[Edge], fixed: int, value: float) -> list[Interval]:
    """Intervals of the line ``coordinate[fixed] = value`` inside the loops (voids left out).

    A line through a corner can be counted once or thrice; it is then moved aside by a millionth of a mm.
    """
    listed = list(edges)
    for nudge in (0.0, 1e-6, -1e-6, 3e-6, -3e-6):
        cuts = crossings(listed, fixed, value + nudge)
        if len(cuts) % 2 == 0:
            return [(cuts[i], cuts[i + 1]) for i in range(0, len(cuts), 2)]
    return []


def length_within(intervals: Iterable[Interval], low: float, high: float) -> float:
    """Total length (mm) of `intervals` between `low` and `high`."""
    return sum(max(0.0, min(b, high) - max(a, low)) for a, b in intervals)
