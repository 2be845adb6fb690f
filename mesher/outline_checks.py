"""Plane geometry of an outline, as far as meshing needs it: arcs, corners, area, gaps and crossings."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from geometry.outline import Arc, Edge, Outline
from geometry.problem import MeshError

Floats = NDArray[np.float64]


def swept_angle(arc: Arc) -> float:
    """Signed angle that an arc sweeps, rad; positive counter-clockwise."""
    (y0, z0), (y1, z1), (cy, cz) = arc.start, arc.end, arc.centre
    turn = math.atan2(z1 - cz, y1 - cy) - math.atan2(z0 - cz, y0 - cy)
    turn %= 2 * math.pi
    return turn if arc.ccw else turn - 2 * math.pi


def outline_area(outline: Outline) -> float:
    """Exact area by Green's theorem, mm^2; negative when the outer loop runs clockwise."""
    total = 0.0
    for loop in (outline.outer, *outline.inner):
        for edge in loop:
            (y0, z0), (y1, z1) = edge.start, edge.end
            total += (y0 * z1 - y1 * z0) / 2
            if isinstance(edge, Arc):  # the segment between chord and arc
                turn = swept_angle(edge)
                radius = math.hypot(y0 - edge.centre[0], z0 - edge.centre[1])
                total += radius**2 * (turn - math.sin(turn)) / 2
    return total


def reentrant_corners(loop: Sequence[Edge]) -> list[list[float]]:
    """Corners where the boundary, with the material on its left, turns right by more than 5 degrees."""
    corners = []
    for edge, following in zip(loop, [*loop[1:], loop[0]], strict=True):
        (ay, az), (by, bz) = _directions(edge)[1], _directions(following)[0]
        if ay * bz - az * by < -math.sin(math.radians(5.0)):
            corners.append(list(edge.end))
    return corners


def check_outline(outline: Outline, extent: float) -> None:
    """Refuse loops that are open or cross themselves or each other: the kernel may never end on them.

    Raises
    ------
    MeshError
        Says where, in mm.
    """
    gap = 1e-6 * extent
    chords: list[Floats] = []
    for number, loop in enumerate((outline.outer, *outline.inner)):
        for edge, following in zip(loop, [*loop[1:], loop[0]], strict=True):
            if math.dist(edge.end, following.start) > gap:
                raise MeshError(f"section outline: loop {number} is open between {edge.end} and {following.start} mm")
            chords.append(_polyline(edge))
    crossing = _crossing(np.concatenate(chords), gap)
    if crossing is not None:
        raise MeshError(f"section outline: its edges cross near ({crossing[0]:.5g}, {crossing[1]:.5g}) mm")


def _directions(edge: Edge) -> tuple[tuple[float, float], tuple[float, float]]:
    """Unit tangents at the start and the end of an edge."""
    if isinstance(edge, Arc):
        sign = 1.0 if edge.ccw else -1.0
        tangents = []
        for y, z in (edge.start, edge.end):
            dy, dz = y - edge.centre[0], z - edge.centre[1]
            r = math.hypot(dy, dz)
            tangents.append((-sign * dz / r, sign * dy / r))
        return tangents[0], tangents[1]
    dy, dz = edge.end[0] - edge.start[0], edge.end[1] - edge.start[1]
    length = math.hypot(dy, dz)
    return (dy / length, dz / length), (dy / length, dz / length)


def _polyline(edge: Edge) -> Floats:
    """(k, 2, 2) chords of an edge: starts and ends. An arc gets one for every 15 degrees."""
    if not isinstance(edge, Arc):
        return np.array([[edge.start, edge.end]])
    turn = swept_angle(edge)
    count = max(2, math.ceil(abs(turn) / math.radians(15.0)))
    start = math.atan2(edge.start[1] - edge.centre[1], edge.start[0] - edge.centre[0])
    angles = start + turn * np.arange(count + 1) / count
    radius = math.dist(edge.start, edge.centre)
    points = np.array(edge.centre) + radius * np.stack([np.cos(angles), np.sin(angles)], axis=1)
    points[0], points[-1] = edge.start, edge.end
    return np.stack([points[:-1], points[1:]], axis=1)


def _crossing(chords: Floats, gap: float) -> Floats | None:
    """A point where two chords meet inside at least one of them, or None. Ends that meet do not count."""
    a, d = chords[:, 0], chords[:, 1] - chords[:, 0]
    offset = a[None, :] - a[:, None]
    cross = d[:, None, 0] * d[None, :, 1] - d[:, None, 1] * d[None, :, 0]
    with np.errstate(divide="ignore", invalid="ignore"):
        s = (offset[..., 0] * d[None, :, 1] - offset[..., 1] * d[None, :, 0]) / cross
        t = (offset[..., 0] * d[:, None, 1] - offset[..., 1] * d[:, None, 0]) / cross
        margin = gap / np.linalg.norm(d, axis=1)
        i, j = margin[:, None], margin[None, :]
        meets = (s > -i) & (s < 1 + i) & (t > -j) & (t < 1 + j)
        hit = meets & (((s > i) & (s < 1 - i)) | ((t > j) & (t < 1 - j)))
    if not hit.any():
        return None
    first, second = np.argwhere(hit)[0]
    return a[first] + s[first, second] * d[first]
