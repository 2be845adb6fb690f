"""A member along its length, for the checks of the spec: dimensions at a distance, and where they lie.

This interpolation serves no model. The solid builder and the beam model each have their own.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from geometry.outline import Arc, Edge
from geometry.part import Member, Section

Rectangle = tuple[float, float, float, float]
"""y from, y to, z from, z to of a plate, mm."""


def length_of(member: Member) -> float:
    """Length of the member, mm."""
    return math.dist(member.start, member.end)


def dims_at(member: Member, x: float, before: bool = False) -> dict[str, float]:
    """Dimensions at a distance from the start (mm); at a step those behind it, or `before` it."""
    return {name: _at(_named(member, name), x, before) for name in member.section.dims}


Named = list[tuple[float, float]]
"""Where a dimension has a value of its own, and which, in the order of the spec, mm."""


def _named(member: Member, name: str) -> Named:
    """Where a dimension has a value of its own, and which, in the order of the spec.

    One that only the second station of a step names keeps its last value up to the step, and jumps there.
    """
    named = [(0.0, member.section.dims[name])]
    for before, station in zip((None, *member.stations), member.stations, strict=False):
        if name not in station.dims:
            continue
        if before is not None and before.at == station.at and name not in before.dims:
            named.append((station.at, named[-1][1]))
        named.append((station.at, station.dims[name]))
    return named


def _at(named: Named, x: float, before: bool) -> float:
    if len(named) == 1:
        return named[0][1]
    tol = 1e-9 * (1.0 + abs(x))
    if before:
        after = next((k for k, (at, _) in enumerate(named) if at >= x - tol), len(named))
    else:
        after = next((k for k, (at, _) in enumerate(named) if at > x + tol), len(named))
    if after == len(named) or after == 0:
        return named[min(after, len(named) - 1)][1]
    (a, first), (b, last) = named[after - 1], named[after]
    return last if b <= a else first + (last - first) * (x - a) / (b - a)


def knots(member: Member) -> list[float]:
    """Distances between which every dimension varies linearly, mm, with both ends."""
    length = length_of(member)
    return sorted({0.0, length, *(min(max(s.at, 0.0), length) for s in member.stations if s.at == s.at)})


def plates(shape: str, d: dict[str, float]) -> list[Rectangle]:
    """Plates of a section about the shape's origin, without radii (the full rectangle of a solid one)."""
    if shape in ("round", "tube"):
        r = d["diameter"] / 2.0
        return [(-r, r, -r, r)]
    h, w = d["depth"] / 2.0, d["width"]
    if shape in ("rectangle", "box"):
        return [(-w / 2.0, w / 2.0, -h, h)]
    if shape == "angle":
        t = d["thickness"]
        return [(0.0, t, -h, h), (t, w, -h, -h + t)]
    web, flange = d["web"], d["flange"]
    if shape == "channel":
        return [(0.0, web, -h, h), (web, w, h - flange, h), (web, w, -h, -h + flange)]
    top = (-w / 2.0, w / 2.0, h - flange, h)
    if shape == "tee":
        return [top, (-web / 2.0, web / 2.0, -h, h - flange)]
    v, bottom = d["bottom_width"], d["bottom_flange"]
    return [top, (-web / 2.0, web / 2.0, -h + bottom, h - flange), (-v / 2.0, v / 2.0, -h, -h + bottom)]


def bounds(section: Section, dims: dict[str, float]) -> Rectangle:
    """Bounding rectangle of a section about the shape's origin."""
    if section.outline is not None:
        points = [p for edge in section.outline.outer for p in polygon_of(edge)]
        if not points:
            return (math.nan,) * 4
        ys, zs = [p[0] for p in points], [p[1] for p in points]
        return min(ys), max(ys), min(zs), max(zs)
    boxes = plates(section.shape, dims) if dims else [(math.nan,) * 4]
    return min(b[0] for b in boxes), max(b[1] for b in boxes), min(b[2] for b in boxes), max(b[3] for b in boxes)


def polygon_of(edge: Edge) -> Iterator[tuple[float, float]]:
    """Points of an edge without its end: one of a line, several of an arc."""
    yield edge.start
    if not isinstance(edge, Arc):
        return
    cy, cz = edge.centre
    first = math.atan2(edge.start[1] - cz, edge.start[0] - cy)
    turn = (math.atan2(edge.end[1] - cz, edge.end[0] - cy) - first) % (2.0 * math.pi)
    if not edge.ccw:
        turn -= 2.0 * math.pi
    steps = max(2, math.ceil(abs(turn) / 0.1))
    radius = math.dist(edge.start, edge.centre)
    for k in range(1, steps):
        angle = first + turn * k / steps
        yield cy + radius * math.cos(angle), cz + radius * math.sin(angle)


