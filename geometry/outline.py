"""The outline of a section: closed loops of straight lines and circular arcs.

Only the *type* is shared. The solid builder and the beam model each make and interpolate outlines by
themselves, so that one slip cannot reach both.
"""

from __future__ import annotations

from dataclasses import dataclass

Point = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Line:
    """Straight edge from `start` to `end`, both ``(y, z)`` in mm."""

    start: Point
    end: Point


@dataclass(frozen=True, slots=True)
class Arc:
    """Circular edge from `start` to `end` about `centre`, all ``(y, z)`` in mm.

    ``ccw`` is true when the edge runs counter-clockwise about its centre (y to the right, z up).
    A full circle is two arcs.
    """

    start: Point
    end: Point
    centre: Point
    ccw: bool = True


Edge = Line | Arc


@dataclass(frozen=True, slots=True)
class Outline:
    """Section at one station.

    Attributes
    ----------
    outer
        Closed loop, counter-clockwise.
    inner
        Closed loops of the voids, clockwise.
    """

    outer: tuple[Edge, ...]
    inner: tuple[tuple[Edge, ...], ...] = ()
