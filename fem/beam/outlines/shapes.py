"""Outline of each shape of `geometry.part.Shape`, about the shape's own origin."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from fem.beam.outlines.loops import Corner, OutlineError, circle, reversed_loop, rounded_polygon
from fem.beam.outlines.rounding import round_vertex
from geometry.outline import Outline
from geometry.part import Shape

Dims = Mapping[str, float]

DEFAULTS: Mapping[str, Mapping[str, Callable[[Dims], float]]] = {
    "rectangle": {"corner_radius": lambda d: 0.0},
    "box": {
        "corner_radius": lambda d: 0.0,
        "inner_radius": lambda d: max(d.get("corner_radius", 0.0) - d["wall"], 0.0),
    },
    "I": {
        "root_radius": lambda d: 0.0,
        "bottom_width": lambda d: d["width"],
        "bottom_flange": lambda d: d["flange"],
    },
    "channel": {"root_radius": lambda d: 0.0},
    "angle": {"root_radius": lambda d: 0.0, "toe_radius": lambda d: 0.0},
    "tee": {"root_radius": lambda d: 0.0},
}
"""Dimensions that may be left out, and what they then are."""


def with_defaults(shape: Shape, dims: Dims) -> dict[str, float]:
    """`dims` with every dimension that was left out."""
    filled = dict(dims)
    for name, rule in DEFAULTS.get(shape, {}).items():
        if name not in filled:
            filled[name] = rule(filled)
    return filled


def outline_of(
    shape: Shape, dims: Dims, free: Outline | None = None, edges: Mapping[str, float] | None = None
) -> Outline:
    """Outline of a shape in its own coordinates (see `geometry.part.Shape`), radii as arcs.

    Parameters
    ----------
    shape, dims
        Shape and its dimensions, mm.
    free
        The loops of an ``outline`` section, returned as they are.
    edges
        Radii of the outer edges along the member by name (``top left`` and so on). A named edge is the
        left- or rightmost corner of the top or bottom side; its radius takes the place of a corner radius.

    Raises
    ------
    OutlineError
        Dimensions missing or contradictory; radii that do not fit; an edge that the shape has not.
    """
    edges = edges or {}
    if shape == "outline":
        if free is None:
            raise OutlineError("a section of shape outline came without its loops: give them in Section.outline.")
        return _round_free(free, edges)
    try:
        d = with_defaults(shape, dims)
        if shape in ("round", "tube"):
            return _round_shape(shape, d, edges)
        outer, inner = _POLYGONS[shape](d)
    except KeyError as missing:
        raise OutlineError(f"section {shape}: no value for {missing}, given are {', '.join(dims)}.") from None
    rounded = _with_edges(outer, edges)
    return Outline(rounded_polygon(rounded), tuple(reversed_loop(rounded_polygon(loop)) for loop in inner))


Polygons = tuple[list[Corner], list[list[Corner]]]


def _block(depth: float, width: float, radius: float) -> list[Corner]:
    y, z = width / 2, depth / 2
    return [Corner(-y, -z, radius), Corner(y, -z, radius), Corner(y, z, radius), Corner(-y, z, radius)]


def _require(condition: bool, text: str) -> None:
    if not condition:
        raise OutlineError(text)


def _rectangle(d: Dims) -> Polygons:
    return _block(d["depth"], d["width"], d["corner_radius"]), []


def _box(d: Dims) -> Polygons:
    t = d["wall"]
    _require(0 < 2 * t < min(d["depth"], d["width"]), f"box: two walls of {t:g} mm leave no void in "
             f"{d['depth']:g} x {d['width']:g} mm. Make the wall thinner or use a rectangle.")
    return (_block(d["depth"], d["width"], d["corner_radius"]),
            [_block(d["depth"] - 2 * t, d["width"] - 2 * t, d["inner_radius"])])


def _i(d: Dims) -> Polygons:
    z, w, r = d["depth"] / 2, d["web"] / 2, d["root_radius"]
    yt, yb = d["width"] / 2, d["bottom_width"] / 2
    zt, zb = z - d["flange"], -z + d["bottom_flange"]
    _require(zb < zt and w < min(yt, yb), f"I: flanges {d['flange']:g} and {d['bottom_flange']:g} mm and web "
             f"{d['web']:g} mm do not fit in depth {d['depth']:g} mm and width {2 * min(yt, yb):g} mm.")
    right = [Corner(yb, -z), Corner(yb, zb), Corner(w, zb, r), Corner(w, zt, r), Corner(yt, zt), Corner(yt, z)]
    return right + [Corner(-c.y, c.z, c.radius) for c in reversed(right)], []


def _channel(d: Dims) -> Polygons:
    z, b, w, r = d["depth"] / 2, d["width"], d["web"], d["root_radius"]
    f = z - d["flange"]
    _require(0 < f and w < b, f"channel: flange {d['flange']:g} mm and web {w:g} mm do not fit in depth "
             f"{d['depth']:g} mm and width {b:g} mm.")
    return [Corner(0, -z), Corner(b, -z), Corner(b, -f), Corner(w, -f, r), Corner(w, f, r), Corner(b, f),
            Corner(b, z), Corner(0, z)], []


def _angle(d: Dims) -> Polygons:
    z, b, t = d["depth"] / 2, d["width"], d["thickness"]
    root, toe = d["root_radius"], d["toe_radius"]
    _require(0 < t < min(2 * z, b), f"angle: thickness {t:g} mm is not below both legs, {2 * z:g} and {b:g} mm.")
    return [Corner(0, -z), Corner(b, -z), Corner(b, -z + t, toe), Corner(t, -z + t, root), Corner(t, z, toe),
            Corner(0, z)], []


def _tee(d: Dims) -> Polygons:
    z, y, w, r = d["depth"] / 2, d["width"] / 2, d["web"] / 2, d["root_radius"]
    f = z - d["flange"]
    _require(-z < f and w < y, f"tee: flange {d['flange']:g} mm and web {d['web']:g} mm do not fit in depth "
             f"{d['depth']:g} mm and width {d['width']:g} mm.")
    right = [Corner(w, -z), Corner(w, f, r), Corner(y, f), Corner(y, z)]
    return right + [Corner(-c.y, c.z, c.radius) for c in reversed(right)], []


_POLYGONS: Mapping[str, Callable[[Dims], Polygons]] = {
    "rectangle": _rectangle, "box": _box, "I": _i, "channel": _channel, "angle": _angle, "tee": _tee,
}


def _round_shape(shape: str, d: Dims, edges: Mapping[str, float]) -> Outline:
    _require(not edges, f"{shape} has no edge called {', '.join(edges)}: leave the edge radius out.")
    outer = d["diameter"] / 2
    if shape == "round":
        return Outline(circle(outer))
    _require(0 < d["wall"] < outer, f"tube: wall {d['wall']:g} mm leaves no bore in diameter {2 * outer:g} mm.")
    return Outline(circle(outer), (circle(outer - d["wall"], ccw=False),))


def _edge_index(points: list[tuple[float, float]], name: str) -> int:
    """Index of the corner that the edge `name` runs through: the outermost one of that side."""
    side, _, hand = name.partition(" ")
    _require(side in ("top", "bottom") and hand in ("left", "right"),
             f"no edge along the member is called {name!r}: say top left, top right, bottom left or bottom right.")
    up, out = (1 if side == "top" else -1), (1 if hand == "right" else -1)
    return max(range(len(points)), key=lambda i: (round(up * points[i][1], 9), out * points[i][0]))


def _with_edges(corners: list[Corner], edges: Mapping[str, float]) -> list[Corner]:
    rounded = list(corners)
    points = [(c.y, c.z) for c in corners]
    for name, radius in edges.items():
        i = _edge_index(points, name)
        rounded[i] = rounded[i]._replace(radius=radius)
    return rounded


def _round_free(free: Outline, edges: Mapping[str, float]) -> Outline:
    if not edges:
        return free
    points = [e.start for e in free.outer]
    targets = {_edge_index(points, name): radius for name, radius in edges.items()}
    return Outline(round_vertex(free.outer, targets), free.inner)
