"""A section drawn by its corners: loops of lines and arcs."""

from __future__ import annotations

import math
from collections.abc import Sequence

from geometry.outline import Arc, Edge, Line, Outline, Point
from geometry.spec.resolve.values import Values
from geometry.spec.words.fields import RADIUS, SIZE
from geometry.spec.words.member import OutlineSection

Corner = tuple[float, float, float]
"""y, z and radius of a corner, mm."""


def outline_of(values: Values, path: str, spec: OutlineSection) -> Outline | None:
    """The outline in mm, or None after keeping the problems found."""
    before = len(values.problems)
    outer = _loop(values, f"{path}.outer", spec.outer, ccw=True)
    inner = [_loop(values, f"{path}.inner[{i}]", loop, ccw=False) for i, loop in enumerate(spec.inner, 1)]
    for i, circle in enumerate(spec.circles, 1):
        at = f"{path}.circles[{i}]"
        y, z = values.number(f"{at}.y", circle.y, "length"), values.number(f"{at}.z", circle.z, "length")
        radius = values.number(f"{at}.diameter", circle.diameter, SIZE) / 2.0
        left, right = (y - radius, z), (y + radius, z)
        inner.append((Arc(left, right, (y, z), ccw=False), Arc(right, left, (y, z), ccw=False)))
    return Outline(outer, tuple(inner)) if len(values.problems) == before else None


def _loop(values: Values, path: str, texts: Sequence[Sequence[str]], ccw: bool) -> tuple[Edge, ...]:
    corners: list[Corner] = []
    for i, text in enumerate(texts, 1):
        y, z = (values.number(f"{path}[{i}][{j}]", t, "length") for j, t in enumerate(text[:2], 1))
        radius = values.number(f"{path}[{i}][3]", text[2], RADIUS) if len(text) > 2 else 0.0
        corners.append((y, z, radius))
    if any(math.isnan(v) for corner in corners for v in corner):
        return ()
    points = [(y, z) for y, z, _ in corners]
    if crossing := _crossing(points):
        i, j = crossing
        values.problem(path, f"sides {i + 1} and {j + 1}", "a loop whose sides do not meet one another",
                       "Give the corners in order round the section")  # fmt: skip
        return ()
    if (area(points) > 0.0) != ccw:
        corners.reverse()
    return _rounded(values, path, corners)


def area(points: Sequence[Point]) -> float:
    """Signed area of a polygon, positive when counter-clockwise (shoelace formula)."""
    return 0.5 * sum(p[0] * q[1] - q[0] * p[1] for p, q in zip(points, [*points[1:], points[0]], strict=True))


def _crossing(points: Sequence[Point]) -> tuple[int, int] | None:
    """Two sides of a polygon that meet though they are not neighbours, or a side without length."""
    n = len(points)
    scale = max(math.dist(p, q) for p in points for q in points)
    for i in range(n):
        a, b = points[i], points[(i + 1) % n]
        if math.dist(a, b) <= 1e-9 * scale:
            return i, i
        for j in range(i + 2, n):
            if (j + 1) % n != i and _meet(a, b, points[j], points[(j + 1) % n]):
                return i, j
    return None


def _side(a: Point, b: Point, p: Point) -> float:
    return (b[0] - a[0]) * (p[1] - a[1]) - (b[1] - a[1]) * (p[0] - a[0])


def _meet(a: Point, b: Point, c: Point, d: Point) -> bool:
    boxes = all(
        min(a[k], b[k]) <= max(c[k], d[k]) and min(c[k], d[k]) <= max(a[k], b[k]) for k in (0, 1)
    )  # fmt: skip
    return boxes and _side(a, b, c) * _side(a, b, d) <= 0.0 and _side(c, d, a) * _side(c, d, b) <= 0.0


def _rounded(values: Values, path: str, corners: Sequence[Corner]) -> tuple[Edge, ...]:
    """Sides and corner arcs of a loop, in order."""
    n = len(corners)
    trims = [_trim(corners[i - 1], corners[i], corners[(i + 1) % n]) for i in range(n)]
    for i in range(n):
        side = math.dist(corners[i][:2], corners[(i + 1) % n][:2])
        if trims[i] + trims[(i + 1) % n] > side * (1.0 + 1e-9):
            values.problem(path, f"radii {corners[i][2]:g} mm and {corners[(i + 1) % n][2]:g} mm",
                           f"radii that fit on the side of {side:g} mm between them", "Make them smaller")  # fmt: skip
            return ()
    edges: list[Edge] = []
    for i in range(n):
        before, here, after = corners[i - 1], corners[i], corners[(i + 1) % n]
        first, last = _towards(here, before, trims[i]), _towards(here, after, trims[i])
        if trims[i] > 0.0:
            left = _side(before[:2], here[:2], after[:2]) > 0.0
            ux, uz = (here[0] - before[0], here[1] - before[1])
            size = math.hypot(ux, uz)
            turn = here[2] / size if left else -here[2] / size
            edges.append(Arc(first, last, (first[0] - uz * turn, first[1] + ux * turn), ccw=left))
        end = _towards(after, here, trims[(i + 1) % n])
        if math.dist(last, end) > 1e-9 * math.dist(here[:2], after[:2]):
            edges.append(Line(last, end))
    return tuple(edges)


def _trim(before: Corner, here: Corner, after: Corner) -> float:
    """Length that a corner's arc takes from each of its sides: r tan((pi - angle) / 2)."""
    if here[2] == 0.0:
        return 0.0
    a = math.atan2(before[1] - here[1], before[0] - here[0])
    b = math.atan2(after[1] - here[1], after[0] - here[0])
    inside = abs((a - b + math.pi) % (2.0 * math.pi) - math.pi)
    return here[2] / math.tan(inside / 2.0) if inside > 1e-6 else math.inf


def _towards(start: Corner, end: Corner, distance: float) -> Point:
    if distance == 0.0:
        return start[:2]
    t = distance / math.dist(start[:2], end[:2])
    return (start[0] + t * (end[0] - start[0]), start[1] + t * (end[1] - start[1]))
