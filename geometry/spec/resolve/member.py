"""A member of the spec in numbers."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from functools import cache
from typing import Any

from pydantic import BaseModel

from geometry.part import Cut, EdgeRadius, Member, Patch, Section, Station
from geometry.spec.checks.profile import dims_at
from geometry.spec.resolve.drawn import outline_of
from geometry.spec.resolve.values import Values
from geometry.spec.words.fields import RADIUS, SIZE, OfKind
from geometry.spec.words.member import (
    AcrossSpec,
    BoxSection,
    HoleSpec,
    MemberSpec,
    NotchSpec,
    OpeningSpec,
    OutlineSection,
    SlotSpec,
)

DIMS: dict[str, tuple[str, ...]] = {
    "rectangle": ("depth", "width", "corner_radius"),
    "round": ("diameter",),
    "tube": ("diameter", "wall"),
    "box": ("depth", "width", "wall", "corner_radius", "inner_radius"),
    "I": ("depth", "width", "web", "flange", "root_radius", "bottom_width", "bottom_flange"),
    "channel": ("depth", "width", "web", "flange", "root_radius"),
    "angle": ("depth", "width", "thickness", "root_radius", "toe_radius"),
    "tee": ("depth", "width", "web", "flange", "root_radius"),
    "outline": (),
}
"""Dimensions of each shape, in the order of the spec."""

RADII = ("corner_radius", "inner_radius", "root_radius", "toe_radius")

AXIS_OF_WALL = {
    "web": "y", "left wall": "y", "right wall": "y", "upright leg": "y",
    "flanges": "z", "top flange": "z", "bottom flange": "z", "top wall": "z", "bottom wall": "z", "bottom leg": "z",
}  # fmt: skip
"""Direction of a cut's axis, by the wall that it passes."""

WALLS: dict[str, tuple[str, ...]] = {
    "rectangle": ("all",),
    "round": ("all",),
    "tube": ("all", "top wall", "bottom wall", "left wall", "right wall"),
    "box": ("all", "top wall", "bottom wall", "left wall", "right wall"),
    "I": ("all", "web", "flanges", "top flange", "bottom flange"),
    "channel": ("all", "web", "flanges", "top flange", "bottom flange"),
    "angle": ("all", "upright leg", "bottom leg"),
    "tee": ("all", "web", "top flange"),
    "outline": ("all",),
}
"""What a cut may pass, by shape."""


@cache
def mark_of(model: type[BaseModel], name: str) -> OfKind:
    """The quantity that a field of `model` holds."""

    def search(annotation: Any) -> OfKind | None:
        found = next((m for m in getattr(annotation, "__metadata__", ()) if isinstance(m, OfKind)), None)
        return found or next(filter(None, map(search, getattr(annotation, "__args__", ()))), None)

    info = model.model_fields[name]
    mark = next((m for m in info.metadata if isinstance(m, OfKind)), None) or search(info.annotation)
    if mark is None:
        raise KeyError(f"{model.__name__}.{name} holds no quantity")
    return mark


class Table:
    """One table of the spec: reads its quantities by field name."""

    def __init__(self, values: Values, path: str, spec: BaseModel) -> None:
        self.values = values
        self.path = path
        self.spec = spec

    def at(self, name: str) -> str:
        """Path of a field, in the words of the TOML file."""
        word = type(self.spec).model_fields[name].alias or name
        return f"{self.path}.{word}" if self.path else word

    def number(self, name: str) -> float:
        return self.values.number(self.at(name), getattr(self.spec, name), mark_of(type(self.spec), name))

    def optional(self, name: str) -> float | None:
        return None if getattr(self.spec, name) is None else self.number(name)

    def vector(self, name: str) -> tuple[float, float, float]:
        return self.values.vector(self.at(name), getattr(self.spec, name), mark_of(type(self.spec), name))

    def whole(self, name: str) -> int:
        return self.values.whole(self.at(name), getattr(self.spec, name), mark_of(type(self.spec), name))


