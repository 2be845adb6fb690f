"""Cutting outlines along a line y = const or z = const, exactly: lines stay lines and arcs stay arcs."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from itertools import pairwise

from fem.beam.section.integrals import sweep
from geometry.outline import Arc, Edge, Line, Outline, Point

Loop = tuple[Edge, ...]

_NUDGE = 1e-9


def clip(outline: Outline, axis: int, level: float, above: bool) -> list[Outline]:
    """What lies above (or below) ``level`` mm along axis 0 (y) or 1 (z): disjoint pieces, none when all is cut off.

    A cut that runs through a corner, along an edge or along the tangent of an arc is ambiguous: it is moved by a
    few 1e-9 of the section's size, off the kept side, which changes the area by as much of it.
    """
    loops = (outline.outer, *outline.inner)
    level = _clear(loops, axis, level, above)
    whole: list[Loop] = []
    chains: list[list[Edge]] = []
    for loop in loops:
        pieces = [piece for edge in loop for piece in _split(edge, axis, level)]
        kept = [(_middle(piece)[axis] > level) == above for piece in pieces]
        if all(kept):
            whole.append(loop)
        else:
            chains += _chains(pieces, kept)
    outers = _close(chains, axis)
    if not chains and outline.outer in whole:
        return [outline]
    voids = [loop for loop in whole if loop is not outline.outer]
    return [Outline(o, tuple(v for v in voids if encloses(o, v[0].start))) for o in outers]


def take_out(
    outlines: Sequence[Outline], axis: int, low: float, high: float, other: tuple[float, float] | None = None
) -> list[Outline]:
    """The outlines less the strip from `low` to `high` along `axis`, or less that strip between two levels of `other`.

    With `other` the pieces left beside the strip touch those above and below it: right for integrals, not for a
    question of connection.
    """
    left: list[Outline] = []
    for outline in outlines:
        left += clip(outline, axis, low, above=False) + clip(outline, axis, high, above=True)
        if other is None:
            continue
        for part in clip(outline, axis, low, above=True):
            for strip in clip(part, axis, high, above=False):
                left += clip(strip, 1 - axis, other[0], above=False) + clip(strip, 1 - axis, other[1], above=True)
    return left


def crossings(edge: Edge, axis: int, level: float) -> list[Point]:
    """Points of `edge` on the line, its ends included when they lie on it, in order along the edge."""
    if isinstance(edge, Line):
        a, b = edge.start[axis], edge.end[axis]
        if a == b:
            return [edge.start, edge.end] if a == level else []
        t = (level - a) / (b - a)
        if not -1e-12 <= t <= 1 + 1e-12:
            return []
        return [tuple(level if k == axis else edge.start[k] + t * (edge.end[k] - edge.start[k]) for k in (0, 1))]  # type: ignore[list-item]
    radius, first, turn = sweep(edge)
    reach = level - edge.centre[axis]
    if abs(reach) > radius:
        return []
    half = math.sqrt(max(radius * radius - reach * reach, 0.0))
    found = []
    for other in (half, -half):
        ry, rz = (reach, other) if axis == 0 else (other, reach)
        ahead = math.atan2(rz, ry) - first
        ahead = ahead % (2 * math.pi) if turn > 0 else -((-ahead) % (2 * math.pi))
        if abs(ahead) <= abs(turn) + 1e-12:
            found.append((abs(ahead), (edge.centre[0] + ry, edge.centre[1] + rz)))
    return [point for _, point in sorted(found)]


def encloses(loop: Sequence[Edge], point: Point) -> bool:
    """Whether a loop runs round `point` (winding number of a polygon with 24 sides to each arc)."""
    total = 0.0
    for edge in loop:
        spots = [edge.start, *_along(edge, 24), edge.end]
        for (ay, az), (by, bz) in pairwise(spots):
            ay, az, by, bz = ay - point[0], az - point[1], by - point[0], bz - point[1]
            total += math.atan2(ay * bz - az * by, ay * by + az * bz)
    return abs(total) > math.pi


def _along(edge: Edge, n: int) -> Iterator[Point]:
    if isinstance(edge, Arc):
        radius, first, turn = sweep(edge)
        for k in range(1, n):
            a = first + turn * k / n
            yield edge.centre[0] + radius * math.cos(a), edge.centre[1] + radius * math.sin(a)


def _clear(loops: Sequence[Loop], axis: int, level: float, above: bool) -> float:
    critical: list[float] = []
    for edge in (e for loop in loops for e in loop):
        critical += [edge.start[axis], edge.end[axis]]
        if isinstance(edge, Arc):
            radius = sweep(edge)[0]
            critical += [edge.centre[axis] - radius, edge.centre[axis] + radius]
    tol = _NUDGE * max(max(critical) - min(critical), 1e-300)
    for step in range(1, 1000):
        if all(abs(c - level) > tol for c in critical):
            break
        level += (1 if above else -1) * step * 2 * tol
    return level


def _split(edge: Edge, axis: int, level: float) -> list[Edge]:
    cuts = crossings(edge, axis, level)
    stops = [edge.start, *cuts, edge.end]
    pairs = pairwise(stops)
    if isinstance(edge, Line):
        return [Line(a, b) for a, b in pairs]
    return [Arc(a, b, edge.centre, edge.ccw) for a, b in pairs]


def _middle(edge: Edge) -> Point:
    if isinstance(edge, Line):
        return (edge.start[0] + edge.end[0]) / 2, (edge.start[1] + edge.end[1]) / 2
    return next(_along(edge, 2))


def _chains(pieces: Sequence[Edge], kept: Sequence[bool]) -> list[list[Edge]]:
    """Runs of kept pieces round a loop that is cut at least once."""
    n = len(pieces)
    first = next((i for i in range(n) if kept[i] and not kept[i - 1]), None)
    if first is None:
        return []
    chains: list[list[Edge]] = []
    for k in range(n):
        i = (first + k) % n
        if kept[i]:
            if not kept[i - 1]:
                chains.append([])
            chains[-1].append(pieces[i])
    return chains


def _close(chains: Sequence[Sequence[Edge]], axis: int) -> list[Loop]:
    """Closed loops from chains that begin and end on the cut.

    Sorted along the cut, its crossings bound material in consecutive pairs: each chain goes on, straight along
    the cut, to the partner of the crossing it ended at.
    """
    other = 1 - axis
    ends = sorted(
        [(chain[0].start[other], i, True) for i, chain in enumerate(chains)]
        + [(chain[-1].end[other], i, False) for i, chain in enumerate(chains)]
    )
    following: dict[int, int] = {}
    for a, b in zip(ends[0::2], ends[1::2], strict=True):
        begin, end = (a, b) if a[2] else (b, a)
        following[end[1]] = begin[1]
    loops: list[Loop] = []
    while following:
        first = next(iter(following))
        loop: list[Edge] = []
        i = first
        while i in following:
            loop += chains[i]
            j = following.pop(i)
            loop.append(Line(loop[-1].end, chains[j][0].start))
            i = j
        loops.append(tuple(loop))
    return loops
