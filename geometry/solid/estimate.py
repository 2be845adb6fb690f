"""Volume that the solid must have, worked out without the CAD kernel."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence

from geometry.part import Member
from geometry.solid.eased import eased, edge_name
from geometry.solid.integrals import section_integrals
from geometry.solid.profile import free_profile
from geometry.solid.stretches import Stretch

Dims = Mapping[str, float]
_CORNER = 1.0 - 0.25 * math.pi
"""Area between a square corner and its radius, for radius 1."""


def _box(d: Dims) -> float:
    r, t = d.get("corner_radius", 0.0), d["wall"]
    inside = d["inner_radius"] if "inner_radius" in d else max(r - t, 0.0)
    whole = d["depth"] * d["width"] - 4.0 * _CORNER * r * r
    return whole - ((d["depth"] - 2.0 * t) * (d["width"] - 2.0 * t) - 4.0 * _CORNER * inside * inside)


def _i(d: Dims) -> float:
    low, under = d.get("bottom_width", d["width"]), d.get("bottom_flange", d["flange"])
    web = (d["depth"] - d["flange"] - under) * d["web"]
    return d["width"] * d["flange"] + low * under + web + 4.0 * _CORNER * d.get("root_radius", 0.0) ** 2


_AREAS: dict[str, Callable[[Dims], float]] = {
    "rectangle": lambda d: d["depth"] * d["width"] - 4.0 * _CORNER * d.get("corner_radius", 0.0) ** 2,
    "round": lambda d: 0.25 * math.pi * d["diameter"] ** 2,
    "tube": lambda d: math.pi * d["wall"] * (d["diameter"] - d["wall"]),
    "box": _box,
    "I": _i,
    "channel": lambda d: (
        2.0 * d["width"] * d["flange"]
        + (d["depth"] - 2.0 * d["flange"]) * d["web"]
        + 2.0 * _CORNER * d.get("root_radius", 0.0) ** 2
    ),
    "angle": lambda d: (
        d["thickness"] * (d["depth"] + d["width"] - d["thickness"])
        + _CORNER * (d.get("root_radius", 0.0) ** 2 - 2.0 * d.get("toe_radius", 0.0) ** 2)
    ),
    "tee": lambda d: (
        d["width"] * d["flange"]
        + (d["depth"] - d["flange"]) * d["web"]
        + 2.0 * _CORNER * d.get("root_radius", 0.0) ** 2
    ),
}


def _replaced(shape: str, name: str, d: Dims) -> float:
    """Radius that an edge radius takes the place of, mm."""
    if shape in ("rectangle", "box"):
        return d.get("corner_radius", 0.0)
    return d.get("toe_radius", 0.0) if (shape, name) == ("angle", "top right") else 0.0


def gross_volume(member: Member, stretches: Sequence[Stretch]) -> float:
    """Volume (mm^3) of the uncut member: closed areas of its sections, Simpson over each stretch.

    Every dimension is linear along a stretch, so the area is a quadratic and Simpson's rule is exact
    (but for a box whose inner radius is left out and runs to 0 within a stretch).
    """
    shape = member.section.shape
    radii = {edge_name(e.edges): e.radius for e in member.edge_radii if edge_name(e.edges)}
    if member.section.outline is not None:
        area = section_integrals(eased(free_profile(member.section.outline), radii)).area
        return sum(area * (s.end - s.start) for s in stretches)

    def area_of(d: Dims) -> float:
        eased_off = sum(_CORNER * (r * r - _replaced(shape, name, d) ** 2) for name, r in radii.items())
        return _AREAS[shape](d) - eased_off

    return sum(
        (s.end - s.start) / 6.0 * (area_of(s.first) + 4.0 * area_of(s.at(0.5 * (s.start + s.end))) + area_of(s.last))
        for s in stretches
    )