def resolve_member(values: Values, name: str, spec: MemberSpec) -> Member:
    """The member in numbers; what cannot be read is NaN."""
    table = Table(values, f"members.{name}", spec)
    start, end = table.vector("start"), table.vector("end")
    length = math.dist(start, end)
    section = _section(values, table.at("section"), spec)
    member = Member(
        name=name,
        start=start,
        end=end,
        up=table.vector("up") if spec.up else _default_up(start, end),
        roll=table.number("roll"),
        section=section,
        line_at=spec.line_at,
        anchor=spec.anchor or _default_anchor(spec.line_at),
        stations=_stations(values, table.path, spec, section, length),
        cuts=tuple(_cuts(values, table.path, spec)),
        edge_radii=tuple(
            EdgeRadius(edge.edges, Table(values, f"{table.path}.edge_radii[{i}]", edge).number("radius"))
            for i, edge in enumerate(spec.edge_radii, 1)
        ),
        patches=tuple(_patch(values, f"{table.path}.patches.{key}", key, spec) for key in spec.patches),
    )
    follows = isinstance(spec.section, BoxSection) and spec.section.inner_radius is None
    return _with_inner_radii(member) if follows else member


def _with_inner_radii(member: Member) -> Member:
    """The member with the inner radius of a box that follows wall and outer radius at every station that names them."""
    if any("inner_radius" in station.dims for station in member.stations):
        return member
    stations: list[Station] = []
    for i, station in enumerate(member.stations):
        dims = dict(station.dims)
        if {"wall", "corner_radius"} & set(dims):
            first_of_step = i + 1 < len(member.stations) and member.stations[i + 1].at == station.at
            there = dims_at(member, station.at, before=first_of_step)
            dims["inner_radius"] = max(there["corner_radius"] - there["wall"], 0.0)
        stations.append(replace(station, dims=dims))
    return replace(member, stations=tuple(stations))


def _default_up(start: tuple[float, ...], end: tuple[float, ...]) -> tuple[float, float, float]:
    """Global z, unless the member is upright (within 1 in 1000): then global x."""
    across = math.hypot(end[0] - start[0], end[1] - start[1])
    return (1.0, 0.0, 0.0) if across < 1e-3 * abs(end[2] - start[2]) else (0.0, 0.0, 1.0)


def _default_anchor(line_at: str) -> Any:
    word = line_at.split()[0]
    return word if word in ("top", "bottom") else "centre"


def _section(values: Values, path: str, spec: MemberSpec) -> Section:
    section = spec.section
    if isinstance(section, OutlineSection):
        return Section("outline", {}, outline_of(values, path, section))
    table = Table(values, path, section)
    dims = {name: table.number(name) for name in DIMS[section.shape] if getattr(section, name) is not None}
    if section.shape == "I":
        dims.setdefault("bottom_width", dims["width"])
        dims.setdefault("bottom_flange", dims["flange"])
    if section.shape == "box":
        dims.setdefault("inner_radius", max(dims["corner_radius"] - dims["wall"], 0.0))
    return Section(section.shape, dims)


def _dims(values: Values, path: str, shape: str, texts: dict[str, Any]) -> dict[str, float]:
    """Dimensions named at a station or in a taper."""
    dims = {}
    for name, text in texts.items():
        if name not in DIMS[shape]:
            values.unknown(f"{path}.{name}", name, DIMS[shape], f"a dimension of the shape {shape}")
            continue
        mark = RADIUS if name in RADII else SIZE
        dims[name] = values.number(f"{path}.{name}", text, mark)
    return dims


def _follow(shape: str, section: Any, named: set[str], dims: dict[str, float]) -> None:
    """An I section whose bottom flange is not named has equal flanges at the other stations too."""
    if shape == "I":
        for bottom, top in (("bottom_width", "width"), ("bottom_flange", "flange")):
            if getattr(section, bottom) is None and bottom not in named and top in dims:
                dims[bottom] = dims[top]


def _stations(values: Values, path: str, spec: MemberSpec, section: Section, length: float) -> tuple[Station, ...]:
    stations: list[Station] = []
    named = set(spec.taper or {}).union(*(s.model_extra or {} for s in spec.stations))
    for i, station in enumerate(spec.stations, 1):
        table = Table(values, f"{path}.stations[{i}]", station)
        dims = _dims(values, table.path, section.shape, station.model_extra or {})
        _follow(section.shape, spec.section, named, dims)
        # Sums of lengths that mean one place differ in their last digit: a step is two stations at exactly one place.
        places = (*(s.at for s in stations[-1:]), length)
        at = next((x for x in places if abs(table.number("at") - x) <= 1e-9 * length), table.number("at"))
        stations.append(Station(at, dims, table.number("shoulder_fillet")))
    if spec.taper is not None:
        dims = _dims(values, f"{path}.taper", section.shape, spec.taper)
        _follow(section.shape, spec.section, named, dims)
        stations.append(Station(length, dims))
    return tuple(stations)


