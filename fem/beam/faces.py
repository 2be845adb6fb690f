"""Which edges of an outline make up a named face, and what they show at one station."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from fem.beam.interpolate import between
from fem.beam.outlines.net_sections import Taken
from fem.beam.regions import Strip
from geometry.outline import Arc, Edge, Line, Outline
from geometry.problem import RunError

Array = NDArray[np.float64]
_LINE = np.polynomial.legendre.leggauss(3)
_ARC = np.polynomial.legendre.leggauss(16)
OUTWARD = {"top": (0.0, 1.0), "bottom": (0.0, -1.0), "left": (-1.0, 0.0), "right": (1.0, 0.0)}
FACES = (*OUTWARD, "surface", "bore", "web_left", "web_right")


def face_edges(outline: Outline, face: str, tips: bool = False) -> list[tuple[int, int]]:
    """(loop, edge) of each edge of a face; loop 0 is the outer one.

    ``top``: the straight edges at the highest z whose outward normal points up, and so on; ``surface``: the whole
    outer loop; ``bore``: the inner loops; ``web_left``, ``web_right``: the straight upright edge that looks that way
    and lies deepest inside (the back of a channel is its web's left side). With `tips`, ``left`` and ``right`` are the
    tips of both flanges, whichever reaches farther.
    """
    loops = (outline.outer, *outline.inner)
    if face == "surface":
        return [(0, i) for i in range(len(loops[0]))]
    if face == "bore":
        return [(k, i) for k, loop in enumerate(loops) if k for i in range(len(loop))]
    points = np.array([e.start for e in outline.outer])
    size = float(np.ptp(points, axis=0).max())
    if face in OUTWARD and not (tips and face in ("left", "right")):
        n = np.array(OUTWARD[face])
        extreme = float((points @ n).max())
        return [(0, i) for i, e in enumerate(outline.outer) if isinstance(e, Line)
                and _normal(e) @ n > 0.999 and abs(np.array(e.start) @ n - extreme) < 1e-6 * size]
    n = np.array((-1.0, 0.0) if face.endswith("left") else (1.0, 0.0))
    upright = [i for i, e in enumerate(outline.outer) if isinstance(e, Line) and e.start != e.end
               and _normal(e) @ n > 0.999]
    inmost = min(upright, key=lambda i: float(points[i] @ n), default=-1)
    if face in OUTWARD:
        return [(0, i) for i in upright if i != inmost]
    return [(0, inmost)] if upright else []


def strip(
    x: float, share: float, before: Outline, after: Outline, step: float, edges: list[tuple[int, int]],
    across: tuple[int, float, float] | None = None, taken: Sequence[Taken] = (),
) -> Strip:
    """What `edges` show at `x`; nothing (no points) where cuts have `taken` them.

    `before` and `after` are outlines a distance `step` apart, and `x` lies at `share` of it: between stations every
    point of an outline moves in a straight line. `across` keeps only the part of straight edges whose coordinate 0 (y)
    or 1 (z) lies in a range.

    Raises
    ------
    RunError
        Stage ``beam``: the face has no width between the limits of `across`.
    """
    points, normals = [np.zeros((0, 3))], [np.zeros((0, 3))]
    here = between(before, after, share)
    wide = False
    for loop, i in edges:
        edge, far = _loop(before, loop)[i], _loop(after, loop)[i]
        first, last = (0.0, 1.0) if across is None else _clip(_loop(here, loop)[i], *across)
        wide |= last > first
        for start, end in left_of(_loop(here, loop)[i], first, last, taken):
            t, w = _ARC if isinstance(edge, Arc) else _LINE
            t = start + (end - start) * (t + 1.0) / 2.0
            w = w * (end - start) / 2.0
            (r0, t0), (r1, t1) = curve(edge, t), curve(far, t)
            r, rt, rx = r0 + share * (r1 - r0), t0 + share * (t1 - t0), (r1 - r0) / step
            # material lies to the left of the edge: the outward area vector of r(t, x)
            n = np.stack([rx[:, 1] * rt[:, 0] - rx[:, 0] * rt[:, 1], rt[:, 1], -rt[:, 0]], axis=1)
            points.append(np.column_stack([np.full(len(t), x), r]))
            normals.append(n * w[:, None])
    if not wide:
        raise RunError("beam", f"a region has no width at x = {x:.6g} mm; check the patch's range across the face")
    normal = np.vstack(normals)
    return Strip(np.vstack(points), np.linalg.norm(normal, axis=1), normal)


def left_of(edge: Edge, first: float, last: float, taken: Sequence[Taken]) -> list[tuple[float, float]]:
    """Stretches of an edge's parameter between `first` and `last` that no cut has taken."""
    levels = [(t.axis, v) for t in taken for v in (t.low, t.high)]
    levels += [(1 - t.axis, v) for t in taken if t.other for v in t.other]
    marks = sorted({first, last, *(t for axis, v in levels if math.isfinite(v) for t in _reaches(edge, axis, v)
                                   if first < t < last)})
    kept = []
    for a, b in pairwise(marks):
        p = curve(edge, np.array([0.5 * (a + b)]))[0][0]
        if b - a > 1e-12 and not any(t.low < p[t.axis] < t.high and (t.other is None or t.other[0] < p[1 - t.axis]
                                                                     < t.other[1]) for t in taken):
            kept.append((a, b))
    return kept


def _reaches(edge: Edge, axis: int, level: float) -> list[float]:
    """Parameters in [0, 1] at which an edge crosses a level."""
    if isinstance(edge, Line):
        rise = edge.end[axis] - edge.start[axis]
        return [(level - edge.start[axis]) / rise] if rise else []
    first, turn = _sweep(edge)
    reach = (level - edge.centre[axis]) / math.dist(edge.start, edge.centre)
    if abs(reach) > 1.0:
        return []
    angles = (math.acos(reach), -math.acos(reach)) if axis == 0 else (math.asin(reach), math.pi - math.asin(reach))
    turns = (((a - first) if turn > 0.0 else (first - a)) % (2.0 * math.pi) for a in angles)
    return [t / abs(turn) for t in turns if t <= abs(turn)]


def _loop(outline: Outline, k: int) -> tuple[Edge, ...]:
    return outline.outer if k == 0 else outline.inner[k - 1]


def _normal(edge: Line) -> Array:
    ty, tz = edge.end[0] - edge.start[0], edge.end[1] - edge.start[1]
    return np.array([tz, -ty]) / math.hypot(ty, tz)


def _clip(edge: Edge, axis: int, low: float, high: float) -> tuple[float, float]:
    a, b = edge.start[axis], edge.end[axis]
    if isinstance(edge, Arc) or a == b:
        return (0.0, 1.0) if low <= a <= high else (0.0, 0.0)
    t = sorted(((low - a) / (b - a), (high - a) / (b - a)))
    return max(t[0], 0.0), min(t[1], 1.0)


def curve(edge: Edge, t: Array) -> tuple[Array, Array]:
    """Points (k, 2) and their derivative by t in [0, 1]."""
    a, b = np.array(edge.start), np.array(edge.end)
    if isinstance(edge, Line):
        return a + t[:, None] * (b - a), np.tile(b - a, (len(t), 1))
    c = np.array(edge.centre)
    first, turn = _sweep(edge)
    angle = first + turn * t
    r = float(np.hypot(*(a - c)))
    unit = np.column_stack([np.cos(angle), np.sin(angle)])
    return c + r * unit, r * turn * np.column_stack([-unit[:, 1], unit[:, 0]])


def _sweep(arc: Arc) -> tuple[float, float]:
    """Start angle and signed angle turned through, rad."""
    a, b = (np.subtract(p, arc.centre) for p in (arc.start, arc.end))
    first = math.atan2(a[1], a[0])
    turn = (math.atan2(b[1], b[0]) - first) % (2.0 * math.pi)
    if turn < 1e-12:
        turn = 2.0 * math.pi
    return first, turn if arc.ccw else turn - 2.0 * math.pi
