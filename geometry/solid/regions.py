"""Names of faces, told by where the faces lie and never by their number."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from geometry.outline import Arc, Edge
from geometry.part import Member
from geometry.solid.body import Piece
from geometry.solid.lofts import radius_of, sweep_of
from geometry.solid.samples import FaceSamples, sample_faces

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


def between(a: Edge, b: Edge, t: float) -> Edge:
    """The side a fraction `t` of the way from `a` to `b`."""

    def mix(p: tuple[float, float], q: tuple[float, float]) -> tuple[float, float]:
        return ((1.0 - t) * p[0] + t * q[0], (1.0 - t) * p[1] + t * q[1])

    if isinstance(a, Arc) and isinstance(b, Arc):
        return Arc(mix(a.start, b.start), mix(a.end, b.end), mix(a.centre, b.centre), a.ccw)
    return type(a)(mix(a.start, b.start), mix(a.end, b.end))


def on_side(s: FaceSamples, piece: Piece, loop: int, index: int) -> bool:
    """Whether every sample lies on one side of one piece, and is not a wall across the member."""
    x = s.points[:, 0]
    a, b = piece.first.loops[loop][index].edge, piece.last.loops[loop][index].edge
    x0, x1 = piece.stretch.start, piece.stretch.end
    if np.any(x < x0 - TOLERANCE) or np.any(x > x1 + TOLERANCE):
        return False
    if np.all(np.abs(s.normals[:, 0]) > 1.0 - 1e-9):
        return False
    for point in s.points:
        edge = between(a, b, (point[0] - x0) / (x1 - x0))
        if side_distance(edge, point[1:2], point[2:3])[0] > TOLERANCE:
            return False
    return True


def name_faces(solid: Any, member: Member, pieces: Sequence[Piece]) -> dict[str, tuple[int, ...]]:
    """Face indices of every region of `member`; `solid` is in member axes."""
    samples = sample_faces(solid)
    found: dict[str, set[int]] = {}
    length = pieces[-1].stretch.end
    for i, s in enumerate(samples):
        for name, at in (("start", 0.0), ("end", length)):
            if np.all(np.abs(s.points[:, 0] - at) < TOLERANCE) and np.all(np.abs(s.normals[:, 0]) > 1.0 - 1e-6):
                found.setdefault(name, set()).add(i)
        for piece in pieces:
            for k, loop in enumerate(piece.first.loops):
                for j, side in enumerate(loop):
                    if side.labels and on_side(s, piece, k, j):
                        for label in side.labels:
                            found.setdefault(label, set()).add(i)
    return {f"{member.name}.{name}": tuple(sorted(ids)) for name, ids in sorted(found.items())}
