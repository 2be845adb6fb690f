"""Holes, slots, openings and notches: the tool's outline, its reach through each wall, the cut and its check."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from OCP.BRepAlgoAPI import BRepAlgoAPI_Cut
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_MakeFace, BRepBuilderAPI_MakeWire
from OCP.BRepPrimAPI import BRepPrimAPI_MakePrism
from OCP.gp import gp_Ax2, gp_Circ, gp_Dir, gp_Pnt, gp_Vec
from OCP.TopTools import TopTools_ListOfShape

from geometry.outline import Arc, Edge, Line, Point
from geometry.part import Cut, Member
from geometry.problem import SolidError
from geometry.solid.body import Piece, bounds, piece_at
from geometry.solid.chords import inside, length_within
from geometry.solid.kernel import one_solid, volume_of
from geometry.solid.lofts import TINY, radius_of, sweep_of
from geometry.solid.profile import Corner, rounded
from geometry.solid.walls import walls_through

MARGIN = 1.0
"""How far (mm) a tool runs past an outer face."""
TOLERANCE = 0.01
"""Largest part of a cut's estimated volume by which the kernel's may differ."""
_GAUSS = np.polynomial.legendre.leggauss(6)


@dataclass(frozen=True, slots=True)
class Tool:
    """A cut's tool: its loop in (x, across), and its reach along its axis through one wall (or all), mm.

    `across` is z for axis y and y for axis z, from the member's line. `thickness` is that of the wall it is in.
    """

    cut: Cut
    wall: str
    axis: Literal["y", "z"]
    loop: tuple[Edge, ...]
    low: float
    high: float
    thickness: float

    @property
    def box(self) -> tuple[float, float, float, float]:
        """Least and greatest x, least and greatest coordinate across."""
        points = [p for e in self.loop for p in (e.start, e.end)]
        for e in self.loop:
            if isinstance(e, Arc):
                r, c, turn = radius_of(e), e.centre, sweep_of(e)
                first = math.atan2(e.start[1] - c[1], e.start[0] - c[0])
                angles = (0.5 * math.pi * k for k in range(4))
                points += [
                    (c[0] + r * math.cos(a), c[1] + r * math.sin(a))
                    for a in angles
                    if ((a - first) if e.ccw else (first - a)) % (2.0 * math.pi) <= turn
                ]
        xs, cs = [p[0] for p in points], [p[1] for p in points]
        return min(xs), max(xs), min(cs), max(cs)


def tool_loop(cut: Cut, side: float, margin: float) -> tuple[Edge, ...]:
    """Loop of the tool in (x, across), counter-clockwise.

    `side` is the coordinate of the edge that a notch starts from; the notch's tool runs `margin` past it.
    A hole is two half circles that meet at its rim points towards +across and -across.
    """
    if cut.kind == "notch":
        inwards = -1.0 if cut.edge in ("top", "right") else 1.0
        x0, x1 = cut.at - 0.5 * cut.length, cut.at + 0.5 * cut.length
        floor, mouth = side + inwards * cut.depth, side - inwards * margin
        r = cut.corner_radius
        corners = [Corner(x0, floor, r), Corner(x1, floor, r), Corner(x1, mouth), Corner(x0, mouth)]
        return tuple(s.edge for s in rounded(corners if inwards < 0.0 else corners[::-1]))
    if cut.kind == "hole":
        r, c = 0.5 * cut.length, (cut.at, cut.offset)
        a, b = (c[0], c[1] - r), (c[0], c[1] + r)
        return (Arc(a, b, c, True), Arc(b, a, c, True))
    r = 0.5 * cut.depth if cut.kind == "slot" else cut.corner_radius
    if cut.kind == "slot" and cut.length < cut.depth:
        raise SolidError(f"cut {cut.name}: a slot {cut.length:g} mm long cannot be {cut.depth:g} mm wide; swap them.")
    cos, sin, h, d = math.cos(cut.turned), math.sin(cut.turned), 0.5 * cut.length, 0.5 * cut.depth
    plan = [
        Corner(cut.at + u * cos - v * sin, cut.offset + u * sin + v * cos, r)
        for u, v in ((-h, -d), (h, -d), (h, d), (-h, d))
    ]
    return tuple(s.edge for s in rounded(plan))


def tools_of(cut: Cut, member: Member, pieces: Sequence[Piece]) -> list[Tool]:
    """The tools of one cut, one for each wall it passes.

    Raises
    ------
    SolidError
        The wall does not exist, the cut lies off the member, or it meets a neighbouring wall.
    """
    what, shape = f"cut {member.name}.{cut.name}", member.section.shape
    length = pieces[-1].stretch.end
    if not 0.0 <= cut.at <= length:
        raise SolidError(f"{what}: at {cut.at:g} mm lies off the member (0 to {length:g} mm).")
    side = 0.0
    if cut.kind == "notch":
        low, high = bounds(piece_at(pieces, cut.at).profile(cut.at))
        side = {"bottom": low[1], "top": high[1], "left": low[0], "right": high[0]}.get(cut.edge, math.nan)
        if math.isnan(side):
            raise SolidError(f"{what}: a notch needs the edge it starts from: top, bottom, left or right.")
    reach = max(abs(v) for p in pieces for q in (p.first, p.last) for b in bounds(q) for v in b) + MARGIN
    loop = tuple(e for e in tool_loop(cut, side, reach) if not (isinstance(e, Line) and _short(e)))
    whole = Tool(cut, "all", cut.axis, loop, -reach, reach, _thickness_all(cut, pieces))
    if cut.through == "all":
        return [whole]
    x0, x1, _, _ = whole.box
    places = _places(pieces, max(x0, 0.0), min(x1, length))
    found: list[Tool] = []
    for k, first in enumerate(walls_through(shape, places[0][0].stretch.at(places[0][1]), cut.through, cut.axis, what)):
        lows, highs, thick, past_free = [], [], [], 0.0
        for piece, x in places:
            wall = walls_through(shape, piece.stretch.at(x), cut.through, cut.axis, what)[k]
            oy, oz = piece.origin(x)
            shift, across = (oy, oz) if cut.axis == "y" else (oz, oy)
            lows.append(wall.low + shift)
            highs.append(wall.high + shift)
            thick.append(wall.thickness)
            for a, b in inside(loop, 0, min(max(x, x0 + 1e-6), x1 - 1e-6)):
                past_free = max(past_free, wall.free[0] - (a - across), (b - across) - wall.free[1])
                _check_behind(what, wall.name, (a - across, b - across), wall.barred)
        if past_free > 1e-6:
            raise SolidError(
                f"{what}: it reaches {past_free:.3g} mm past the {first.name} into the wall beside it; make it "
                "smaller, move it, or cut through all."
            )
        past = 1e-3 * min(thick)
        found.append(Tool(cut, first.name, cut.axis, loop, min(lows) - past, max(highs) + past, float(np.mean(thick))))
    return found


def _short(e: Line) -> bool:
    return math.hypot(e.end[0] - e.start[0], e.end[1] - e.start[1]) <= TINY


def _places(pieces: Sequence[Piece], x0: float, x1: float) -> list[tuple[Piece, float]]:
    """Places along a tool, each with the piece it is in; both sides of every boundary between pieces."""
    found = []
    for piece in pieces:
        a, b = max(x0, piece.stretch.start), min(x1, piece.stretch.end)
        if b > a:
            found += [(piece, float(x)) for x in np.linspace(a, b, 17)]
    return found


def _check_behind(what: str, wall: str, span: tuple[float, float], barred: tuple[float, float] | None) -> None:
    if barred is not None and span[0] < barred[1] - 1e-6 and span[1] > barred[0] + 1e-6:
        raise SolidError(f"{what}: it meets the wall that stands behind the {wall}; move it aside or cut through all.")


def _thickness_all(cut: Cut, pieces: Sequence[Piece]) -> float:
    """Material along the tool's axis at its middle, mm: the longest single run."""
    piece = piece_at(pieces, cut.at)
    edges = [s.edge for loop in piece.profile(cut.at).loops for s in loop]
    low, high = bounds(piece.profile(cut.at))
    if cut.kind == "notch":
        k = 1 if cut.axis == "y" else 0
        inwards = -1.0 if cut.edge in ("top", "right") else 1.0
        place = (high[k] if inwards < 0.0 else low[k]) + inwards * 0.5 * cut.depth
    else:
        place = cut.offset
    runs = inside(edges, 1 if cut.axis == "y" else 0, place)
    return max((b - a for a, b in runs), default=0.0)


