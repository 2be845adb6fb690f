"""Section properties along one member: smooth pieces between stations, and what cuts leave of them.

Area, centroid and second moments are exact integrals at Chebyshev points of each piece (they are polynomials in x
there). Torsion constant, shear compliance, shear centre and warping constant come from finite-element section
analyses: one for a prismatic piece, five for a tapered one, all meshed together. J and C are interpolated as multiples
of A^4/I_p and 1/A, which vary little.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from fem.beam.cut_stiffness import NetEffect, net_effects
from fem.beam.interpolate import between, loops, points, same_make
from fem.beam.law import LineProperties
from fem.beam.outlines import dims_slope, member_outline, net_section
from fem.beam.section import OutlineIntegrals, SectionProperties, outline_integrals, sections_properties
from fem.beam.taper_shear import level_shear, tapered_shear
from geometry.outline import Outline
from geometry.part import Member

Array = NDArray[np.float64]
SectionSolver = Callable[[Sequence[Outline], float], Sequence[SectionProperties]]
EXACT_POINTS, SOLVED_POINTS = 9, 5


@dataclass(frozen=True, slots=True)
class Piece:
    """Smooth piece of the member from `start` to `end`, mm; tables of Chebyshev coefficients, first axis the degree.

    `exact`: A, yc, zc, Iyy, Izz, Iyz. `solved`: J Ip / A^4, ys - yc, zs - zc, Iw, warping (4), shear form times A (25).
    """

    start: float
    end: float
    constant: bool
    exact: Array
    solved: Array
    open_thin: bool

    def _t(self, x: Array) -> Array:
        return (2.0 * x - self.start - self.end) / (self.end - self.start)

    def exact_at(self, x: Array) -> Array:
        """(6, m)"""
        return np.asarray(chebyshev.chebval(self._t(x), self.exact))

    def slope_at(self, x: Array) -> Array:
        """(2, m) inclination of the centroid line, dyc/dx and dzc/dx."""
        rate = 2.0 / (self.end - self.start)
        return np.asarray(rate * chebyshev.chebval(self._t(x), chebyshev.chebder(self.exact[:, 1:3])))

    def solved_at(self, x: Array) -> Array:
        """(33, m)"""
        return np.asarray(chebyshev.chebval(self._t(x), self.solved))


def chebyshev_points(start: float, end: float, count: int) -> Array:
    """Interior Chebyshev points of an interval."""
    t = np.cos(np.pi * (np.arange(count) + 0.5) / count)[::-1]
    return np.asarray(0.5 * (start + end) + 0.5 * (end - start) * t)


def fitted(start: float, end: float, points: Array, values: Array) -> Array:
    """Chebyshev coefficients of the polynomial through values (k, q) at its Chebyshev points."""
    t = (2.0 * points - start - end) / (end - start)
    return np.asarray(chebyshev.chebfit(t, values, len(points) - 1))


class Sections:
    """Properties at any x of a member.

    Parameters
    ----------
    length
        Length of the member, mm.
    nu
        Poisson's ratio (the shear compliance depends on it).
    solver
        Section analysis of many outlines at once.
    """

    def __init__(self, member: Member, length: float, nu: float, solver: SectionSolver = sections_properties) -> None:
        self.member, self.length = member, length
        self._ends: dict[int, tuple[Outline, Outline] | None] = {}
        self._integrals: dict[float, OutlineIntegrals] = {}
        self._shear: dict[float, tuple[Array, Array]] = {}
        self._net: dict[Hashable, OutlineIntegrals] = {}
        self._net_at: dict[tuple[bytes, str], LineProperties] = {}
        cuts = sorted({0.0, length, *(s.at for s in member.stations if 0.0 < s.at < length)})
        spans = list(zip(cuts[:-1], cuts[1:], strict=True))
        constant = [not any(dims_slope(member, 0.5 * (a + b)).values()) for a, b in spans]
        at = [np.array([0.5 * (a + b)]) if c else chebyshev_points(a, b, SOLVED_POINTS)
                  for (a, b), c in zip(spans, constant, strict=True)]
        results = iter(solver([member_outline(member, float(x)) for p in at for x in p], nu))
        solved = [[next(results) for _ in p] for p in at]
        self.solved = tuple(s for group in solved for s in group)
        self.pieces = tuple(self._piece(a, b, c, p, s)
                            for (a, b), c, p, s in zip(spans, constant, at, solved, strict=True))
        self.effects: tuple[NetEffect, ...] = net_effects(member, nu)

    def _piece(self, a: float, b: float, constant: bool, points: Array, solved: list[SectionProperties]) -> Piece:
        if constant:
            at = points
        else:
            at = chebyshev_points(a, b, EXACT_POINTS)
        exact = [outline_integrals(member_outline(self.member, float(x))) for x in at]
        table = np.array([[o.area, o.yc, o.zc, o.Iyy, o.Izz, o.Iyz] for o in exact])
        rows = []
        for x, s in zip(points, solved, strict=True):
            Q = np.zeros((5, 5))
            Q[:2, :2] = s.shear_compliance
            if not constant:
                step = 1e-4 * (b - a)
                Q = tapered_shear(lambda v: member_outline(self.member, v), float(x), step, s.shear_compliance)
            rows.append([s.J * (s.Iyy + s.Izz) / s.area**4, s.ys - s.yc, s.zs - s.zc, s.Iw, *s.warping,
                         *(Q * s.area).ravel()])
        return Piece(a, b, constant, fitted(a, b, at, table), fitted(a, b, points, np.array(rows)),
                     any(s.open_thin for s in solved))

    def piece(self, x: float, side: str = "after") -> Piece:
        """The piece that holds `x`."""
        for piece in self.pieces:
            if x < piece.end or (x == piece.end and side == "before"):
                return piece
        return self.pieces[-1]

    def outline(self, x: float) -> Outline:
        """Outline without cuts, member axes from the line."""
        k = self.pieces.index(self.piece(x))
        if k not in self._ends:
            self._ends[k] = self._end_outlines(self.pieces[k])
        ends = self._ends[k]
        if ends is None:
            return member_outline(self.member, x)
        piece = self.pieces[k]
        return ends[0] if piece.constant else between(*ends, (x - piece.start) / (piece.end - piece.start))

    def _end_outlines(self, piece: Piece) -> tuple[Outline, Outline] | None:
        """Outlines at both ends of a piece when every point moves straight between them, else None."""
        ends = member_outline(self.member, piece.start), member_outline(self.member, piece.end, "before")
        middle = member_outline(self.member, 0.5 * (piece.start + piece.end))
        if [len(loop) for loop in loops(ends[0])] != [len(loop) for loop in loops(ends[1])]:
            return None
        gap = points(between(*ends, 0.5)) - points(middle) if same_make(ends[0], middle) else np.inf
        return ends if np.max(np.abs(gap)) < 1e-9 * float(np.ptp(points(ends[0]))) else None

    def integrals(self, x: float) -> OutlineIntegrals:
        """Exact integrals of the outline without cuts."""
        piece = self.piece(x)
        at = piece.start if piece.constant else x
        if at not in self._integrals:
            self._integrals[at] = outline_integrals(self.outline(x))
        return self._integrals[at]

    def net_outlines(self, x: float) -> tuple[Outline, ...]:
        """Pieces that the cuts near `x` leave of the outline there."""
        near = tuple(c for e in self.effects if e.start < x < e.end for c in e.cuts)
        return net_section(self.member, x, cuts=near, gross=self.outline(x))

    def both_integrals(self, x: float) -> tuple[OutlineIntegrals, OutlineIntegrals]:
        """Exact integrals without and with the cuts taken off."""
        key = self.net_key(x)
        if key not in self._net:
            self._net[key] = outline_integrals(self.net_outlines(x))
        return self.integrals(x), self._net[key]

    def net_key(self, x: float) -> Hashable:
        """Equal where net sections are: like cuts of a prismatic stretch share theirs; a round hole is symmetric."""
        here = [e for e in self.effects if e.start < x < e.end]
        piece = self.piece(x)
        if not piece.constant or len(here) != 1 or len(here[0].cuts) != 1:
            return x
        cut = here[0].cuts[0]
        away = x - cut.at
        shape = replace(cut, name="", group="", at=0.0)
        return piece.start, shape, round(abs(away) if cut.kind == "hole" else away, 7)

    def unit_shear(self, x: float) -> tuple[Array, Array]:
        """Mean shear stress at the centroid's level for unit (V, N, M), along z and along y (see `level_shear`)."""
        piece = self.piece(x)
        at = 0.5 * (piece.start + piece.end) if piece.constant else x
        if at not in self._shear:
            step = 1e-4 * self.length
            self._shear[at] = level_shear(self.outline, at, step)
        return self._shear[at]

    def gross(self, x: Array, side: str = "after") -> LineProperties:
        """Properties without cuts at points x (m,)."""
        x = np.atleast_1d(np.asarray(x, dtype=float))
        which = np.array([self.pieces.index(self.piece(float(v), side)) for v in x])
        exact, solved, slope = np.zeros((6, len(x))), np.zeros((33, len(x))), np.zeros((2, len(x)))
        for k in np.unique(which):
            here = which == k
            exact[:, here] = self.pieces[k].exact_at(x[here])
            solved[:, here] = self.pieces[k].solved_at(x[here])
            slope[:, here] = self.pieces[k].slope_at(x[here])
        A, yc, zc, Iyy, Izz, Iyz = exact
        shear = (solved[8:] / A).T.reshape(-1, 5, 5)
        return LineProperties(A, yc, zc, Iyy, Izz, Iyz, yc + solved[1], zc + solved[2],
                              solved[0] * A**4 / (Iyy + Izz), solved[3], shear, *slope)

    def warping_at_extremes(self, x: float, side: str = "after") -> Array:
        """(4,) warping function at the extreme points, mm^2."""
        return self.piece(x, side).solved_at(np.array([x]))[4:8, 0]

    def net(self, x: Array, side: str = "after") -> LineProperties:
        """Properties with cuts taken off at points x (m,)."""
        x = np.atleast_1d(np.asarray(x, dtype=float))
        key = x.tobytes(), side  # the same points are asked for again by every model of this member
        if key not in self._net_at:
            p = self.gross(x, side)
            for effect in self.effects:
                here = np.flatnonzero((x > effect.start) & (x < effect.end))
                if len(here):
                    p = effect.apply(p, x, here, self.both_integrals)
            self._net_at[key] = p
        p = self._net_at[key]
        return replace(p, shear=p.shear.copy())  # callers change it
