"""The member cut into short lengths, with their transfer matrices, and the regions that lie on them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fem.beam.along import Sections, SectionSolver
from fem.beam.axes import member_axes
from fem.beam.cut_faces import cut_faces
from fem.beam.cut_stiffness import extent
from fem.beam.element import GAUSS, transfer_matrices
from fem.beam.equations import Line
from fem.beam.faces import FACES, curve, face_edges, strip
from fem.beam.law import LineProperties
from fem.beam.outlines.net_sections import taken_at
from fem.beam.regions import EndFace, Face, Region, Strip
from geometry.part import LineLoad, Member, Part, StripLoad
from geometry.problem import RunError

Array = NDArray[np.float64]
LENGTHS = 100
"""Least number of lengths that the member is cut into."""


@dataclass(frozen=True)
class BeamMesh:
    """Geometry of one member's beam model: nodes `x` (m + 1,), sections, axes."""

    part: Part
    member: Member
    sections: Sections
    axes: Array
    length: float
    x: Array
    shear: bool = True
    cut_factor: float = 1.0
    """Multiple of what cuts add to the axial and bending flexibility by their net section (see `fem.beam.causes`)."""
    warp_everywhere: bool = False
    """Give the seventh freedom to solid and closed sections as well (see `fem.beam.causes`)."""

    @classmethod
    def of(cls, part: Part, solver: SectionSolver, shear: bool = True) -> BeamMesh:
        """Sections and nodes of the only member of a part."""
        if len(part.members) != 1:
            raise RunError("beam", f"the beam model takes parts of one member; this one has {len(part.members)}")
        member = part.members[0]
        axes, length = member_axes(member)
        return cls(part, member, Sections(member, length, part.material.nu, solver), axes, length,
                   _nodes(part, member, length), shear)

    def finer(self, part: Part, steps: int, lengths: int) -> BeamMesh:
        """The same member with the nodes that `part` (other loads and supports) needs, nodes at `steps` equal steps
        and at least so many lengths."""
        return replace(self, part=part, x=_nodes(part, self.member, self.length, steps, lengths))

    def node(self, x: float) -> int:
        """Index of the node at `x`."""
        k = int(np.argmin(np.abs(self.x - x)))
        if abs(self.x[k] - x) > 1e-6 * self.length:
            raise RunError("beam", f"x = {x:.6g} mm is not on member {self.member.name} (0 to {self.length:.6g} mm)")
        return k

    @cached_property
    def gauss(self) -> Array:
        """(2m,) two Gauss points of each length."""
        h = np.diff(self.x)
        return np.asarray((self.x[:-1, None] + h[:, None] * GAUSS).ravel())

    def stiffness(self, x: Array) -> LineProperties:
        """Properties that the stiffness is made from."""
        p = self.sections.net(x)
        if self.cut_factor != 1.0 and self.sections.effects:
            g = self.sections.gross(x)
            mixed = {n: 1.0 / (1.0 / getattr(g, n) + self.cut_factor * (1.0 / getattr(p, n) - 1.0 / getattr(g, n)))
                     for n in ("area", "Iyy", "Izz")}
            p = replace(p, **mixed)
        if not self.shear:
            p.shear[:] = 0.0
        return p

    def warps(self, x: Array) -> NDArray[np.bool_]:
        """Whether the lengths with middles `x` (m,) have the seventh freedom."""
        thin = np.array([self.sections.piece(float(v)).open_thin for v in x])
        if not self.warp_everywhere:
            return thin
        p = self.sections.net(x)
        reach = np.sqrt(np.maximum(p.Iw, 0.0) * 2.0 * (1.0 + self.part.material.nu) / p.J)
        # a decay over less than a twentieth of a length has no effect and cannot be resolved
        return np.asarray(thin | (reach > np.diff(self.x) / 20.0))

    @cached_property
    def line(self) -> Line:
        """Transfer matrices of both halves of each length."""
        mid = 0.5 * (self.x[:-1] + self.x[1:])
        halves = np.stack([np.stack([self.x[:-1], mid], 1), np.stack([mid, self.x[1:]], 1)], axis=1)
        material = self.part.material
        G = material.E / (2.0 * (1.0 + material.nu))
        warping = self.warps(mid)
        matrices: list[tuple[Array, Array]] = [None] * len(mid)  # type: ignore[list-item]
        for flag in (False, True):
            which = np.flatnonzero(warping == flag)
            if len(which):
                M = transfer_matrices(halves[which].reshape(-1, 2), self.stiffness, material.E, G, flag)
                for k, e in enumerate(which):
                    matrices[e] = (M[2 * k], M[2 * k + 1])
        return Line(self.x, warping, matrices)

    def region(self, name: str) -> Region:
        """The region ``member.name``.

        Raises
        ------
        RunError
            Stage ``beam``: there is no such region, or the section has no such face.
        """
        member, _, what = name.partition(".")
        if member != self.member.name:
            raise RunError("beam", f"region {name}: the part has no member {member}")
        if what in ("start", "end"):
            return self._end(name, what)
        if what in FACES:
            return self._face(name, what, 0.0, self.length)
        for patch in self.member.patches:
            if patch.name == what:
                axis = 0 if patch.face in ("top", "bottom") else 1
                across = None if patch.across is None else (axis, *patch.across)
                return self._face(name, patch.face, patch.start, patch.end, across)
        cuts = [c for c in self.member.cuts if what in (c.name, c.group)]
        if cuts:
            return cut_faces(name, cuts, [self.node(c.at) for c in cuts], self.sections)
        for load in self.part.loads:
            if isinstance(load, LineLoad) and what == f"load:{load.name}":
                return self._face(name, load.on.partition(".")[2], load.start, load.end)
        raise RunError("beam", f"region {name} is not on member {member}; it has start, end, {', '.join(FACES)}, its "
                       "cuts and its patches")

    def _end(self, name: str, which: str) -> EndFace:
        x, k, sign = (0.0, 0, -1.0) if which == "start" else (self.length, len(self.x) - 1, 1.0)
        outline = self._outline(x)
        p = self.sections.gross(np.array([x]), "after" if which == "start" else "before")
        t = np.array([0.0, 1 / 3, 2 / 3])  # enough to tell a circle from a line
        yz = np.vstack([curve(e, t)[0] for loop in (outline.outer, *outline.inner) for e in loop])
        corners = np.column_stack([np.full(len(yz), x), yz])
        return EndFace(name, k, float(p.area[0]), np.array([x, p.yc[0], p.zc[0]]), corners, np.array([sign, 0.0, 0.0]))

    def _outline(self, x: float):  # type: ignore[no-untyped-def]
        tiny = 1e-9 * self.length
        return self.sections.outline(min(max(x, tiny), self.length - tiny))

    def _face(
        self, name: str, face: str, start: float, end: float, across: tuple[int, float, float] | None = None
    ) -> Face:
        first, last = self.node(start), self.node(end)
        lengths = np.arange(first, last)
        h = np.diff(self.x)[lengths]
        strips = [self._strip(name, face, float(x), int(e), across)
                  for e, pair in zip(lengths, self.gauss.reshape(-1, 2)[lengths], strict=True) for x in pair]
        ends = [self._strip(name, face, float(self.x[k]), min(k, last - 1), across) for k in range(first, last + 1)]
        e = self.sections.integrals(0.5 * (start + end)).extremes
        depth = max(float(e[0, 1] - e[1, 1]), float(e[3, 0] - e[2, 0]))
        return Face(name, lengths, h, tuple(strips), tuple(ends), depth)

    def face_middle(self, face: str, x: float, e: int) -> Array:
        """(3,) middle of a face's width at `x` in length `e`, from the line there; NaN where cuts take all of it."""
        piece = self.sections.piece(x)
        cut = any(effect.start < x < effect.end for effect in self.sections.effects)
        key = (face, piece.start if piece.constant and not cut else x)
        if key not in self._middles:
            s = self._strip(f"{self.member.name}.{face}", face, x, e, None)
            yz = s.weight @ s.points[:, 1:] / s.weight.sum() if len(s.points) else np.full(2, np.nan)
            self._middles[key] = np.array([0.0, *yz])
        return self._middles[key]

    @cached_property
    def _middles(self) -> dict[tuple[str, float], Array]:
        return {}

    def _strip(self, name: str, face: str, x: float, e: int, across: tuple[int, float, float] | None) -> Strip:
        """Strip at `x`, with outlines taken inside length `e` (one side of a step)."""
        a, b = float(self.x[e]), float(self.x[e + 1])
        inset = 1e-6 * (b - a)
        before, after = self.sections.outline(a + inset), self.sections.outline(b - inset)
        edges = face_edges(before, face, tips=self.member.section.shape == "I")
        if not edges:
            raise RunError("beam", f"region {name}: a {self.member.section.shape} has no plane face {face}")
        cuts = tuple(c for c in self.member.cuts if extent(c)[0] < x < extent(c)[1])
        taken = taken_at(self.member, x, "before" if x == b else "after", cuts) if cuts else ()
        share = (x - a - inset) / (b - a - 2 * inset)
        return strip(x, share, before, after, b - a - 2 * inset, edges, across, taken)


