"""Patches and the stretches of line loads, drawn on the faces so that each is a face by itself."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from OCP.BRep import BRep_Builder
from OCP.BRepAlgoAPI import BRepAlgoAPI_Section, BRepAlgoAPI_Splitter
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace, BRepBuilderAPI_MakePolygon
from OCP.gp import gp_Pnt
from OCP.TopoDS import TopoDS_Compound
from OCP.TopTools import TopTools_ListOfShape

from geometry.part import LineLoad, Member, Part
from geometry.problem import SolidError
from geometry.solid.body import Piece
from geometry.solid.kernel import edges_of, faces_of, one_solid, volume_of
from geometry.solid.regions import TOLERANCE, side_labels
from geometry.solid.samples import FaceSamples, sample_faces

CHANGE = 1e-6
"""Largest relative change of the volume: a curve drawn on a conical face is fitted (up to 5e-8 was met)."""
_ACROSS = {"top": 1, "bottom": 1, "left": 2, "right": 2, "web_left": 2, "web_right": 2}


@dataclass(frozen=True, slots=True)
class Strip:
    """Part of a member's face: between `start` and `end` (mm along it) and, if given, `across` (mm, y or z)."""

    name: str
    face: str
    start: float
    end: float
    across: tuple[float, float] | None

    def holds(self, s: FaceSamples, labels: set[str]) -> bool:
        """Whether a face with these samples and labels is a piece of the strip."""
        x = s.points[:, 0]
        if self.face not in labels or np.any(x < self.start - TOLERANCE) or np.any(x > self.end + TOLERANCE):
            return False
        if self.across is None:
            return True
        c = s.points[:, _ACROSS[self.face]]
        return bool(np.all(c >= self.across[0] - TOLERANCE) and np.all(c <= self.across[1] + TOLERANCE))


def strips_of(part: Part, member: Member, length: float) -> list[Strip]:
    """Patches of the member, and the stretches of line loads on it (``load:NAME``).

    Raises
    ------
    SolidError
        A strip lies off the member or is empty, or its face cannot be limited across.
    """
    prefix = f"{member.name}."
    strips = [Strip(p.name, p.face.removeprefix(prefix), p.start, p.end, p.across) for p in member.patches]
    strips += [
        Strip(f"load:{load.name}", load.on.removeprefix(prefix), load.start, load.end, None)
        for load in part.loads
        if isinstance(load, LineLoad) and load.on.startswith(prefix)
    ]
    for s in strips:
        what, tiny = f"region {prefix}{s.name}", 1e-9 * length
        if not -tiny <= s.start < s.end <= length + tiny:
            raise SolidError(
                f"{what}: from {s.start:g} to {s.end:g} mm is no stretch of the member (0 to {length:g} mm)."
            )
        if s.across is not None and (s.face not in _ACROSS or not s.across[0] < s.across[1]):
            raise SolidError(
                f"{what}: across = {s.across} cannot be used on {s.face!r}; give a low and a high value on "
                f"{', '.join(_ACROSS)}, or leave it out."
            )
    return strips


def _sheet(corners: Sequence[tuple[float, float, float]]) -> Any:
    polygon = BRepBuilderAPI_MakePolygon()
    for corner in corners:
        polygon.Add(gp_Pnt(*corner))
    polygon.Close()
    return BRepBuilderAPI_MakeFace(polygon.Wire(), True).Face()


def _sheets(strip: Strip, length: float, reach: float) -> list[Any]:
    """Plane sheets whose traces on the face bound the strip."""
    k = _ACROSS.get(strip.face, 1)
    low, high = strip.across or (-reach, reach)

    def corner(x: float, across: float, other: float) -> tuple[float, float, float]:
        return (x, across, other) if k == 1 else (x, other, across)

    sheets = [
        _sheet([corner(x, c, o) for c, o in ((low, -reach), (high, -reach), (high, reach), (low, reach))])
        for x in (strip.start, strip.end)
        if TOLERANCE < x < length - TOLERANCE
    ]
    if strip.across is not None:
        x0, x1 = strip.start, strip.end
        sheets += [
            _sheet([corner(x, c, o) for x, o in ((x0, -reach), (x1, -reach), (x1, reach), (x0, reach))])
            for c in strip.across
        ]
    return sheets


def imprinted(solid: Any, strips: Sequence[Strip], pieces: Sequence[Piece], reach: float) -> Any:
    """`solid` (member axes) with every strip's boundary drawn on its face; still one solid of the same volume.

    Raises
    ------
    SolidError
        A strip's face does not exist, or the kernel changed more than the faces.
    """
    if not strips:
        return solid
    labels = [side_labels(s, pieces) for s in sample_faces(solid)]
    faces = faces_of(solid)
    traces = TopTools_ListOfShape()
    for strip in strips:
        target, builder = TopoDS_Compound(), BRep_Builder()
        builder.MakeCompound(target)
        chosen = [face for face, names in zip(faces, labels, strict=True) if strip.face in names]
        if not chosen:
            raise SolidError(f"region {strip.name}: the member has no face {strip.face!r} to lie on.")
        for face in chosen:
            builder.Add(target, face)
        for sheet in _sheets(strip, pieces[-1].stretch.end, reach):
            section = BRepAlgoAPI_Section(target, sheet)
            for edge in edges_of(section.Shape()):
                traces.Append(edge)
    if traces.IsEmpty():
        return solid
    whole = TopTools_ListOfShape()
    whole.Append(solid)
    splitter = BRepAlgoAPI_Splitter()
    splitter.SetArguments(whole)
    splitter.SetTools(traces)
    splitter.SetRunParallel(False)
    splitter.Build()
    made = one_solid(splitter.Shape(), "drawing the patches on the faces")
    before, after = volume_of(solid)[0], volume_of(made)[0]
    if abs(after - before) > CHANGE * before:
        raise SolidError(f"drawing the patches on the faces changed the volume from {before:.9g} to {after:.9g} mm^3.")
    return made
