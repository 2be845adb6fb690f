"""What cuts leave of a section at a station."""

from __future__ import annotations

import math
from dataclasses import dataclass

from fem.beam.outlines.clip import clip, crossings, take_out
from fem.beam.outlines.loops import Corner, OutlineError, circle, rounded_polygon, turned
from fem.beam.outlines.member import Side, member_outline
from fem.beam.section.integrals import extreme_points
from geometry.outline import Outline
from geometry.part import Cut, Member

_HALVES = {
    "left wall": (-math.inf, 0.0), "right wall": (0.0, math.inf),
    "bottom wall": (-math.inf, 0.0), "top wall": (0.0, math.inf),
    "bottom flange": (-math.inf, 0.0), "top flange": (0.0, math.inf),
}
"""Which half a cut through one wall is taken out of, from the middle of the section. Every other cut goes
through all that lies in its way: a tool through the web of an I meets nothing else."""


def net_section(
    member: Member, x: float, side: Side = "after", cuts: tuple[Cut, ...] | None = None, gross: Outline | None = None
) -> tuple[Outline, ...]:
    """Pieces of the section that the cuts leave at `x`, in member axes from the declared line, mm.

    Exact for lines and arcs. Pieces are for integrals over the whole section (they may touch where a cut goes
    through one wall only); torsion and shear of a section in pieces are another question. Radii on the rims
    of cuts are not taken off. `cuts` limits which cuts are looked at (all by default); `gross` is the
    outline without them, where it is known.

    Raises `OutlineError` when nothing is left.
    """
    gross = gross or member_outline(member, x, side)
    pieces = [gross]
    for taken in taken_at(member, x, side, cuts, gross):
        pieces = _without(pieces, taken)
    if not pieces:
        raise OutlineError(f"member {member.name}: the cuts at {x:g} mm leave nothing of the section.")
    return tuple(pieces)


def chord(cut: Cut, x: float) -> tuple[float, float] | None:
    """Range across the member (z for axis y, y for axis z, mm from the line) that a cut takes at `x`; None beside it.

    Not for notches. A positive `turned` takes the long side from x towards the coordinate across.
    """
    if cut.kind == "hole" or (cut.kind == "slot" and cut.length - cut.depth < 1e-9 * cut.length):
        profile = Outline(circle(cut.depth / 2))
    else:
        u, v = cut.length / 2, cut.depth / 2
        r = v if cut.kind == "slot" else cut.corner_radius
        profile = Outline(rounded_polygon([Corner(-u, -v, r), Corner(u, -v, r), Corner(u, v, r), Corner(-u, v, r)]))
        profile = turned(profile, cut.turned)
    across = [p[1] for edge in profile.outer for p in crossings(edge, 0, x - cut.at)]
    if not across or max(across) - min(across) <= 1e-12 * cut.depth:
        return None
    return cut.offset + min(across), cut.offset + max(across)


def notch_depth(cut: Cut, x: float) -> float:
    """How far a notch reaches in from its edge at `x`, mm; 0 beside it."""
    away, r = abs(x - cut.at), cut.corner_radius
    if away >= cut.length / 2:
        return 0.0
    beyond = max(away - (cut.length / 2 - r), 0.0)
    return cut.depth - r + math.sqrt(r * r - beyond * beyond)


@dataclass(frozen=True, slots=True)
class Taken:
    """What a cut takes at one station: `low` to `high` along `axis` (0: y, 1: z) and, unless None, between `other`."""

    axis: int
    low: float
    high: float
    other: tuple[float, float] | None = None


def taken_at(
    member: Member, x: float, side: Side = "after", cuts: tuple[Cut, ...] | None = None, gross: Outline | None = None
) -> list[Taken]:
    """What each cut takes of the section at `x`, mm from the declared line; a notch's range has no end outwards."""
    whole = gross or member_outline(member, x, side)
    found = (_taken(whole, member, cut, x) for cut in (member.cuts if cuts is None else cuts))
    return [t for t in found if t is not None]


def _taken(gross: Outline, member: Member, cut: Cut, x: float) -> Taken | None:
    axis = 1 if cut.axis == "y" else 0  # the coordinate across the tool
    if cut.kind == "notch":
        depth = notch_depth(cut, x)
        if depth <= 0.0:
            return None
        # the tool is straight: its depth counts from where the edge is at the middle of the notch
        top, bottom, left, right = extreme_points([member_outline(member, cut.at)])
        edge = {"top": top[1], "bottom": bottom[1], "left": left[0], "right": right[0]}[cut.edge]
        if cut.edge in ("top", "right"):
            return Taken(axis, float(edge) - depth, math.inf)
        return Taken(axis, -math.inf, float(edge) + depth)
    taken = chord(cut, x)
    if taken is None:
        return None
    half = _HALVES.get(cut.through)
    if half is None:
        return Taken(axis, *taken)
    top, bottom, left, right = extreme_points([gross])
    middle = float(left[0] + right[0]) / 2 if cut.axis == "y" else float(top[1] + bottom[1]) / 2
    span = float(max(top[1] - bottom[1], right[0] - left[0]))
    low, high = (middle + max(min(h, span), -span) for h in half)
    return Taken(axis, *taken, (low, high))


def _without(pieces: list[Outline], t: Taken) -> list[Outline]:
    if math.isinf(t.high):
        return [p for piece in pieces for p in clip(piece, t.axis, t.low, above=False)]
    if math.isinf(t.low):
        return [p for piece in pieces for p in clip(piece, t.axis, t.high, above=True)]
    return take_out(pieces, t.axis, t.low, t.high, other=t.other)