def _cuts(values: Values, path: str, spec: MemberSpec) -> Iterator[Cut]:
    for kind, plural, specs in (
        ("hole", "holes", spec.holes),
        ("slot", "slots", spec.slots),
        ("opening", "openings", spec.openings),
        ("notch", "notches", spec.notches),
    ):
        for i, cut in enumerate(specs, 1):
            table = Table(values, f"{path}.{plural}[{i}]", cut)
            yield from _pattern(table, kind, cut.name or f"{kind}{i}", spec.section.shape)


def _pattern(table: Table, kind: Any, group: str, shape: str) -> Iterator[Cut]:
    """The cuts of one table: along the member first, then row by row from the negative side."""
    spec: Any = table.spec
    through, axis = _through_and_axis(table, shape)
    length, depth, corner = _size(table)
    count = table.whole("count")
    pitch = _spacing(table, "count", count, "pitch")
    across = isinstance(spec, AcrossSpec)
    rows = table.whole("rows") if across else 1
    row_pitch = _spacing(table, "rows", rows, "row_pitch") if across else 0.0
    if count * rows > 1000:
        table.values.problem(table.path, f"{count * rows} cuts", "at most 1000 cuts in one table")
        return
    at = table.number("at") if through else math.nan  # NaN: not judged where the wall is not known
    offset = table.number("offset") if across else 0.0
    turned = table.number("turned") if isinstance(spec, (SlotSpec, OpeningSpec)) else 0.0
    for k in range(count * rows):
        row, place = divmod(k, count)
        yield Cut(
            name=group if count * rows == 1 else f"{group}.{k + 1}",
            group=group, kind=kind, axis=axis, through=through or "all",
            at=at + place * pitch, offset=offset + (row - (rows - 1) / 2.0) * row_pitch,
            length=length, depth=depth, corner_radius=corner, turned=turned,
            edge=spec.edge if isinstance(spec, NotchSpec) else "",
        )  # fmt: skip


def _spacing(table: Table, count_name: str, count: int, name: str) -> float:
    given = table.optional(name)
    if given is None and count > 1:
        table.values.problem(table.at(name), "nothing", f"a length: {count_name} is {count}", f"Give {name}")
        return math.nan
    return 0.0 if given is None else given


def _size(table: Table) -> tuple[float, float, float]:
    """length, depth and corner radius of a cut, as `Cut` wants them."""
    spec = table.spec
    if isinstance(spec, HoleSpec):
        diameter = table.number("diameter")
        return diameter, diameter, 0.0
    if isinstance(spec, SlotSpec):
        return table.number("length"), table.number("width"), 0.0
    across = "height" if isinstance(spec, OpeningSpec) else "depth"
    return table.number("length"), table.number(across), table.number("corner_radius")


def _through_and_axis(table: Table, shape: str) -> tuple[Any, Any]:
    spec: Any = table.spec
    walls = WALLS[shape]
    through: str
    if isinstance(spec, NotchSpec):
        follows = "y" if spec.edge in ("top", "bottom") else "z"
        through = spec.through or "all"
        why = f"a notch from the {spec.edge} edge"
    else:
        through = spec.through or ("all" if len(walls) == 1 else "")
        follows = AXIS_OF_WALL.get(through, "")
        why = f"a cut through the {through}"
    if not through:
        table.values.problem(table.at("through"), "nothing", f"what it passes: {', '.join(walls)}", "Give through")
        return None, spec.along or "y"
    if through not in walls:
        table.values.unknown(table.at("through"), through, walls, f"what a cut passes in the shape {shape}")
        return None, follows or "y"
    if spec.along and follows and spec.along != follows:
        table.values.problem(table.at("along"), spec.along, f"{follows}, the axis of {why}", "Leave along out")
    axis = spec.along or follows
    if not axis:
        table.values.problem(table.at("along"), "nothing", "y (sideways) or z (up and down)", 'Give along = "y" or "z"')
    return through, axis or "y"


def _patch(values: Values, path: str, name: str, spec: MemberSpec) -> Patch:
    patch = spec.patches[name]
    table = Table(values, path, patch)
    across = None
    if patch.across is not None:
        low, high = (values.number(f"{path}.across[{i}]", text, "length") for i, text in enumerate(patch.across, 1))
        across = (low, high)
    return Patch(name, patch.face, table.number("start"), table.number("end"), across)
