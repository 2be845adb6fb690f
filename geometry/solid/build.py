"""From a `Part` to a `NamedSolid`, one step after the other."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, NamedTuple

import numpy as np

from geometry.named_solid import FaceMark, NamedSolid
from geometry.part import BodyLoad, Member, Part, TemperatureLoad
from geometry.problem import SolidError
from geometry.solid import kernel
from geometry.solid.body import Piece, bounds, joined, pieces_of
from geometry.solid.cuts import TOLERANCE as CUT_TOLERANCE
from geometry.solid.cuts import Tool, cut_out, tool_volume, tools_of
from geometry.solid.estimate import gross_volume
from geometry.solid.fillets import BAND
from geometry.solid.frame import Frame, member_frame
from geometry.solid.hints import least_wall, sharp_edges, size_hints
from geometry.solid.imprint import Strip, imprinted, strips_of
from geometry.solid.radii import Radius, edge_radii, shoulder_fillets
from geometry.solid.regions import end_label, on_tool, side_labels
from geometry.solid.samples import FaceSamples, sample_faces
from geometry.solid.slices import slice_places, slices_of
from geometry.solid.stretches import stretches_of

GROSS_TOLERANCE = 1e-6
"""Largest relative difference between the volume of an uncut, unfilleted member and its estimate."""


@dataclass(slots=True)
class _Work:
    """The solid while it is being made (member axes, mm), with the volume it must have and the slack on that."""

    member: Member
    pieces: Sequence[Piece]
    solid: Any
    estimate: float
    slack: float
    tools: list[Tool] = field(default_factory=list)
    radii: list[Radius] = field(default_factory=list)

    @property
    def length(self) -> float:
        return self.pieces[-1].stretch.end

    @property
    def reach(self) -> float:
        """A distance from the line that lies outside the part."""
        corners = (v for p in self.pieces for q in (p.first, p.last) for b in bounds(q) for v in b)
        return 2.0 * max(abs(v) for v in corners) + 10.0

    def add_radii(self, solid: Any, made: Sequence[Radius]) -> None:
        self.solid = solid
        self.radii += made
        self.estimate += sum(r.expected for r in made)
        self.slack += BAND * sum(r.size for r in made)


def build_solid(part: Part, early: Callable[[NamedSolid], None] | None = None) -> NamedSolid:
    """See `geometry.solid.build_solid`."""
    if len(part.members) != 1:
        raise SolidError(f"members: {len(part.members)} given; the solid builder makes parts of one member.")
    member = part.members[0]
    frame = member_frame(member)
    work = _body(member, frame)
    _cut(work)
    work.add_radii(*edge_radii(work.solid, member, work.pieces, work.tools, on_cuts=True))
    _check_volume(work)
    plain, strips = work.solid, strips_of(part, member, frame.length)
    work.solid = imprinted(plain, strips, work.pieces, work.reach)
    named = _named(part, work, frame, strips)
    if early is not None:
        early(named.solid)
    return replace(
        named.solid,
        step=kernel.step_bytes(named.world, part.title),
        sharp_edges=tuple(sharp_edges(work.solid, frame, member, work.pieces, named.names, named.tool_faces)),
        # Sliced without the patches: the same solid with fewer faces.
        slices=slices_of(plain, slice_places(work.length, _avoid(work)), work.reach),
    )


def _body(member: Member, frame: Frame) -> _Work:
    stretches = stretches_of(member, frame.length)
    pieces = pieces_of(member, stretches)
    gross = gross_volume(member, stretches)
    solid = joined(pieces, f"members.{member.name}")
    work = _Work(member, pieces, solid, gross, GROSS_TOLERANCE * gross)
    _check_volume(work)
    work.add_radii(*shoulder_fillets(work.solid, member, pieces))
    work.tools = [tool for cut in member.cuts for tool in tools_of(cut, member, pieces)]
    work.add_radii(*edge_radii(work.solid, member, pieces, work.tools, on_cuts=False))
    return work


def _cut(work: _Work) -> None:
    """Cut after cut, each checked; what earlier cuts or radii may have taken already counts as slack."""
    done: list[Tool] = []
    for cut in work.member.cuts:
        tools = [t for t in work.tools if t.cut is cut]
        volume = sum(tool_volume(t, work.pieces) for t in tools)
        overlap = sum(_shared(t, d, work.reach) for t in tools for d in done)
        rounded = sum(r.size for t in tools for r in work.radii if _touches(t, r))
        what = f"cut {work.member.name}.{cut.name}"
        work.solid, _ = cut_out(work.solid, tools, volume, (overlap, rounded), what)
        work.estimate -= volume
        work.slack += CUT_TOLERANCE * volume + overlap + rounded
        done += tools


def _box(tool: Tool, reach: float) -> tuple[tuple[float, float], ...]:
    x0, x1, c0, c1 = tool.box
    along = (max(tool.low, -reach), min(tool.high, reach))
    return ((x0, x1), along, (c0, c1)) if tool.axis == "y" else ((x0, x1), (c0, c1), along)


def _shared(a: Tool, b: Tool, reach: float) -> float:
    """Volume (mm^3) of the common box of two tools: the most that one can take from the other."""
    spans = [min(p[1], q[1]) - max(p[0], q[0]) for p, q in zip(_box(a, reach), _box(b, reach), strict=True)]
    return float(np.prod(spans)) if min(spans) > 0.0 else 0.0


def _touches(tool: Tool, made: Radius) -> bool:
    box = _box(tool, np.inf)
    for line in made.lines:
        low, high = line.min(axis=0) - made.radius, line.max(axis=0) + made.radius
        if all(high[k] > box[k][0] and low[k] < box[k][1] for k in range(3)):
            return True
    return False


def _check_volume(work: _Work) -> None:
    volume, _ = kernel.volume_of(work.solid)
    if abs(volume - work.estimate) > work.slack:
        raise SolidError(
            f"members.{work.member.name}: the solid's volume is {volume:.8g} mm^3 but sections, cuts and radii give "
            f"{work.estimate:.8g} mm^3 (allowed difference {work.slack:.3g} mm^3); the geometry kernel "
            "made a wrong solid: change a radius or the place of a cut slightly."
        )


class _Named(NamedTuple):
    """The solid as the mesher needs it; the kernel's solid in its place; the labels of each face, the faces of each
    tool."""

    solid: NamedSolid
    world: Any
    names: Sequence[set[str]]
    tool_faces: Sequence[tuple[Tool, Sequence[int]]]


def _named(part: Part, work: _Work, frame: Frame, strips: Sequence[Strip]) -> _Named:
    member, pieces, solid = work.member, work.pieces, work.solid
    samples = sample_faces(solid)
    names = [side_labels(s, pieces) for s in samples]
    tool_faces = [(t, [i for i, s in enumerate(samples) if on_tool(s, t)]) for t in work.tools]
    regions = _regions(member, work.length, samples, names, tool_faces, strips)
    _check_regions(part, member, regions)
    world = kernel.one_solid(kernel.placed(solid, frame), "placing the solid")
    data = kernel.brep_bytes(world)
    again = kernel.one_solid(kernel.from_brep(data), "reading the solid back")
    marks = tuple(kernel.face_mark(f) for f in kernel.faces_of(again))
    _check_order(solid, marks, frame)
    volume, c = kernel.volume_of(again)
    made = NamedSolid(
        brep=data,
        step=b"",
        faces=marks,
        regions=regions,
        volume=volume,
        area=kernel.area_of(again)[0],
        centroid=(float(c[0]), float(c[1]), float(c[2])),
        volume_estimate=work.estimate,
        hints=tuple(size_hints(member, pieces, samples, names, tool_faces, work.radii)),
        least_wall=least_wall(member, pieces),
    )
    return _Named(made, world, names, tool_faces)


def _avoid(work: _Work) -> list[tuple[float, float]]:
    """Ranges of x where a slice would meet a step, its fillet, a cut or a rim radius."""
    ranges = [(p.stretch.start, p.stretch.start) for p in work.pieces]
    ranges += [t.box[:2] for t in work.tools]
    for made in work.radii:
        for line in made.lines:
            if np.ptp(line[:, 0]) < 0.5 * work.length:
                ranges.append(
                    (float(line[:, 0].min() - 1.5 * made.radius), float(line[:, 0].max() + 1.5 * made.radius))
                )
    return ranges


def _regions(
    member: Member,
    length: float,
    samples: Sequence[FaceSamples],
    names: Sequence[set[str]],
    tool_faces: Sequence[tuple[Tool, Sequence[int]]],
    strips: Sequence[Strip],
) -> dict[str, tuple[int, ...]]:
    found: dict[str, set[int]] = {}
    for i, s in enumerate(samples):
        end = end_label(s, length)
        own = {n for n in names[i] if not n.startswith("~")} | ({end} if end else set())
        own |= {strip.name for strip in strips if strip.holds(s, names[i])}
        for name in own:
            found.setdefault(name, set()).add(i)
    for tool, faces in tool_faces:
        for name in (tool.cut.name, tool.cut.group):
            found.setdefault(name, set()).update(faces)
    for strip in strips:
        found.setdefault(strip.name, set())
    return {f"{member.name}.{name}": tuple(sorted(ids)) for name, ids in sorted(found.items()) if name}


def _check_regions(part: Part, member: Member, regions: dict[str, tuple[int, ...]]) -> None:
    """Every region that exists must have faces, and every one that the part names must exist."""
    for name, ids in regions.items():
        if not ids:
            raise SolidError(f"region {name}: it has no face on the solid; check the place and size of what makes it.")
    wanted = [(f"supports.{s.name}", s.on) for s in part.supports]
    wanted += [
        (f"loads.{load.name}", load.on) for load in part.loads if not isinstance(load, BodyLoad | TemperatureLoad)
    ]
    for where, region in wanted:
        if region.startswith(f"{member.name}.") and region not in regions:
            raise SolidError(f"{where}: region {region} has no face on the solid; there are: {', '.join(regions)}.")


def _check_order(solid: Any, marks: Sequence[FaceMark], frame: Frame) -> None:
    """The faces read back from BREP bytes must be those that were named, in the same order."""
    faces = kernel.faces_of(solid)
    if len(faces) != len(marks):
        raise SolidError(f"reading the solid back: {len(marks)} faces instead of {len(faces)}.")
    for i, (face, mark) in enumerate(zip(faces, marks, strict=True)):
        area, centroid = kernel.area_of(face)
        there = frame.to_global(centroid)
        if abs(area - mark.area) > 1e-6 * area or np.abs(there - mark.centroid).max() > 1e-5 * max(1.0, frame.length):
            raise SolidError(f"reading the solid back: face {i} is not the one that was named.")
