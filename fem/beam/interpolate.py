"""Outlines between two outlines of the same make: every point moves in a straight line."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from geometry.outline import Arc, Edge, Line, Outline, Point


def loops(outline: Outline) -> tuple[tuple[Edge, ...], ...]:
    """Outer loop and voids."""
    return (outline.outer, *outline.inner)


def points(outline: Outline) -> NDArray[np.float64]:
    """(k, 2) start points and centres of all edges, in order."""
    found = []
    for loop in loops(outline):
        for edge in loop:
            found.append(edge.start)
            if isinstance(edge, Arc):
                found.append(edge.centre)
    return np.array(found)


def same_make(a: Outline, b: Outline) -> bool:
    """Whether two outlines have the same kinds of edges in the same order."""
    def make(o: Outline) -> list[list[type]]:
        return [[type(e) for e in loop] for loop in loops(o)]

    return make(a) == make(b)


def between(a: Outline, b: Outline, share: float) -> Outline:
    """The outline at `share` of the way from `a` to `b`, which must be of the same make."""
    def mix(p: Point, q: Point) -> Point:
        return p[0] + share * (q[0] - p[0]), p[1] + share * (q[1] - p[1])

    def edge(e: Edge, f: Edge) -> Edge:
        if isinstance(e, Arc) and isinstance(f, Arc):
            return Arc(mix(e.start, f.start), mix(e.end, f.end), mix(e.centre, f.centre), e.ccw)
        return Line(mix(e.start, f.start), mix(e.end, f.end))

    mixed = [tuple(edge(e, f) for e, f in zip(p, q, strict=True)) for p, q in zip(loops(a), loops(b), strict=True)]
    return Outline(mixed[0], tuple(mixed[1:]))
