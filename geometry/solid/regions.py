"""Names of faces, told by where the faces lie and never by their number."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from geometry.outline import Arc, Edge
from geometry.solid.body import Piece
from geometry.solid.cuts import Tool
from geometry.solid.lofts import radius_of, sweep_of
from geometry.solid.samples import FaceSamples

TOLERANCE = 1e-4
"""How far (mm) a sample point may lie from the surface that names it."""


def side_distance(edge: Edge, y: np.ndarray, z: np.ndarray) -> np.ndarray:
    """Distance (mm) of points (n,) from one edge of a section."""
    if isinstance(edge, Arc):
        r = radius_of(edge)
        first = np.arctan2(edge.start[1] - edge.centre[1], edge.start[0] - edge.centre[0])
        angle = np.arctan2(z - edge.centre[1], y - edge.centre[0])
        turned = ((angle - first) if edge.ccw else (first - angle)) % (2.0 * np.pi)
        ends = np.minimum(np.hypot(y - edge.start[0], z - edge.start[1]), np.hypot(y - edge.end[0], z - edge.end[1]))
        return np.where(turned <= sweep_of(edge), np.abs(np.hypot(y - edge.centre[0], z - edge.centre[1]) - r), ends)
    dy, dz = edge.end[0] - edge.start[0], edge.end[1] - edge.start[1]
    size = dy * dy + dz * dz
    if size == 0.0:
        return np.hypot(y - edge.start[0], z - edge.start[1])
    t = np.clip(((y - edge.start[0]) * dy + (z - edge.start[1]) * dz) / size, 0.0, 1.0)
    return np.hypot(y - edge.start[0] - t * dy, z - edge.start[1] - t * dz)


def labels_at(point: np.ndarray, pieces: Sequence[Piece]) -> set[str]:
    """Labels of the section sides that a point (3,) in member axes lies on.

    Besides region names: ``~side`` on any side, ``~root fillet`` and the like on a corner of that kind.
    """
    found: set[str] = set()
    for piece in pieces:
        if not piece.stretch.start - TOLERANCE <= point[0] <= piece.stretch.end + TOLERANCE:
            continue
        for loop in piece.profile(float(point[0])).loops:
            for side in loop:
                if side_distance(side.edge, point[1:2], point[2:3])[0] <= TOLERANCE:
                    found.update(side.labels, {"~side"}, {f"~{side.wall}"} if side.wall else set())
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
    common: set[str] | None = None
    for point in s.points[~beside]:
        here = labels_at(point, pieces)
        common = here if common is None else common & here
        if not common:
            return set()
    return common or set()


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