def centroid(section: Section) -> tuple[float, float]:
    """Centroid of the section from its plates and root radii, about the shape's origin."""
    if section.outline is not None:
        loops = [
            [p for edge in loop for p in polygon_of(edge)] for loop in (section.outline.outer, *section.outline.inner)
        ]
        return _weighted([_polygon(loop) for loop in loops if len(loop) > 2])
    d = dict(section.dims)
    pieces = [((b - a) * (e - c), (a + b) / 2.0, (c + e) / 2.0) for a, b, c, e in plates(section.shape, d)]
    return _weighted([*pieces, *_roots(section.shape, d)])


def _roots(shape: str, d: dict[str, float]) -> Iterator[tuple[float, float, float]]:
    """Area and centroid of the fillets at the roots: (1 - pi/4) r^2 at 0.2234 r from either side."""
    r = d.get("root_radius", 0.0)
    area, off = (1.0 - math.pi / 4.0) * r * r, 0.22337 * r
    if not r:
        return
    h = d["depth"] / 2.0
    if shape == "angle":
        t = d["thickness"]
        yield area, t + off, -h + t + off
    elif shape == "channel":
        yield area, d["web"] + off, h - d["flange"] - off
        yield area, d["web"] + off, -h + d["flange"] + off
    elif shape in ("I", "tee"):
        yield 2.0 * area, 0.0, h - d["flange"] - off
        if shape == "I":
            yield 2.0 * area, 0.0, -h + d["bottom_flange"] + off


def _polygon(points: list[tuple[float, float]]) -> tuple[float, float, float]:
    """Signed area and centroid of a polygon."""
    area = ay = az = 0.0
    for (y0, z0), (y1, z1) in zip(points, [*points[1:], points[0]], strict=True):
        c = y0 * z1 - y1 * z0
        area, ay, az = area + c / 2.0, ay + (y0 + y1) * c / 6.0, az + (z0 + z1) * c / 6.0
    return area, ay / area if area else 0.0, az / area if area else 0.0


def _weighted(pieces: list[tuple[float, float, float]]) -> tuple[float, float]:
    total = sum(a for a, _, _ in pieces)
    if not total > 0.0:
        return math.nan, math.nan
    return sum(a * y for a, y, _ in pieces) / total, sum(a * z for a, _, z in pieces) / total


@dataclass(frozen=True, slots=True)
class Profile:
    """A member's sections placed on its line.

    `line` is the point (y, z) of the start section that lies on the line, about the shape's origin. `named`: where each
    dimension has a value of its own; looked up once, for the checks ask at many places.
    """

    member: Member
    line: tuple[float, float]
    named: dict[str, Named]

    def dims(self, x: float, before: bool = False) -> dict[str, float]:
        """Dimensions at a distance from the start (mm); at a step those behind it, or `before` it."""
        return {name: _at(named, x, before) for name, named in self.named.items()}

    def sides(self, x: float) -> tuple[bool, ...]:
        """Both sides, `before` first, where a dimension may jump; elsewhere they are one."""
        tol = 2e-9 * (1.0 + abs(x))
        return (True, False) if any(abs(s.at - x) <= tol for s in self.member.stations) else (False,)

    def origin(self, dims: dict[str, float]) -> tuple[float, float]:
        """The shape's origin from the line (y, z), for the dimensions at a station."""
        y, z = -self.line[0], -self.line[1]
        first, here = _depth(dict(self.member.section.dims)), _depth(dims)
        shift = {"top": (first - here) / 2.0, "bottom": (here - first) / 2.0}.get(self.member.anchor, 0.0)
        return y, z + shift

    def box(self, dims: dict[str, float]) -> Rectangle:
        """Bounding rectangle from the line."""
        y, z = self.origin(dims)
        a, b, c, d = bounds(self.member.section, dims)
        return a + y, b + y, c + z, d + z


def _depth(dims: dict[str, float]) -> float:
    return dims.get("depth", dims.get("diameter", 0.0))


def profile_of(member: Member) -> Profile:
    """The member's sections placed on its line, by `line_at`."""
    return Profile(member, _line(member), {name: _named(member, name) for name in member.section.dims})


def _line(member: Member) -> tuple[float, float]:
    section = member.section
    if member.line_at == "centroid":
        drawn = section.shape != "outline" or section.outline is not None
        return centroid(section) if drawn else (math.nan, math.nan)
    if member.line_at == "origin":
        return 0.0, 0.0
    left, right, low, high = bounds(section, dict(section.dims))
    if member.line_at == "web":
        return section.dims.get("web", 0.0) / 2.0 if section.shape == "channel" else 0.0, 0.0
    words = member.line_at.split()
    y = left if "left" in words else right if "right" in words else 0.0
    z = high if "top" in words else low if "bottom" in words else 0.0
    return y, z
