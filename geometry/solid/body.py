"""The member's body before anything is cut: placed sections at the ends of each stretch, joined to one solid."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from geometry.outline import Arc, Edge, Line, Outline, Point
from geometry.part import Member
from geometry.problem import SolidError
from geometry.solid.integrals import section_integrals
from geometry.solid.lofts import lofted, radius_of, sweep_of
from geometry.solid.profile import Dims, Profile, Side, profile_of
from geometry.solid.stretches import Stretch


@dataclass(frozen=True, slots=True)
class Piece:
    """A stretch with its placed sections: coordinates in member axes from the declared line, mm."""

    stretch: Stretch
    first: Profile
    last: Profile


def moved(profile: Profile, dy: float, dz: float) -> Profile:
    """`profile` shifted by (dy, dz), mm."""

    def point(p: Point) -> Point:
        return (p[0] + dy, p[1] + dz)

    def edge(e: Edge) -> Edge:
        if isinstance(e, Line):
            return Line(point(e.start), point(e.end))
        return Arc(point(e.start), point(e.end), point(e.centre), e.ccw)

    def loop(sides: tuple[Side, ...]) -> tuple[Side, ...]:
        return tuple(Side(edge(s.edge), s.labels, s.wall) for s in sides)

    return Profile(loop(profile.outer), tuple(loop(inner) for inner in profile.inner))


def line_point(member: Member, dims: Dims, profile: Profile) -> Point:
    """Point (y, z) of the start section, in the shape's own axes, that lies on the declared line.

    Raises
    ------
    SolidError
        `line_at` is not a word this builder knows, or the shape has no web.
    """
    word, shape = member.line_at, member.section.shape
    if word == "origin":
        return (0.0, 0.0)
    if word == "centroid":
        whole = section_integrals(profile)
        return (whole.y, whole.z)
    if word == "web":
        middle = {"I": 0.0, "tee": 0.0, "channel": 0.5 * dims.get("web", 0.0), "angle": 0.5 * dims.get("thickness", 0.0)}
        if shape not in middle:
            raise SolidError(f"members.{member.name}.line_at: a {shape} has no web; use origin or centroid.")
        return (middle[shape], 0.0)
    low, high = bounds(profile)
    y = {"left": low[0], "right": high[0]}
    z = {"bottom": low[1], "top": high[1]}
    words = word.split()
    if not words or len(words) > 2 or any(w not in y and w not in z for w in words):
        raise SolidError(f"members.{member.name}.line_at: {word!r} is not origin, centroid, web, a side or a corner.")
    return (next((y[w] for w in words if w in y), 0.0), next((z[w] for w in words if w in z), 0.0))


def bounds(profile: Profile) -> tuple[Point, Point]:
    """Least and greatest (y, z) of the outer loop, mm."""
    points: list[Point] = []
    for side in profile.outer:
        e = side.edge
        points += [e.start, e.end]
        if isinstance(e, Arc):
            points += _extremes(e)
    ys, zs = [p[0] for p in points], [p[1] for p in points]
    return (min(ys), min(zs)), (max(ys), max(zs))


def _extremes(arc: Arc) -> list[Point]:
    r, turn = radius_of(arc), sweep_of(arc)
    first = math.atan2(arc.start[1] - arc.centre[1], arc.start[0] - arc.centre[0])
    found = []
    for k in range(4):
        angle = 0.5 * math.pi * k
        if ((angle - first) if arc.ccw else (first - angle)) % (2.0 * math.pi) <= turn:
            found.append((arc.centre[0] + r * math.cos(angle), arc.centre[1] + r * math.sin(angle)))
    return found


def _depth(shape: str, dims: Dims) -> float:
    return dims.get("depth", dims.get("diameter", 0.0)) if shape != "outline" else 0.0


def pieces_of(member: Member, stretches: Sequence[Stretch]) -> list[Piece]:
    """Each stretch with its sections placed about the declared line.

    `line_at` fixes the start section; `anchor` then says what stays straight while the depth varies.
    """
    shape, outline = member.section.shape, member.section.outline
    at_start = stretches[0].first
    y0, z0 = line_point(member, at_start, profile_of(shape, at_start, outline))
    sign = {"top": 0.5, "centre": 0.0, "bottom": -0.5}[member.anchor]

    def placed(dims: Dims) -> Profile:
        shift = sign * (_depth(shape, at_start) - _depth(shape, dims))
        return moved(profile_of(shape, dims, outline), -y0, shift - z0)

    return [Piece(s, *_labelled(placed(s.first), placed(s.last))) for s in stretches]


def _labelled(first: Profile, last: Profile) -> tuple[Profile, Profile]:
    """Settle the doubtful sides: a flange tip is the part's left or right only where it is the outermost."""
    lows, highs = zip(*(bounds(p) for p in (first, last)), strict=True)

    def outermost(a: Side, b: Side, label: str) -> bool:
        limits = lows if label == "left" else highs
        return all(abs(s.edge.start[0] - limit[0]) <= 1e-9 * max(1.0, abs(limit[0])) for s, limit in zip((a, b), limits, strict=True))

    def settle(p: Profile) -> Profile:
        sides = []
        for side, a, b in zip(p.outer, first.outer, last.outer, strict=True):
            names = tuple(n.rstrip("?") for n in side.labels if not n.endswith("?") or outermost(a, b, n.rstrip("?")))
            sides.append(Side(side.edge, names, side.wall))
        return Profile(tuple(sides), p.inner)

    return settle(first), settle(last)


def runs_of(pieces: Sequence[Piece]) -> list[list[Piece]]:
    """Pieces between steps."""
    runs: list[list[Piece]] = []
    for piece in pieces:
        if piece.stretch.step or not runs:
            runs.append([])
        runs[-1].append(piece)
    return runs


def run_body(run: Sequence[Piece], what: str) -> Any:
    """The solid of the pieces between two steps, in member axes."""
    sections = [(run[0].stretch.start, run[0].first)] + [(p.stretch.end, p.last) for p in run]
    return lofted(sections, what)
