"""Parts built straight from the contract, for checks of the solid builder."""

from __future__ import annotations

from typing import Any

from geometry.part import Material, Member, Part, Section, Station

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