def _nodes(part: Part, member: Member, length: float, steps: int = 20, lengths: int = LENGTHS) -> Array:
    """Nodes at everything that happens, and enough of them between."""
    marks = [0.0, length, *(k * length / steps for k in range(steps + 1))]
    marks += [s.at for s in member.stations]
    marks += [s.at + w * s.shoulder_fillet for s in member.stations for w in (-1.0, 1.0) if s.shoulder_fillet]
    for cut in member.cuts:
        a, b = extent(cut)
        # the net section changes like a square root at the rim of a round hole: nodes gather there
        marks += list(0.5 * (a + b) - 0.5 * (b - a) * np.cos(np.linspace(0.0, np.pi, 9)))
        marks.append(cut.at)
    for patch in member.patches:
        marks += list(np.linspace(patch.start, patch.end, 9))
    for load in part.loads:
        if isinstance(load, LineLoad):
            marks += [load.start, load.end]
        elif isinstance(load, StripLoad):
            marks += [min(max(c + w * load.length, 0.0), length) for c in load.centres for w in (-0.5, 0.5)]
    marks += [p.at for p in part.places if p.member == member.name]
    marks = [v for v in marks if -1e-9 * length <= v <= length * (1 + 1e-9)]
    x = np.unique(np.clip(marks, 0.0, length))
    x = x[np.concatenate([[True], np.diff(x) > 1e-7 * length])]
    parts = [np.linspace(a, b, max(1, int(np.ceil((b - a) * lengths / length - 1e-9))) + 1)[:-1]
             for a, b in zip(x[:-1], x[1:], strict=True)]
    return np.concatenate([*parts, [length]])