def _point(axis: str, p: Point, level: float) -> gp_Pnt:
    return gp_Pnt(p[0], level, p[1]) if axis == "y" else gp_Pnt(p[0], p[1], level)


def tool_solid(tool: Tool) -> Any:
    """The kernel's solid of a tool, in member axes."""
    maker = BRepBuilderAPI_MakeWire()
    # (x, across) seen against the axis: for axis y, x turning to z is the negative sense about y.
    sense = -1.0 if tool.axis == "y" else 1.0
    for e in tool.loop:
        if isinstance(e, Line):
            edge = BRepBuilderAPI_MakeEdge(_point(tool.axis, e.start, tool.low), _point(tool.axis, e.end, tool.low))
        else:
            s = sense if e.ccw else -sense
            normal = gp_Dir(0, s, 0) if tool.axis == "y" else gp_Dir(0, 0, s)
            centre = _point(tool.axis, e.centre, tool.low)
            along = gp_Dir(gp_Vec(centre, _point(tool.axis, e.start, tool.low)))
            edge = BRepBuilderAPI_MakeEdge(gp_Circ(gp_Ax2(centre, normal, along), radius_of(e)), 0.0, sweep_of(e))
        maker.Add(edge.Edge())
    face = BRepBuilderAPI_MakeFace(maker.Wire(), True).Face()
    size = tool.high - tool.low
    vector = gp_Vec(0, size, 0) if tool.axis == "y" else gp_Vec(0, 0, size)
    return BRepPrimAPI_MakePrism(face, vector).Shape()


