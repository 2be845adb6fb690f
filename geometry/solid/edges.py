"""Edges of a solid with the two faces they join and the angle between these."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Curve2d, BRepAdaptor_Surface
from OCP.BRepLProp import BRepLProp_SLProps
from OCP.gp import gp_Pnt, gp_Vec
from OCP.TopAbs import TopAbs_EDGE, TopAbs_REVERSED
from OCP.TopExp import TopExp_Explorer
from OCP.TopoDS import TopoDS
from OCP.TopTools import TopTools_IndexedMapOfShape

from geometry.solid.kernel import faces_of, length_of

Array = NDArray[np.float64]
SMOOTH = math.radians(2.0)
"""Faces that meet at less than this are taken to pass smoothly into each other."""


@dataclass(frozen=True, slots=True)
class EdgeMark:
    """One edge of a solid.

    Attributes
    ----------
    edge
        The kernel's edge.
    faces
        Indices of the two faces it joins.
    points
        (n, 3) points along it, in the axes of the solid.
    angle
        Angle the outward normal turns through from one face to the other, rad, at the middle: positive at an
        outer (convex) edge, negative at a re-entrant one, about 0 where the faces pass smoothly.
    length
        mm.
    """

    edge: Any
    faces: tuple[int, int]
    points: Array
    angle: float
    length: float


def _outward(face: Any, adaptor: Any, edge: Any, t: float) -> Array | None:
    uv = BRepAdaptor_Curve2d(edge, face).Value(t)
    props = BRepLProp_SLProps(adaptor, uv.X(), uv.Y(), 1, 1e-9)
    if not props.IsNormalDefined():
        return None
    n = props.Normal()
    sign = -1.0 if face.Orientation() == TopAbs_REVERSED else 1.0
    return sign * np.array([n.X(), n.Y(), n.Z()])


def edge_marks(solid: Any, count: int = 33) -> list[EdgeMark]:
    """Every edge between two different faces, in the kernel's order, with `count` points along each."""
    faces = faces_of(solid)
    adaptors = [BRepAdaptor_Surface(face) for face in faces]
    order = TopTools_IndexedMapOfShape()
    uses: dict[int, list[tuple[int, Any]]] = {}
    for i, face in enumerate(faces):
        explorer = TopExp_Explorer(face, TopAbs_EDGE)
        while explorer.More():
            edge = TopoDS.Edge_s(explorer.Current())
            if not BRep_Tool.Degenerated_s(edge):
                uses.setdefault(order.Add(edge), []).append((i, edge))
            explorer.Next()
    marks = []
    for pair in uses.values():
        if len(pair) != 2 or pair[0][0] == pair[1][0]:
            continue
        (i, edge), (j, twin) = pair
        mark = _mark(edge, twin, (faces[i], faces[j]), (adaptors[i], adaptors[j]), (i, j), count)
        if mark is not None:
            marks.append(mark)
    return marks


def _mark(edge: Any, twin: Any, faces: Any, adaptors: Any, indices: tuple[int, int], count: int) -> EdgeMark | None:
    curve = BRepAdaptor_Curve(edge)
    first, last = curve.FirstParameter(), curve.LastParameter()
    points = np.array([(p.X(), p.Y(), p.Z()) for p in map(curve.Value, np.linspace(first, last, count).tolist())])
    middle = 0.5 * (first + last)
    point, along = gp_Pnt(), gp_Vec()
    curve.D1(middle, point, along)
    tangent = np.array([along.X(), along.Y(), along.Z()])
    tangent /= np.linalg.norm(tangent)
    if edge.Orientation() == TopAbs_REVERSED:
        tangent = -tangent
    n1, n2 = _outward(faces[0], adaptors[0], edge, middle), _outward(faces[1], adaptors[1], twin, middle)
    if n1 is None or n2 is None:
        return None
    angle = math.atan2(float(tangent @ np.cross(n1, n2)), float(n1 @ n2))
    return EdgeMark(edge, indices, points, angle, length_of(edge))
