"""The member's body before anything is cut: placed sections at the ends of each stretch, joined to one solid."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from OCP.BRepAlgoAPI import BRepAlgoAPI_Fuse
from OCP.ShapeUpgrade import ShapeUpgrade_UnifySameDomain
from OCP.TopTools import TopTools_ListOfShape

from geometry.outline import Arc, Edge, Line, Point
from geometry.part import Member
from geometry.problem import SolidError
from geometry.solid.eased import eased, edge_name
from geometry.solid.integrals import section_integrals
from geometry.solid.kernel import one_solid
from geometry.solid.lofts import lofted, radius_of, sweep_of
from geometry.solid.profile import Dims, Profile, Side, profile_of
from geometry.solid.stretches import Stretch


@dataclass(frozen=True, slots=True)
class Piece:
    """A stretch with its placed sections: coordinates in member axes from the declared line, mm."""

    stretch: Stretch
    first: Profile
    last: Profile
    origin_first: Point
    origin_last: Point

    def fraction(self, x: float) -> float:
        """How far along the stretch `x` lies, 0 to 1."""
        return (x - self.stretch.start) / (self.stretch.end - self.stretch.start)

    def profile(self, x: float) -> Profile:
        """The placed section at `x` (mm from the start of the member)."""
        t = self.fraction(x)
        outer, *inner = (
            tuple(Side(between(a.edge, b.edge, t), a.labels, a.wall) for a, b in zip(la, lb, strict=True))
            for la, lb in zip(self.first.loops, self.last.loops, strict=True)
        )
        return Profile(outer, tuple(inner))

    def origin(self, x: float) -> Point:
        """Place (y, z) of the shape's own origin at `x`, mm from the declared line."""
        t = self.fraction(x)
        a, b = self.origin_first, self.origin_last
        return ((1.0 - t) * a[0] + t * b[0], (1.0 - t) * a[1] + t * b[1])


def between(a: Edge, b: Edge, t: float) -> Edge:
    """The side a fraction `t` of the way from `a` to `b` (exact: all corners and centres move on straight lines)."""

    def mix(p: Point, q: Point) -> Point:
        return ((1.0 - t) * p[0] + t * q[0], (1.0 - t) * p[1] + t * q[1])

    if isinstance(a, Arc) and isinstance(b, Arc):
        return Arc(mix(a.start, b.start), mix(a.end, b.end), mix(a.centre, b.centre), a.ccw)
    return Line(mix(a.start, b.start), mix(a.end, b.end))


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
        middle = {
            "I": 0.0,
            "tee": 0.0,
            "channel": 0.5 * dims.get("web", 0.0),
        }
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
    radii = {edge_name(e.edges): e.radius for e in member.edge_radii if edge_name(e.edges)}
    y0, z0 = line_point(member, at_start, profile_of(shape, at_start, outline))
    sign = {"top": 0.5, "centre": 0.0, "bottom": -0.5}[member.anchor]

    def origin(dims: Dims) -> Point:
        return (-y0, sign * (_depth(shape, at_start) - _depth(shape, dims)) - z0)

    def placed(dims: Dims) -> Profile:
        return moved(eased(profile_of(shape, dims, outline), radii), *origin(dims))

    return [Piece(s, placed(s.first), placed(s.last), origin(s.first), origin(s.last)) for s in stretches]


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


def joined(pieces: Sequence[Piece], what: str) -> Any:
    """The whole body: the runs between steps fused, faces that lie in one surface merged.

    Raises
    ------
    SolidError
        The runs do not join to one solid (the sections on the two sides of a step do not overlap).
    """
    bodies = [run_body(run, what) for run in runs_of(pieces)]
    if len(bodies) == 1:
        return bodies[0]
    fuse = BRepAlgoAPI_Fuse()
    first, rest = TopTools_ListOfShape(), TopTools_ListOfShape()
    first.Append(bodies[0])
    for body in bodies[1:]:
        rest.Append(body)
    fuse.SetArguments(first)
    fuse.SetTools(rest)
    fuse.SetRunParallel(False)
    fuse.Build()
    whole = one_solid(fuse.Shape(), what, "the sections on the two sides of a step do not overlap")
    merge = ShapeUpgrade_UnifySameDomain(whole, True, True, False)
    merge.Build()
    return one_solid(merge.Shape(), what)


def piece_at(pieces: Sequence[Piece], x: float) -> Piece:
    """The piece that `x` lies in (the later one at a boundary)."""
    return next((p for p in reversed(pieces) if x >= p.stretch.start), pieces[0])
