"""Thickness of the walls of a member's sections."""

from __future__ import annotations

import math
from collections.abc import Iterator

from geometry.outline import Outline
from geometry.part import Member
from geometry.spec.checks.profile import knots, polygon_of, profile_of

ROOT2 = math.sqrt(2.0)


def walls(member: Member) -> Iterator[tuple[str, float]]:
    """Name and thickness (mm) of every wall, at both ends of every stretch of the member."""
    if member.section.outline is not None:
        yield "the thinnest wall of the outline", thinnest(member.section.outline)
        return
    profile = profile_of(member)
    for x in knots(member):
        for before in profile.sides(x):
            for name, size in _plates(member.section.shape, profile.dims(x, before)):
                yield f"the {name} at {x:.6g} mm", size


def _plates(shape: str, d: dict[str, float]) -> Iterator[tuple[str, float]]:
    names = {
        "rectangle": ("depth", "width"), "round": ("diameter",), "tube": ("wall",), "box": ("wall",),
        "I": ("web", "flange", "bottom_flange"), "channel": ("web", "flange"), "tee": ("web", "flange"),
        "angle": ("thickness",),
    }[shape]  # fmt: skip
    for name in names:
        yield name.replace("_", " "), d[name]
    if shape == "box":  # along the diagonal of a corner
        yield "corner of the wall", d["wall"] * ROOT2 - (d["corner_radius"] - d["inner_radius"]) * (ROOT2 - 1.0)


def thinnest(outline: Outline) -> float:
    """Least thickness of a drawn section, mm: from the middle of each edge (of an arc: of each of its chords) straight
    inwards to the next edge. Exact for walls with parallel sides."""
    loops = [[p for edge in loop for p in polygon_of(edge)] for loop in (outline.outer, *outline.inner)]
    sides = [(a, b) for loop in loops for a, b in zip(loop, [*loop[1:], loop[0]], strict=True)]
    return min((_inwards(a, b, sides) for a, b in sides), default=math.inf)


Point = tuple[float, float]


def _inwards(a: Point, b: Point, sides: list[tuple[Point, Point]]) -> float:
    """Distance from the middle of a side inwards (to the left of its direction: material lies there on every loop)."""
    dx, dy = b[0] - a[0], b[1] - a[1]
    size = math.hypot(dx, dy)
    if size == 0.0:
        return math.inf
    nx, ny = -dy / size, dx / size
    mx, my = (a[0] + b[0]) / 2.0, (a[1] + b[1]) / 2.0
    nearest = math.inf
    for c, d in sides:
        ex, ey = d[0] - c[0], d[1] - c[1]
        across = nx * ey - ny * ex
        if (c, d) == (a, b) or across == 0.0:
            continue
        t = ((c[0] - mx) * ey - (c[1] - my) * ex) / across
        along = ((c[0] - mx) * ny - (c[1] - my) * nx) / across
        if t > 1e-9 and 0.0 <= along <= 1.0:
            nearest = min(nearest, t)
    return nearest
