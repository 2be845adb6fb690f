"""The body of a run of stretches: one exact face between each pair of section sides, sewn into a solid.

Every side of a section sweeps a plane (straight sides of one direction), a cylinder, a cone, an oblique cylinder
(arc of constant radius whose centre moves off the axis: an extruded arc), or, where none of these is exact,
a ruled face. Generic lofts are never used: they give B-spline faces that mesh badly.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from typing import Any

from OCP.BRep import BRep_Builder
from OCP.BRepBuilderAPI import (
    BRepBuilderAPI_MakeEdge,
    BRepBuilderAPI_MakeFace,
    BRepBuilderAPI_MakePolygon,
    BRepBuilderAPI_MakeSolid,
    BRepBuilderAPI_MakeWire,
    BRepBuilderAPI_Sewing,
)
from OCP.BRepFill import BRepFill
from OCP.BRepPrimAPI import BRepPrimAPI_MakePrism, BRepPrimAPI_MakeRevol
from OCP.gp import gp_Ax1, gp_Ax2, gp_Circ, gp_Dir, gp_Pln, gp_Pnt, gp_Vec
from OCP.TopAbs import TopAbs_SHELL
from OCP.TopExp import TopExp_Explorer
from OCP.TopoDS import TopoDS, TopoDS_Shell

from geometry.outline import Arc, Edge, Line, Point
from geometry.problem import SolidError
from geometry.solid.kernel import faces_of, one_solid, volume_of
from geometry.solid.profile import Profile, Side

TINY = 1e-7
"""Lengths below this (mm) are nothing."""


def _pnt(x: float, p: Point) -> gp_Pnt:
    return gp_Pnt(x, p[0], p[1])


def _far(p: Point, q: Point) -> float:
    return math.hypot(q[0] - p[0], q[1] - p[1])


def radius_of(arc: Arc) -> float:
    """Radius of an arc, mm."""
    return _far(arc.centre, arc.start)


def sweep_of(arc: Arc) -> float:
    """Angle an arc turns through, rad, positive either way round."""
    a = math.atan2(arc.start[1] - arc.centre[1], arc.start[0] - arc.centre[0])
    b = math.atan2(arc.end[1] - arc.centre[1], arc.end[0] - arc.centre[0])
    turn = (b - a) if arc.ccw else (a - b)
    return turn % (2.0 * math.pi) or 2.0 * math.pi


def kernel_edge(edge: Edge, x: float) -> Any:
    """The kernel's edge for a section edge in the plane at `x`; None where it has shrunk to a point."""
    if isinstance(edge, Line):
        if _far(edge.start, edge.end) <= TINY:
            return None
        return BRepBuilderAPI_MakeEdge(_pnt(x, edge.start), _pnt(x, edge.end)).Edge()
    radius = radius_of(edge)
    if radius <= TINY:
        return None
    along = gp_Vec(_pnt(x, edge.centre), _pnt(x, edge.start))
    axes = gp_Ax2(_pnt(x, edge.centre), gp_Dir(1.0 if edge.ccw else -1.0, 0.0, 0.0), gp_Dir(along))
    return BRepBuilderAPI_MakeEdge(gp_Circ(axes, radius), 0.0, sweep_of(edge)).Edge()


def section_face(profile: Profile, x: float) -> Any:
    """The plane face of a section at `x`."""
    wires = []
    for loop in profile.loops:
        maker = BRepBuilderAPI_MakeWire()
        for side in loop:
            edge = kernel_edge(side.edge, x)
            if edge is not None:
                maker.Add(edge)
        if not maker.IsDone():
            raise SolidError(f"section at {x:g} mm: its sides do not close to a loop.")
        wires.append(maker.Wire())
    face = BRepBuilderAPI_MakeFace(gp_Pln(gp_Pnt(x, 0, 0), gp_Dir(1, 0, 0)), wires[0], True)
    for wire in wires[1:]:
        face.Add(wire)
    if not face.IsDone():
        raise SolidError(f"section at {x:g} mm: its loops do not bound a face.")
    return face.Face()


