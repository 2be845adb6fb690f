"""Inner corners that a milling tool has to make."""

from __future__ import annotations

import math
from collections.abc import Iterator

from geometry.outline import Arc, Edge, Outline
from geometry.part import Member
from geometry.spec.checks.profile import knots, profile_of

SHARP = 1e-6  # rad; two edges that turn less go on smoothly


def inner_corners(member: Member) -> Iterator[tuple[str, float]]:
    """Name and radius (mm) of every inner corner that is milled.

    Roots of the section, corners of openings and notches, ends of slots, shoulders, inner corners of a drawn outline.
    Not round holes, which are drilled, and not the inside of a box, which comes as a tube.
    """
    if member.section.outline is not None:
        yield "the sharpest inner corner of the outline", sharpest(member.section.outline)
    if "root_radius" in member.section.dims:
        profile = profile_of(member)
        for x in knots(member):
            for before in profile.sides(x):
                yield f"the root at {x:.6g} mm", profile.dims(x, before)["root_radius"]
    for cut in member.cuts:
        if cut.kind in ("opening", "notch"):
            yield f"a corner of {cut.name}", cut.corner_radius
        elif cut.kind == "slot":
            yield f"an end of {cut.name}", cut.depth / 2.0
    for before_, station in zip(member.stations, member.stations[1:], strict=False):
        if before_.at == station.at:
            yield f"the shoulder at {station.at:.6g} mm", station.shoulder_fillet


def sharpest(outline: Outline) -> float:
    """Least radius of the corners of a drawn section where material lies all round, mm; 0 for a sharp one."""
    least = math.inf
    for loop in (outline.outer, *outline.inner):
        for edge, after in zip(loop, [*loop[1:], loop[0]], strict=True):
            if isinstance(edge, Arc) and not edge.ccw:  # material outside the arc
                least = min(least, math.dist(edge.start, edge.centre))
            if _turn(edge, after) < -SHARP:
                least = 0.0
    return least


def _turn(edge: Edge, after: Edge) -> float:
    """Angle by which the second edge turns from the first, rad; negative: to the right, away from the material."""
    a, b = _direction(edge, at_end=True), _direction(after, at_end=False)
    return math.atan2(a[0] * b[1] - a[1] * b[0], a[0] * b[0] + a[1] * b[1])


def _direction(edge: Edge, at_end: bool) -> tuple[float, float]:
    if not isinstance(edge, Arc):
        return edge.end[0] - edge.start[0], edge.end[1] - edge.start[1]
    y, z = edge.end if at_end else edge.start
    ry, rz = y - edge.centre[0], z - edge.centre[1]
    return (-rz, ry) if edge.ccw else (rz, -ry)
