"""The curves in which a plane across the member cuts the faces of a solid, and the integrals over the cut.

Each face is cut by itself: where its edges pass the plane, and between two such points along the face, by Newton's
method at Gauss points. Green's theorem turns the integrals over the cut into ones along these curves. That is exact for
straight ones and good to rounding for arcs, and takes a tenth of the kernel's own intersection of surfaces.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Curve, BRepAdaptor_Curve2d, BRepAdaptor_Surface
from OCP.GeomAbs import GeomAbs_Line, GeomAbs_Plane
from OCP.gp import gp_Pnt, gp_Vec
from OCP.TopAbs import TopAbs_EDGE, TopAbs_REVERSED
from OCP.TopExp import TopExp_Explorer
from OCP.TopoDS import TopoDS

from geometry.solid.kernel import faces_of

Array = NDArray[np.float64]
SAMPLES = 17
"""Points along an edge between which it is taken to pass a plane once at most."""
CLOSED = 1e-6
"""mm between the end of one curve of a cut and the start of the next."""
_T, _W = np.polynomial.legendre.leggauss(16)


class PlaneCuts:
    """A solid (member axes, mm), ready to be cut at any x."""

    def __init__(self, solid: Any) -> None:
        self._faces = [_Face(face) for face in faces_of(solid)]

    def moments(self, x: float) -> Array | None:
        """(6,) int 1, y, z, y^2, y z, z^2 over the cut at `x`, or None where the cut is not plain: a face passed more
        than twice, or touched, or curves that do not close. The kernel must decide then."""
        total = np.zeros(6)
        ends: list[Array] = []
        for face in self._faces:
            if not face.low < x < face.high:
                continue
            found = face.cut(x)
            if found is None:
                return None
            share, points = found
            total += share
            ends += points
        return total if _pair_up(ends) else None


def _pair_up(ends: Sequence[Array]) -> bool:
    """Whether each end of a curve is the end of exactly one other."""
    if not ends:
        return False
    points = np.array(ends)
    near = np.linalg.norm(points[:, None] - points, axis=2) < CLOSED
    return bool(np.all(near.sum(axis=1) == 2))


class _Face:
    """One face: its surface, its edges in its parameters, and the range of x that it spans."""

    def __init__(self, face: Any) -> None:
        self.surface = BRepAdaptor_Surface(face)
        self.sign = -1.0 if face.Orientation() == TopAbs_REVERSED else 1.0
        self.plane = self.surface.GetType() == GeomAbs_Plane
        self.edges: list[tuple[Any, Any, Array, Array]] = []
        explorer = TopExp_Explorer(face, TopAbs_EDGE)
        while explorer.More():
            edge = TopoDS.Edge_s(explorer.Current())
            explorer.Next()
            if BRep_Tool.Degenerated_s(edge):
                continue
            curve = BRepAdaptor_Curve(edge)
            count = 2 if curve.GetType() == GeomAbs_Line else SAMPLES
            t = np.linspace(curve.FirstParameter(), curve.LastParameter(), count)
            x = np.array([curve.Value(float(v)).X() for v in t])
            self.edges.append((curve, BRepAdaptor_Curve2d(edge, face), t, x))
        every = np.concatenate([x for _, _, _, x in self.edges]) if self.edges else np.zeros(1)
        self.low, self.high = float(every.min()), float(every.max())

    def cut(self, x: float) -> tuple[Array, list[Array]] | None:
        """Share of this face in the integrals and the two ends (y, z) of its curve; None where it is not plain."""
        passed = []
        for curve, curve2d, t, along in self.edges:
            if np.any(np.abs(along - x) < 1e-7):
                return None
            for k in np.flatnonzero((along[:-1] > x) != (along[1:] > x)):
                uv = curve2d.Value(_root(curve, float(t[k]), float(t[k + 1]), x))
                passed.append((uv.X(), uv.Y()))
        if len(passed) != 2:
            return None
        return self._straight(passed, x) if self.plane else self._curved(passed, x)

    def _straight(self, passed: Sequence[tuple[float, float]], x: float) -> tuple[Array, list[Array]]:
        ends = [self.surface.Value(u, v) for u, v in passed]
        a, b = (np.array([p.Y(), p.Z()]) for p in ends)
        normal = self._normal(*passed[0])
        if _turn(b - a, normal) > 0:  # the outward normal lies on the right of the way round
            a, b = b, a
        s = 0.5 * (_T + 1.0)[:, None]
        return _green(a + s * (b - a), np.full(len(_T), (b - a)[1])), [a, b]

    def _curved(self, passed: Sequence[tuple[float, float]], x: float) -> tuple[Array, list[Array]] | None:
        first, last = (np.array(p) for p in passed)
        chord = last - first
        if not np.abs(chord).max() > 0.0:
            return None
        across = np.array([-chord[1], chord[0]])
        point, du, dv = gp_Pnt(), gp_Vec(), gp_Vec()
        places, rates = [], []
        for t in (-1.0, *_T, 1.0):
            uv = first + 0.5 * (t + 1.0) * chord
            for _ in range(20):
                self.surface.D1(float(uv[0]), float(uv[1]), point, du, dv)
                slope = du.X() * across[0] + dv.X() * across[1]
                miss = point.X() - x
                if abs(miss) < 1e-10 or slope == 0.0:
                    break
                uv = uv - across * (miss / slope)
            if abs(point.X() - x) > 1e-8:
                return None
            # Along the curve x stays: the rate of the step across follows from that.
            ahead = du.X() * chord[0] + dv.X() * chord[1]
            step = chord - across * (ahead / slope) if abs(ahead) > 0.0 else chord
            places.append((point.Y(), point.Z()))
            rates.append((du.Y() * step[0] + dv.Y() * step[1], du.Z() * step[0] + dv.Z() * step[1]))
            if t == _T[len(_T) // 2]:
                normal = self.sign * np.array([du.Crossed(dv).Y(), du.Crossed(dv).Z()])
                turn = _turn(np.array(rates[-1]), normal)
        points, slopes = np.array(places), np.array(rates)
        share = _green(points[1:-1], slopes[1:-1, 1])
        return (-share if turn > 0 else share), [points[0], points[-1]]

    def _normal(self, u: float, v: float) -> Array:
        point, du, dv = gp_Pnt(), gp_Vec(), gp_Vec()
        self.surface.D1(u, v, point, du, dv)
        normal = du.Crossed(dv)
        return self.sign * np.array([normal.Y(), normal.Z()])


def _turn(a: Array, b: Array) -> float:
    return float(a[0] * b[1] - a[1] * b[0])


def _root(curve: Any, a: float, b: float, x: float) -> float:
    """Parameter between `a` and `b` at which the curve passes `x`: Newton's method, kept within by halving."""
    low, high = (a, b) if curve.Value(a).X() < x else (b, a)
    t = 0.5 * (a + b)
    point, along = gp_Pnt(), gp_Vec()
    for _ in range(60):
        curve.D1(t, point, along)
        miss = point.X() - x
        if abs(miss) < 1e-11:
            break
        if miss < 0.0:
            low = t
        else:
            high = t
        step = t - miss / along.X() if along.X() != 0.0 else low
        t = step if min(low, high) < step < max(low, high) else 0.5 * (low + high)
    return t


def _green(points: Array, dz: Array) -> Array:
    """(6,) share of one curve in the integrals; `points` (n, 2) at the Gauss points, `dz` (n,) change of z over it."""
    y, z = points.T
    w = 0.5 * _W * dz
    return np.array([y @ w, (y * y) @ w / 2, (y * z) @ w, (y**3) @ w / 3, (y * y * z) @ w / 2, (y * z * z) @ w])