def side_face(a: Edge, b: Edge, xa: float, xb: float) -> Any:
    """The exact face between one side of the section at `xa` and the same side at `xb`; None if there is none.

    Raises
    ------
    SolidError
        A radius runs out to zero along the stretch.
    """
    if isinstance(a, Line) or isinstance(b, Line):
        return _straight_face(a, b, xa, xb)
    ra, rb = radius_of(a), radius_of(b)
    if min(ra, rb) <= TINY:
        if max(ra, rb) <= TINY:
            return None
        raise SolidError(
            f"a radius runs from {ra:g} to {rb:g} mm between {xa:g} and {xb:g} mm; keep it above zero at both ends."
        )
    edge = kernel_edge(a, xa)
    if _far(a.centre, b.centre) <= TINY:
        axis = gp_Ax1(_pnt(xa, a.centre), gp_Dir(1.0 if a.ccw else -1.0, 0.0, 0.0))
        generator = BRepBuilderAPI_MakeEdge(_pnt(xa, a.start), _pnt(xb, b.start)).Edge()
        return TopoDS.Face_s(BRepPrimAPI_MakeRevol(generator, axis, sweep_of(a)).Shape())
    if abs(ra - rb) <= TINY:
        return TopoDS.Face_s(BRepPrimAPI_MakePrism(edge, gp_Vec(_pnt(xa, a.centre), _pnt(xb, b.centre))).Shape())
    return BRepFill.Face_s(edge, kernel_edge(b, xb))


def _straight_face(a: Edge, b: Edge, xa: float, xb: float) -> Any:
    points = [_pnt(xa, a.start), _pnt(xa, a.end), _pnt(xb, b.end), _pnt(xb, b.start)]
    corners: list[gp_Pnt] = []
    for point in points:
        if not corners or point.Distance(corners[-1]) > TINY:
            corners.append(point)
    if corners[0].Distance(corners[-1]) <= TINY:
        corners.pop()
    if len(corners) < 3:
        return None
    if len(corners) == 4:
        u, v, w = (gp_Vec(corners[0], c) for c in corners[1:])
        off = abs(u.Crossed(w).Dot(v)) / max(u.Crossed(w).Magnitude(), 1e-300)
        if off > 1e-7 * (1.0 + v.Magnitude()):
            return BRepFill.Face_s(kernel_edge(a, xa), kernel_edge(b, xb))
    polygon = BRepBuilderAPI_MakePolygon()
    for corner in corners:
        polygon.Add(corner)
    polygon.Close()
    face = BRepBuilderAPI_MakeFace(polygon.Wire(), True)
    if not face.IsDone():
        raise SolidError(f"a side between {xa:g} and {xb:g} mm gave no plane face.")
    return face.Face()


def lofted(sections: Sequence[tuple[float, Profile]], what: str) -> Any:
    """One solid through `sections` (place in mm, profile), all drawn with the same sides in the same order.

    Raises
    ------
    SolidError
        The sides do not match, or the faces do not close to one valid solid.
    """
    sewing = BRepBuilderAPI_Sewing(1e-6)
    # The first cap looks outwards (-x); sewing turns the other faces to agree with it.
    sewing.Add(section_face(sections[0][1], sections[0][0]).Reversed())
    for (xa, pa), (xb, pb) in itertools.pairwise(sections):
        for loop_a, loop_b in zip(pa.loops, pb.loops, strict=True):
            for a, b in _matched(loop_a, loop_b, xa, xb):
                face = side_face(a.edge, b.edge, xa, xb)
                if face is not None:
                    sewing.Add(face)
    sewing.Add(section_face(sections[-1][1], sections[-1][0]))
    sewing.Perform()
    explorer = TopExp_Explorer(sewing.SewedShape(), TopAbs_SHELL)
    if not explorer.More() or sewing.NbFreeEdges():
        raise SolidError(f"{what}: its faces do not close ({sewing.NbFreeEdges()} free edges).")
    return one_solid(_outward(explorer.Current()), what)


def _outward(shell: Any) -> Any:
    """A solid of `shell` with its faces turned outwards one by one: the fillet maker fails on a reversed solid."""
    solid = BRepBuilderAPI_MakeSolid(TopoDS.Shell_s(shell)).Solid()
    if volume_of(solid)[0] > 0.0:
        return solid
    turned, builder = TopoDS_Shell(), BRep_Builder()
    builder.MakeShell(turned)
    for face in faces_of(shell):
        builder.Add(turned, face.Reversed())
    turned.Closed(True)
    return BRepBuilderAPI_MakeSolid(turned).Solid()


def _matched(a: tuple[Side, ...], b: tuple[Side, ...], xa: float, xb: float) -> list[tuple[Side, Side]]:
    if len(a) != len(b):
        raise SolidError(
            f"the section has {len(a)} sides at {xa:g} mm but {len(b)} at {xb:g} mm: a radius runs out to zero; "
            "keep it above zero at both ends or make a step."
        )
    return list(zip(a, b, strict=True))