def tool_volume(tool: Tool, pieces: Sequence[Piece]) -> float:
    """Estimate of the material a tool removes, mm^3: chords of the section integrated over the tool's loop."""
    x0, x1, _, _ = tool.box
    length = pieces[-1].stretch.end
    fixed = 1 if tool.axis == "y" else 0
    total = 0.0
    breaks = {
        max(x0, 0.0),
        min(x1, length),
        *(p.stretch.start for p in pieces),
        *(q[0] for e in tool.loop for q in (e.start, e.end)),
    }
    marks = sorted(b for b in breaks if max(x0, 0.0) <= b <= min(x1, length))
    for a, b in itertools.pairwise(marks):
        if b - a <= 1e-9:
            continue
        cells = np.linspace(a, b, 5)
        for c0, c1 in itertools.pairwise(cells):
            for node, weight in zip(*_GAUSS, strict=True):
                x = 0.5 * (c0 + c1) + 0.5 * (c1 - c0) * node
                total += 0.5 * (c1 - c0) * weight * _removed_area(tool, pieces, float(x), fixed)
    return float(total)


def _removed_area(tool: Tool, pieces: Sequence[Piece], x: float, fixed: int) -> float:
    edges = [s.edge for loop in piece_at(pieces, x).profile(x).loops for s in loop]
    corners = sorted({q[fixed] for e in edges for q in (e.start, e.end)})
    area = 0.0
    for low, high in inside(tool.loop, 0, x):
        marks = [low, *(c for c in corners if low < c < high), high]
        for a, b in itertools.pairwise(marks):
            if b - a <= 1e-9:
                continue
            for node, weight in zip(*_GAUSS, strict=True):
                c = 0.5 * (a + b) + 0.5 * (b - a) * node
                area += 0.5 * (b - a) * weight * length_within(inside(edges, fixed, float(c)), tool.low, tool.high)
    return float(area)


def cut_out(
    solid: Any, tools: Sequence[Tool], volume: float, spare: tuple[float, float], what: str
) -> tuple[Any, float]:
    """`solid` less `tools`, and the volume it lost (mm^3).

    `volume` is the estimate of that loss. `spare` holds what earlier cuts may have taken of it, and what radii may
    have taken or added.

    Raises
    ------
    SolidError
        The cut severs the part, removes nothing, or removes another volume than it must.
    """
    first, rest = TopTools_ListOfShape(), TopTools_ListOfShape()
    first.Append(solid)
    for tool in tools:
        rest.Append(tool_solid(tool))
    cut = BRepAlgoAPI_Cut()
    cut.SetArguments(first)
    cut.SetTools(rest)
    cut.SetRunParallel(False)
    cut.Build()
    made = one_solid(cut.Shape(), what, "the cut severs the part")
    lost = volume_of(solid)[0] - volume_of(made)[0]
    if lost <= 1e-9 * volume_of(solid)[0]:
        raise SolidError(f"{what}: it meets no material; check its place, its offset and the wall it passes.")
    slack = TOLERANCE * volume
    overlap, radii = spare
    if not volume - overlap - radii - slack <= lost <= volume + radii + slack:
        raise SolidError(
            f"{what}: it removed {lost:.6g} mm^3 but should remove {volume:.6g} mm^3 (tolerance {TOLERANCE:.0%}); "
            "the geometry kernel failed on it: move or resize it slightly."
        )
    return made, lost
