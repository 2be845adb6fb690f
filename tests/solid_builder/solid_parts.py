"""Parts built straight from the contract, for checks of the solid builder."""

from __future__ import annotations

from collections import Counter
from typing import Any

import numpy as np

from geometry.named_solid import NamedSolid
from geometry.part import Cut, Material, Member, Part, Section, Station

STEEL = Material("S355", 210000.0, 0.3, 7.85e-9, 12e-6, 355.0, 490.0, "characteristic", "EN 1993-1-1:2005 table 3.1")


def make_part(shape: str, dims: dict[str, float], length: float = 500.0, **more: Any) -> Part:
    """A part of one member ``arm`` along global x, up = z, unless `more` says otherwise."""
    loads = more.pop("loads", ())
    stations = tuple(s if isinstance(s, Station) else Station(*s) for s in more.pop("stations", ()))
    fields: dict[str, Any] = {"start": (0.0, 0.0, 0.0), "end": (length, 0.0, 0.0), "up": (0.0, 0.0, 1.0), "roll": 0.0}
    fields |= more
    section = Section(shape, dims, fields.pop("outline", None))  # type: ignore[arg-type]
    member = Member(name="arm", section=section, stations=stations, **fields)
    return Part("test part", STEEL, (member,), (), loads, ())


def cut(
    name: str,
    kind: str,
    axis: str,
    through: str,
    at: float,
    offset: float,
    length: float,
    depth: float = 0.0,
    **more: Any,
) -> Cut:
    """A cut with its own name as its group, unless `more` says otherwise; a hole needs its diameter only."""
    group = more.pop("group", name)
    return Cut(name, group, kind, axis, through, at, offset, length, depth or length, **more)  # type: ignore[arg-type]


def region_area(solid: NamedSolid, name: str) -> float:
    """Area of a region, mm^2."""
    return sum(solid.faces[i].area for i in solid.regions[name])


def region_centroid(solid: NamedSolid, name: str) -> Any:
    """(3,) area centroid of a region, mm."""
    faces = [solid.faces[i] for i in solid.regions[name]]
    return sum(f.area * np.array(f.centroid) for f in faces) / sum(f.area for f in faces)


def face_types(solid: NamedSolid) -> Counter[str]:
    """How many faces of each kind of surface the solid has, read back from its BREP bytes."""
    from OCP.BRepAdaptor import BRepAdaptor_Surface

    from geometry.solid.kernel import faces_of, from_brep

    kinds = (BRepAdaptor_Surface(face).GetType() for face in faces_of(from_brep(solid.brep)))
    return Counter(str(kind).rpartition("GeomAbs_")[2] for kind in kinds)
