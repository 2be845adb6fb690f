"""How much material a member has, near enough to say which of two neighbours has more.

Areas are those of the plates, corners and roots of each section, cuts are taken out with the thickness of the wall at
their middle. Nothing is reported from here: mass comes from the two models.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

from geometry.part import Cut, Member
from geometry.spec.checks.cuts import walls_of
from geometry.spec.checks.profile import Profile, knots, length_of, polygon_of, profile_of
from geometry.spec.model import MaterialSpec, PartSpec
from geometry.spec.resolve.member import resolve_member
from geometry.spec.resolve.values import Values

CORNER = 1.0 - math.pi / 4.0
"""Area between a square corner and its rounding, for a radius of 1."""
GAUSS = ((0.5 - math.sqrt(0.15), 5.0 / 18.0), (0.5, 8.0 / 18.0), (0.5 + math.sqrt(0.15), 5.0 / 18.0))
"""Points and weights on 0 to 1: exact for areas, which are of second degree in the distance."""


def mass_of_tables(data: Mapping[str, Any]) -> float:
    """Mass of the part that tables describe, without a look at whether it can be; NaN where a dimension cannot be
    read. Raises `ValidationError` for tables that are no part's."""
    spec = PartSpec.model_validate(data)
    values = Values(spec.parameters)
    volume = sum(volume_of(resolve_member(values, name, member)) for name, member in spec.members.items())
    if isinstance(spec.material, MaterialSpec) and spec.material.density is not None:
        return volume * values.number("material.density", spec.material.density, "density")
    return volume


def longer(a: Mapping[str, Any], b: Mapping[str, Any]) -> bool:
    """Whether two parts differ in the length of a member."""
    specs = PartSpec.model_validate(a), PartSpec.model_validate(b)
    members = [[resolve_member(Values(s.parameters), name, m) for name, m in s.members.items()] for s in specs]
    return any(not math.isclose(length_of(one), length_of(other), rel_tol=1e-9)
               for one, other in zip(*members, strict=True))


def volume_of(member: Member) -> float:
    """Volume of a member, mm^3."""
    profile = profile_of(member)
    places = knots(member)
    solid = math.fsum(
        (b - a) * weight * area_of(member, profile.dims(a + share * (b - a)))
        for a, b in zip(places, places[1:], strict=False) for share, weight in GAUSS
    )  # fmt: skip
    rounded = math.fsum(CORNER * e.radius**2 * length_of(member) for e in member.edge_radii if " " in e.edges)
    return solid - math.fsum(_cut_volume(profile, cut) for cut in member.cuts) - rounded


def area_of(member: Member, d: dict[str, float]) -> float:
    """Area of a section, mm^2."""
    shape = member.section.shape
    if member.section.outline is not None:
        outline = member.section.outline
        return math.fsum(_polygon_area([p for edge in loop for p in polygon_of(edge)])
                         for loop in (outline.outer, *outline.inner))  # fmt: skip
    if shape == "round":
        return math.pi / 4.0 * d["diameter"] ** 2
    if shape == "tube":
        return math.pi * d["wall"] * (d["diameter"] - d["wall"])
    if shape == "rectangle":
        return d["depth"] * d["width"] - 4.0 * CORNER * d["corner_radius"] ** 2
    if shape == "box":
        inner = (d["depth"] - 2.0 * d["wall"]) * (d["width"] - 2.0 * d["wall"])
        return d["depth"] * d["width"] - inner - 4.0 * CORNER * (d["corner_radius"] ** 2 - d["inner_radius"] ** 2)
    root = CORNER * d["root_radius"] ** 2
    if shape == "angle":
        return d["thickness"] * (d["depth"] + d["width"] - d["thickness"]) + root - 2.0 * CORNER * d["toe_radius"] ** 2
    web, flange = d["web"], d["flange"]
    if shape == "channel":
        return web * d["depth"] + 2.0 * flange * (d["width"] - web) + 2.0 * root
    if shape == "tee":
        return flange * d["width"] + web * (d["depth"] - flange) + 2.0 * root
    bottom = d["bottom_width"] * d["bottom_flange"]
    return flange * d["width"] + bottom + web * (d["depth"] - flange - d["bottom_flange"]) + 4.0 * root


def _polygon_area(points: list[tuple[float, float]]) -> float:
    """Signed: positive for a loop against the clock."""
    pairs = zip(points, [*points[1:], points[0]], strict=True)
    return math.fsum((y0 * z1 - y1 * z0) / 2.0 for (y0, z0), (y1, z1) in pairs)


def _cut_volume(profile: Profile, cut: Cut) -> float:
    d = profile.dims(cut.at)
    if cut.kind == "hole":
        area = math.pi / 4.0 * cut.depth**2
    elif cut.kind == "slot":
        area = (cut.length - cut.depth) * cut.depth + math.pi / 4.0 * cut.depth**2
    else:
        corners = 4.0 if cut.kind == "opening" else 2.0
        area = cut.length * cut.depth - corners * CORNER * cut.corner_radius**2
    return area * sum(_thickness(profile, cut, d))


def _thickness(profile: Profile, cut: Cut, d: dict[str, float]) -> Iterator[float]:
    """Thickness of each wall that a cut passes."""
    shape, through = profile.member.section.shape, cut.through
    if shape in ("tube", "box"):
        yield d["wall"] * (2.0 if through == "all" else 1.0)
    elif through in ("web", "upright leg", "bottom leg"):
        yield d["thickness"] if shape == "angle" else d["web"]
    elif through in ("flanges", "top flange", "bottom flange"):
        for wall, _ in walls_of(profile, cut, d):
            yield d["bottom_flange"] if "bottom" in wall and shape == "I" else d["flange"]
    else:
        low_y, high_y, low_z, high_z = profile.box(d)
        across = high_y - low_y if cut.axis == "y" else high_z - low_z
        solid = shape in ("rectangle", "round", "outline")
        yield across if solid else d.get("web", d.get("thickness", across))
