"""The room about a cut: its core and radius, and the free edges of the wall that it passes."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from geometry.part import Cut, Member
from geometry.spec.checks.cuts import walls_of
from geometry.spec.checks.profile import Profile, knots, profile_of

Point = tuple[float, float]
Points = list[Point]
"""Distance along the member, and across it from the line, mm."""
Segment = tuple[Point, Point]


@dataclass(frozen=True)
class FreeEdge:
    """An edge of a wall behind which there is nothing: a chain of straight lines."""

    name: str
    points: Points


@dataclass(frozen=True)
class Room:
    """A cut as all points within `radius` of its core: of a hole its middle, of a slot a line, else a rectangle."""

    cut: Cut
    points: Points
    radius: float
    edges: tuple[FreeEdge, ...]


def rooms_of(member: Member) -> list[Room]:
    """The room of every cut of a member."""
    profile = profile_of(member)
    return [Room(cut, _core(profile, cut), _radius(cut), tuple(_free_edges(profile, cut))) for cut in member.cuts]


def _radius(cut: Cut) -> float:
    return cut.depth / 2.0 if cut.kind in ("hole", "slot") else cut.corner_radius


def _core(profile: Profile, cut: Cut) -> Points:
    if cut.kind == "notch":
        return _notch_core(profile, cut)
    r = _radius(cut)
    a, b = max(cut.length / 2.0 - r, 0.0), max(cut.depth / 2.0 - r, 0.0)
    own = [(-a, -b), (a, -b), (a, b), (-a, b)] if b > 0.0 else [(-a, 0.0), (a, 0.0)] if a > 0.0 else [(0.0, 0.0)]
    c, s = math.cos(cut.turned), math.sin(cut.turned)
    return [(cut.at + c * x - s * y, cut.offset + s * x + c * y) for x, y in own]


def _notch_core(profile: Profile, cut: Cut) -> Points:
    """From the floor, less the radius of its corners, out to the edge that the notch starts from."""
    low_y, high_y, low_z, high_z = profile.box(profile.dims(cut.at))
    low, high = (low_z, high_z) if cut.axis == "y" else (low_y, high_y)
    outer, inwards = (high, -1.0) if cut.edge in ("top", "right") else (low, 1.0)
    a, floor = max(cut.length / 2.0 - cut.corner_radius, 0.0), outer + inwards * (cut.depth - cut.corner_radius)
    return [(cut.at - a, outer), (cut.at + a, outer), (cut.at + a, floor), (cut.at - a, floor)]


def _free_edges(profile: Profile, cut: Cut) -> Iterator[FreeEdge]:
    """Free edges of the wall that a cut passes (of a notch, those that it does not start from)."""
    shape = profile.member.section.shape
    ends = {name: (low, high) for name, low, high in _free_ends(cut, shape)}
    chains: dict[tuple[str, int, int], Points] = {}
    for x in knots(profile.member):
        for before in profile.sides(x) if x > 0.0 else (False,):
            for wall, stretches in walls_of(profile, cut, profile.dims(x, before)):
                for k, stretch in enumerate(stretches):
                    if len(stretches) == 2 and (cut.offset > sum(map(sum, stretches)) / 4.0) != (k == 1):
                        continue  # the cut lies on the other side of the web
                    for end in (0, 1):
                        free = ends.get(wall, (False, False))[end] and (len(stretches) == 1 or end == k)
                        if free:
                            chains.setdefault((wall, k, end), []).append((x, stretch[end]))
    for (wall, k, end), points in chains.items():
        yield FreeEdge(_edge_name(cut, wall, k, end), points)


def _free_ends(cut: Cut, shape: str) -> Iterator[tuple[str, bool, bool]]:
    """For the walls (as `walls_of` names them): whether the lower and the upper end are free. A box and a tube have
    none; the web of an I ends in both flanges."""
    yield "section", cut.edge not in ("bottom", "left"), cut.edge not in ("top", "right")
    if shape == "tee":
        yield "flat of the web", True, False
    for side in ("top", "bottom"):
        yield f"flat of the {side} flange", shape != "channel", True
    yield "flat of the upright leg", False, True
    yield "flat of the bottom leg", False, True


def _edge_name(cut: Cut, wall: str, k: int, end: int) -> str:
    side = ("bottom" if cut.axis == "y" else "left", "top" if cut.axis == "y" else "right")[end]
    return f"{side} edge" if wall == "section" else f"{side} edge of the {wall.removeprefix('flat of the ')}"


def same_wall(a: Cut, b: Cut) -> bool:
    """Whether two cuts pass one wall."""
    if a.axis != b.axis:
        return False
    either = (a.through, b.through)
    return "all" in either or a.through == b.through or ("flanges" in either and "web" not in either)


def ring(points: Points) -> list[Segment]:
    """A closed ring of straight lines; of a single point the point."""
    return list(zip(points, [*points[1:], points[0]], strict=True))


def chain(points: Points) -> list[Segment]:
    """Straight lines from each point to the next."""
    return list(zip(points, points[1:], strict=False))


def gap(one: Sequence[Segment], two: Sequence[Segment]) -> float:
    """Least distance between two sets of straight lines, mm; 0 where they cross."""
    return min(_segments_apart(a, b, c, d) for a, b in one for c, d in two)


def _segments_apart(a: Point, b: Point, c: Point, d: Point) -> float:
    if _cross(a, b, c, d):
        return 0.0
    return min(_apart(a, c, d), _apart(b, c, d), _apart(c, a, b), _apart(d, a, b))


def _cross(a: Point, b: Point, c: Point, d: Point) -> bool:
    def side(p: Point, q: Point, r: Point) -> float:
        return (q[0] - p[0]) * (r[1] - p[1]) - (q[1] - p[1]) * (r[0] - p[0])

    return side(a, b, c) * side(a, b, d) < 0.0 and side(c, d, a) * side(c, d, b) < 0.0


def _apart(p: Point, a: Point, b: Point) -> float:
    """Distance of a point from the line between two others."""
    dx, dy = b[0] - a[0], b[1] - a[1]
    square = dx * dx + dy * dy
    t = 0.0 if square == 0.0 else min(max(((p[0] - a[0]) * dx + (p[1] - a[1]) * dy) / square, 0.0), 1.0)
    return math.hypot(p[0] - a[0] - t * dx, p[1] - a[1] - t * dy)
