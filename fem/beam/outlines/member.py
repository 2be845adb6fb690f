"""The outline of a member at a station: dimensions, anchor, placement on the declared line, edge radii."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import Literal

from fem.beam.outlines.loops import OutlineError, moved
from fem.beam.outlines.shapes import outline_of, with_defaults
from fem.beam.section.integrals import outline_integrals
from geometry.outline import Outline
from geometry.part import Member

Side = Literal["before", "after"]

_LONG_EDGES = ("top left", "top right", "bottom left", "bottom right")


def _knots(member: Member, name: str) -> list[tuple[float, float, float]]:
    """(place, value up to it, value from it on) of one dimension, ascending in place.

    Of two stations at one place (a step) the first ends the stretch before and the second begins the
    next. A dimension that only one of them names keeps, on the other side, the value it has there
    without that station: constant before the step when only the second names it, continued after it
    when only the first does.
    """
    full = with_defaults(member.section.shape, member.section.dims)
    if name not in full:
        raise OutlineError(f"member {member.name}: a section of shape {member.section.shape} has no {name}.")
    knots = [(0.0, full[name], full[name])]
    stations = member.stations
    for i, station in enumerate(stations):
        if name not in station.dims:
            continue
        value = station.dims[name]
        second = i > 0 and stations[i - 1].at == station.at
        if station.at == knots[-1][0]:
            knots[-1] = (station.at, knots[-1][1], value)
        elif second:
            knots.append((station.at, knots[-1][2], value))
        else:
            knots.append((station.at, value, value))
    return knots


def _value_and_slope(knots: Sequence[tuple[float, float, float]], x: float, side: Side) -> tuple[float, float]:
    for (a, _, first), (b, last, _) in pairwise(knots):
        if x < b or (x == b and side == "before"):
            if x < a or (x == a and side == "before" and a > 0.0):
                continue
            slope = (last - first) / (b - a)
            return first + slope * (x - a), slope
    return knots[-1][2] if x > knots[-1][0] or side == "after" else knots[-1][1], 0.0


def _varying(member: Member) -> tuple[str, ...]:
    named = dict.fromkeys(member.section.dims)
    for station in member.stations:
        named.update(dict.fromkeys(station.dims))
    return tuple(named)


def dims_at(member: Member, x: float, side: Side = "after") -> dict[str, float]:
    """Dimensions (mm) of the section at `x` mm from the member's start, on either side of a step.

    Each dimension follows the rule of `geometry.part.Station`. A dimension that nobody names takes its
    default from the others *at this station* (the bottom flange of an I stays as wide as its top flange).
    """
    return {name: _value_and_slope(_knots(member, name), x, side)[0] for name in _varying(member)}


def dims_slope(member: Member, x: float, side: Side = "after") -> dict[str, float]:
    """Change of each dimension per mm along the member at `x`, on either side of a step or kink."""
    return {name: _value_and_slope(_knots(member, name), x, side)[1] for name in _varying(member)}


def member_outline(member: Member, x: float, side: Side = "after") -> Outline:
    """Outline at `x` in the member's axes (y, z) from its declared line, mm, with the radii of its long edges."""
    dims = dims_at(member, x, side)
    radii = {e.edges: e.radius for e in member.edge_radii if e.edges in _LONG_EDGES}
    outline = outline_of(member.section.shape, dims, member.section.outline, radii)
    dy, dz = line_offset(member)
    return moved(outline, -dy, _anchor_shift(member, dims) - dz)


def _depth(shape: str, dims: dict[str, float]) -> float:
    return dims["diameter"] if shape in ("round", "tube") else dims.get("depth", 0.0)


def _anchor_shift(member: Member, dims: dict[str, float]) -> float:
    """How far up the section's origin moves for the anchored side to stay straight."""
    if member.section.shape == "outline" or member.anchor == "centre":
        return 0.0
    shape = member.section.shape
    growth = (_depth(shape, dims) - _depth(shape, dims_at(member, 0.0))) / 2
    return -growth if member.anchor == "top" else growth


def line_offset(member: Member) -> tuple[float, float]:
    """(y, z) of the declared line in the coordinates of the start section (see `Member.line_at`), mm.

    Taken on the section itself, before edge radii.
    """
    section, where = member.section, member.line_at
    dims = dims_at(member, 0.0)
    start = outline_of(section.shape, dims, section.outline)
    if where == "origin":
        return 0.0, 0.0
    exact = outline_integrals(start)
    if where == "centroid":
        return exact.yc, exact.zc
    if where == "web":
        if section.shape not in ("I", "tee", "channel"):
            raise OutlineError(f"member {member.name}: line_at web, but a section of shape {section.shape} has no web.")
        return (dims["web"] / 2 if section.shape == "channel" else 0.0), 0.0
    top, bottom, left, right = exact.extremes
    levels = {"top": (None, top[1]), "bottom": (None, bottom[1]), "left": (left[0], None), "right": (right[0], None)}
    y, z = 0.0, 0.0
    for word in where.split():
        if word not in levels:
            raise OutlineError(f"member {member.name}: line_at {where!r} is no place of a section.")
        level_y, level_z = levels[word]
        y, z = (y if level_y is None else float(level_y)), (z if level_z is None else float(level_z))
    return y, z
