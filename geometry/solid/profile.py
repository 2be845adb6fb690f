"""The section of each shape as corners, straight sides and corner radii (the solid builder's own drawing)."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from geometry.outline import Arc, Edge, Line, Outline, Point
from geometry.problem import SolidError

Dims = Mapping[str, float]


@dataclass(frozen=True, slots=True)
class Side:
    """One edge of a section, with the names of the regions it belongs to and what kind of corner it is.

    `wall` tells what corner arc it is: ``root fillet``, ``corner``, ``toe`` or empty for a straight side.
    """

    edge: Edge
    labels: tuple[str, ...] = ()
    wall: str = ""


@dataclass(frozen=True, slots=True)
class Profile:
    """Sides of a section: the outer loop counter-clockwise, voids clockwise, in mm."""

    outer: tuple[Side, ...]
    inner: tuple[tuple[Side, ...], ...] = ()

    @property
    def loops(self) -> tuple[tuple[Side, ...], ...]:
        """Outer loop first, then the voids."""
        return (self.outer, *self.inner)


@dataclass(frozen=True, slots=True)
class Corner:
    """A corner of a polygon: its place, its radius, and the regions of the side that leaves it."""

    y: float
    z: float
    radius: float = 0.0
    labels: tuple[str, ...] = ()
    wall: str = "corner"


def rounded(corners: list[Corner]) -> tuple[Side, ...]:
    """Sides of the loop through `corners` with their radii: an arc at each corner that has one, then its side.

    Straight sides that have shrunk to nothing are kept, so that two stations of a taper stay in step.

    Raises
    ------
    SolidError
        Two radii do not fit on a side.
    """
    n = len(corners)
    tangents: list[tuple[Point, Point, Point | None, bool]] = []
    for i, c in enumerate(corners):
        before, after = corners[i - 1], corners[(i + 1) % n]
        u = _unit(before.y - c.y, before.z - c.z)
        v = _unit(after.y - c.y, after.z - c.z)
        if c.radius <= 0.0:
            tangents.append(((c.y, c.z), (c.y, c.z), None, True))
            continue
        half = 0.5 * math.acos(max(-1.0, min(1.0, u[0] * v[0] + u[1] * v[1])))
        reach, depth = c.radius / math.tan(half), c.radius / math.sin(half)
        w = _unit(u[0] + v[0], u[1] + v[1])
        ccw = u[0] * v[1] - u[1] * v[0] < 0.0
        tangents.append(
            (
                (c.y + reach * u[0], c.z + reach * u[1]),
                (c.y + reach * v[0], c.z + reach * v[1]),
                (c.y + depth * w[0], c.z + depth * w[1]),
                ccw,
            )
        )
    sides: list[Side] = []
    for i, c in enumerate(corners):
        after = corners[(i + 1) % n]
        into, out, centre, ccw = tangents[i]
        if centre is not None:
            sides.append(Side(Arc(into, out, centre, ccw), (), c.wall))
        _check_fit(c, after, out, tangents[(i + 1) % n][0])
        sides.append(Side(Line(out, tangents[(i + 1) % n][0]), c.labels))
    return tuple(sides)


def _check_fit(c: Corner, after: Corner, a: Point, b: Point) -> None:
    along = (b[0] - a[0]) * (after.y - c.y) + (b[1] - a[1]) * (after.z - c.z)
    length = math.hypot(after.y - c.y, after.z - c.z)
    if length == 0.0 or along < -1e-9 * length * length:
        raise SolidError(
            f"corner radii {c.radius:g} and {after.radius:g} mm do not fit on a side {length:.6g} mm long "
            f"({', '.join(c.labels) or c.wall}); make them smaller."
        )


def _unit(y: float, z: float) -> Point:
    size = math.hypot(y, z)
    return (y / size, z / size) if size > 0.0 else (0.0, 0.0)


def circle(diameter: float, labels: tuple[str, ...], ccw: bool) -> tuple[Side, ...]:
    """A full circle about the origin as two half circles."""
    r, s = 0.5 * diameter, (1.0 if ccw else -1.0)
    a, b = (0.0, -s * r), (0.0, s * r)
    return (Side(Arc(a, b, (0.0, 0.0), ccw), labels), Side(Arc(b, a, (0.0, 0.0), ccw), labels))


def _rectangle(d: Dims) -> Profile:
    return Profile(rounded(_box_corners(d["depth"], d["width"], d.get("corner_radius", 0.0))))


def _box_corners(depth: float, width: float, r: float) -> list[Corner]:
    z, y = 0.5 * depth, 0.5 * width
    return [
        Corner(-y, -z, r, ("bottom",)),
        Corner(y, -z, r, ("right",)),
        Corner(y, z, r, ("top",)),
        Corner(-y, z, r, ("left",)),
    ]


def inner_radius(d: Dims) -> float:
    """Inside corner radius of a box: as declared, or the outside radius less the wall, or 0."""
    return d["inner_radius"] if "inner_radius" in d else max(d.get("corner_radius", 0.0) - d["wall"], 0.0)


def _box(d: Dims) -> Profile:
    t, r = d["wall"], inner_radius(d)
    z, y = 0.5 * d["depth"] - t, 0.5 * d["width"] - t
    bore = ("bore",)
    inner = [
        Corner(-y, -z, r, bore, "root fillet"),
        Corner(-y, z, r, bore, "root fillet"),
        Corner(y, z, r, bore, "root fillet"),
        Corner(y, -z, r, bore, "root fillet"),
    ]
    void = tuple(Side(s.edge, bore, s.wall) for s in rounded(inner))
    return Profile(_rectangle(d).outer, (void,))


def _i(d: Dims) -> Profile:
    z, r, t = 0.5 * d["depth"], d.get("root_radius", 0.0), 0.5 * d["web"]
    top, low = 0.5 * d["width"], 0.5 * d.get("bottom_width", d["width"])
    zt, zb = z - d["flange"], -z + d.get("bottom_flange", d["flange"])
    root = "root fillet"
    return Profile(
        rounded(
            [
                Corner(-low, -z, 0.0, ("bottom",)),
                Corner(low, -z, 0.0, ("right",)),
                Corner(low, zb),
                Corner(t, zb, r, ("web_right",), root),
                Corner(t, zt, r, (), root),
                Corner(top, zt, 0.0, ("right",)),
                Corner(top, z, 0.0, ("top",)),
                Corner(-top, z, 0.0, ("left",)),
                Corner(-top, zt),
                Corner(-t, zt, r, ("web_left",), root),
                Corner(-t, zb, r, (), root),
                Corner(-low, zb, 0.0, ("left",)),
            ]
        )
    )


def _channel(d: Dims) -> Profile:
    z, b, r, t, f = 0.5 * d["depth"], d["width"], d.get("root_radius", 0.0), d["web"], d["flange"]
    root = "root fillet"
    return Profile(
        rounded(
            [
                Corner(0.0, -z, 0.0, ("bottom",)),
                Corner(b, -z, 0.0, ("right",)),
                Corner(b, -z + f),
                Corner(t, -z + f, r, ("web_right",), root),
                Corner(t, z - f, r, (), root),
                Corner(b, z - f, 0.0, ("right",)),
                Corner(b, z, 0.0, ("top",)),
                Corner(0.0, z, 0.0, ("left", "web_left")),
            ]
        )
    )


def _angle(d: Dims) -> Profile:
    z, b, t = 0.5 * d["depth"], d["width"], d["thickness"]
    r, toe = d.get("root_radius", 0.0), d.get("toe_radius", 0.0)
    return Profile(
        rounded(
            [
                Corner(0.0, -z, 0.0, ("bottom",)),
                Corner(b, -z, 0.0, ("right",)),
                Corner(b, -z + t, toe, (), "toe"),
                Corner(t, -z + t, r, (), "root fillet"),
                Corner(t, z, toe, ("top",), "toe"),
                Corner(0.0, z, 0.0, ("left",)),
            ]
        )
    )


def _tee(d: Dims) -> Profile:
    z, b, t, f, r = 0.5 * d["depth"], 0.5 * d["width"], 0.5 * d["web"], d["flange"], d.get("root_radius", 0.0)
    root = "root fillet"
    return Profile(
        rounded(
            [
                Corner(-t, -z, 0.0, ("bottom",)),
                Corner(t, -z, 0.0, ("web_right",)),
                Corner(t, z - f, r, (), root),
                Corner(b, z - f, 0.0, ("right",)),
                Corner(b, z, 0.0, ("top",)),
                Corner(-b, z, 0.0, ("left",)),
                Corner(-b, z - f),
                Corner(-t, z - f, r, ("web_left",), root),
            ]
        )
    )


def _round(d: Dims) -> Profile:
    return Profile(circle(d["diameter"], ("surface",), True))


def _tube(d: Dims) -> Profile:
    return Profile(
        circle(d["diameter"], ("surface",), True), (circle(d["diameter"] - 2.0 * d["wall"], ("bore",), False),)
    )


_SHAPES: dict[str, Callable[[Dims], Profile]] = {
    "rectangle": _rectangle,
    "round": _round,
    "tube": _tube,
    "box": _box,
    "I": _i,
    "channel": _channel,
    "angle": _angle,
    "tee": _tee,
}


def free_profile(outline: Outline) -> Profile:
    """A declared outline, its straight sides on the bounding rectangle named top, bottom, left, right."""
    points = [e.start for e in outline.outer]
    lows, highs = [min(p[k] for p in points) for k in (0, 1)], [max(p[k] for p in points) for k in (0, 1)]
    tiny = 1e-9 * max(highs[0] - lows[0], highs[1] - lows[1])

    def named(edge: Edge) -> Side:
        if isinstance(edge, Arc):
            return Side(edge)
        tests = {"left": (0, lows), "right": (0, highs), "bottom": (1, lows), "top": (1, highs)}
        on = tuple(
            name
            for name, (k, limit) in tests.items()
            if abs(edge.start[k] - limit[k]) <= tiny and abs(edge.end[k] - limit[k]) <= tiny
        )
        return Side(edge, on)

    inner = tuple(tuple(Side(e) for e in loop) for loop in outline.inner)
    return Profile(tuple(named(e) for e in outline.outer), inner)


def profile_of(shape: str, dims: Dims, outline: Outline | None = None) -> Profile:
    """The section of `shape` with `dims` (mm), drawn about the shape's own origin.

    Raises
    ------
    SolidError
        A dimension is missing or radii do not fit.
    """
    if shape == "outline":
        if outline is None:
            raise SolidError("section.outline: a free outline needs its loops.")
        return free_profile(outline)
    try:
        return _SHAPES[shape](dims)
    except KeyError as error:
        raise SolidError(f"section: shape {shape} needs {error.args[0]!r}.") from error
