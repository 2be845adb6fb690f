"""Names of faces, told by where the faces lie and never by their number."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from geometry.outline import Arc, Edge
from geometry.solid.body import Piece, between
from geometry.solid.cuts import Tool
from geometry.solid.samples import FaceSamples

TOLERANCE = 1e-4
"""How far (mm) a sample point may lie from the surface that names it."""


def side_distance(edge: Edge, y: np.ndarray, z: np.ndarray) -> np.ndarray:
    """Distance (mm) of points (n,) from one edge of a section, or each from its own: ends and centre may be (n,)."""
    ends = np.minimum(np.hypot(y - edge.start[0], z - edge.start[1]), np.hypot(y - edge.end[0], z - edge.end[1]))
    if isinstance(edge, Arc):
        cy, cz = edge.centre
        first, last, angle = (np.arctan2(b - cz, a - cy) for a, b in (edge.start, edge.end, (y, z)))
        turned, turn = ((v - first if edge.ccw else first - v) % (2.0 * np.pi) for v in (angle, last))
        off = np.abs(np.hypot(y - cy, z - cz) - np.hypot(edge.start[0] - cy, edge.start[1] - cz))
        return np.where(turned <= np.where(turn > 0.0, turn, 2.0 * np.pi), off, ends)
    dy, dz = edge.end[0] - edge.start[0], edge.end[1] - edge.start[1]
    size = np.asarray(dy * dy + dz * dz)
    along = (y - edge.start[0]) * dy + (z - edge.start[1]) * dz
    t = np.clip(along / np.where(size > 0.0, size, 1.0), 0.0, 1.0)
    return np.hypot(y - edge.start[0] - t * dy, z - edge.start[1] - t * dz)


def labels_at(points: np.ndarray, pieces: Sequence[Piece]) -> list[set[str]]:
    """Labels of the section sides that each of the points (n, 3), in member axes, lies on.

    Besides region names: ``~side`` on any side, ``~root fillet`` and the like on a corner of that kind.
    """
    found: list[set[str]] = [set() for _ in points]
    for piece in pieces:
        x = points[:, 0]
        here = np.flatnonzero((x >= piece.stretch.start - TOLERANCE) & (x <= piece.stretch.end + TOLERANCE))
        x, y, z = points[here].T
        for first, last in zip(piece.first.loops, piece.last.loops, strict=True):
            for a, b in zip(first, last, strict=True):
                on = side_distance(between(a.edge, b.edge, piece.fraction(x)), y, z) <= TOLERANCE
                for k in here[on]:
                    found[k].update(a.labels, {"~side"}, {f"~{a.wall}"} if a.wall else set())
    return found


def side_labels(s: FaceSamples, pieces: Sequence[Piece]) -> set[str]:
    """Labels that every sample of a face carries; none for a wall across the member (shoulder, end).

    A shoulder fillet adds a corner to the side faces that run past it flush: samples beside a filleted step are
    left out, and a face that lies there wholly (the fillet itself) has no label.
    """
    if np.all(np.abs(s.normals[:, 0]) > 1.0 - 1e-9):
        return set()
    beside = np.zeros(len(s.points), bool)
    for stretch in (p.stretch for p in pieces if p.stretch.step and p.stretch.shoulder > 0.0):
        beside |= np.abs(s.points[:, 0] - stretch.start) <= stretch.shoulder + TOLERANCE
    here = labels_at(s.points[~beside], pieces)
    return set.intersection(*here) if here else set()


def end_label(s: FaceSamples, length: float) -> str:
    """``start`` or ``end`` for a plane face across the member there, else empty."""
    if np.all(np.abs(s.normals[:, 0]) > 1.0 - 1e-6):
        for name, at in (("start", 0.0), ("end", length)):
            if np.all(np.abs(s.points[:, 0] - at) < TOLERANCE):
                return name
    return ""


def on_tool(s: FaceSamples, tool: Tool) -> bool:
    """Whether every sample lies on the wall that a tool leaves."""
    k = 2 if tool.axis == "y" else 1
    along = s.points[:, 3 - k]
    if np.any(along < tool.low - TOLERANCE) or np.any(along > tool.high + TOLERANCE):
        return False
    distance = np.min([side_distance(e, s.points[:, 0], s.points[:, k]) for e in tool.loop], axis=0)
    return bool(np.all(distance <= TOLERANCE) and np.all(np.abs(s.normals[:, 3 - k]) < 1e-6))
