"""Whether the sections of a member can exist: plates, radii, stations, steps, the member's axes."""

from __future__ import annotations

import math
from collections.abc import Iterator

from geometry.part import Member
from geometry.spec.checks.frame import axes_of
from geometry.spec.checks.profile import dims_at, knots, length_of
from geometry.spec.checks.shoulders import check_shoulder
from geometry.spec.resolve.values import Values

Dims = dict[str, float]
LEAST_LENGTH = 1e-3  # mm; less is a slip of a unit
LEAST_ANGLE = 1e-3  # rad between `up` and the line; less makes the axes arbitrary


def check_member(values: Values, member: Member) -> None:
    """Keep what is wrong with a member's line, sections and stations."""
    path = f"members.{member.name}"
    _check_line(values, path, member)
    _check_stations(values, path, member)
    if any(math.isnan(v) for v in (length_of(member), *member.section.dims.values())):
        return
    seen: list[Dims] = []
    for x in knots(member):
        for before in (True, False):
            dims = dims_at(member, x, before)
            if dims in seen:
                continue
            seen.append(dims)
            where = f"{path}.section" if x == 0.0 else f"{path}.stations (at {x:g} mm)"
            for name, limit, most, why in _conditions(member.section.shape, dims):
                if dims[name] >= most * (1.0 - 1e-9):
                    values.problem(
                        f"{where}.{name}", f"{dims[name]:.6g} mm", f"less than {limit}: {max(most, 0.0):.6g} mm here",
                        why.format(most=max(most, 0.0)),
                    )  # fmt: skip


def _check_line(values: Values, path: str, member: Member) -> None:
    length = length_of(member)
    if length == 0.0:
        values.problem(f"{path}.to", "the same point as from", "another point", "A member needs a length")
        return
    if math.isnan(length):
        return
    if length < LEAST_LENGTH:
        values.problem(
            f"{path}.to", f"a length of {length:.6g} mm", f"at least {LEAST_LENGTH:g} mm", "Look at the unit"
        )
    up = math.sqrt(sum(c * c for c in member.up))
    if up == 0.0:
        values.problem(f"{path}.up", "0, 0, 0", "a direction")
    elif not math.isnan(up):
        along = abs(sum(u * (b - a) for u, a, b in zip(member.up, member.start, member.end, strict=True)))
        if math.acos(min(1.0, along / (up * length))) < LEAST_ANGLE:
            values.problem(f"{path}.up", ", ".join(f"{c:g}" for c in member.up), "a direction across the member",
                           "It points along the member, so it does not say where the depth goes")  # fmt: skip
    if member.line_at == "web" and "web" not in member.section.dims:
        values.problem(f"{path}.line_at", "web", f"a point that the shape {member.section.shape} has: "
                       "origin, centroid, top, bottom, left, right or a corner")  # fmt: skip


def _conditions(shape: str, d: Dims) -> Iterator[tuple[str, str, float, str]]:
    """For each condition of a shape: the dimension, its bound in words, the bound (mm), the repair."""
    fits = "The largest that fits is just under {most:.6g} mm"
    if shape == "rectangle":
        yield "corner_radius", "half the smaller side", min(d["depth"], d["width"]) / 2.0, fits
    elif shape == "tube":
        yield "wall", "half the diameter", d["diameter"] / 2.0, "For a solid bar use the shape round"
    elif shape == "box":
        yield from _box(d, fits)
    elif shape == "I":
        yield "web", "the width", min(d["width"], d["bottom_width"]), "Are web and width exchanged?"
        clear = d["depth"] - d["bottom_flange"]
        yield "flange", "the depth less the bottom flange", clear, "The flanges leave no web between them"
        half = (min(d["width"], d["bottom_width"]) - d["web"]) / 2.0
        yield from _root(d, min(half, (clear - d["flange"]) / 2.0), fits)
    elif shape == "channel":
        yield "web", "the width", d["width"], "Are web and width exchanged?"
        yield "flange", "half the depth", d["depth"] / 2.0, "The flanges leave no web between them"
        yield from _root(d, min(d["width"] - d["web"], d["depth"] / 2.0 - d["flange"]), fits)
    elif shape == "tee":
        yield "web", "the width", d["width"], "Are web and width exchanged?"
        yield "flange", "the depth", d["depth"], "The flange leaves no web below it"
        yield from _root(d, min((d["width"] - d["web"]) / 2.0, d["depth"] - d["flange"]), fits)
    elif shape == "angle":
        yield "thickness", "either leg", min(d["depth"], d["width"]), "Are thickness and leg exchanged?"
        yield "toe_radius", "the thickness", d["thickness"], fits
        leg = min(d["depth"], d["width"]) - d["thickness"] - d["toe_radius"]
        yield from _root(d, leg, fits)


def _root(d: Dims, most: float, fits: str) -> Iterator[tuple[str, str, float, str]]:
    """A root radius; nothing is said about it where the plates themselves do not fit."""
    if d["root_radius"] > 0.0 and most > 0.0:
        yield "root_radius", "the flat beside the root", most, fits


def _box(d: Dims, fits: str) -> Iterator[tuple[str, str, float, str]]:
    side = min(d["depth"], d["width"])
    yield "wall", "half the smaller side", side / 2.0, "For a solid bar use the shape rectangle"
    yield "corner_radius", "half the smaller side", side / 2.0, fits
    clear = side / 2.0 - d["wall"]
    if clear > 0.0:
        yield "inner_radius", "half the smaller clear side", clear, fits
    # Along the diagonal of a corner the wall is wall sqrt 2 - (R - r)(sqrt 2 - 1).
    most = d["inner_radius"] + d["wall"] * math.sqrt(2.0) / (math.sqrt(2.0) - 1.0)
    if most < side / 2.0:
        yield "corner_radius", "what leaves a wall in the corner", most, "Give an inner_radius of corner_radius - wall"


def _check_stations(values: Values, path: str, member: Member) -> None:
    length = length_of(member)
    declared = member.stations
    if member.section.shape == "outline" and declared:
        values.problem(f"{path}.taper", "stations or a taper", "one section all along",
                       "An outline has no named dimensions that could vary")  # fmt: skip
        return
    for i, station in enumerate(declared, 1):
        where = f"{path}.stations[{i}].at"
        if station.at <= 0.0 or station.at > length * (1.0 + 1e-9):
            values.problem(where, f"{station.at:.6g} mm", f"greater than 0 mm, up to {length:.6g} mm",
                           "The section itself holds at the start")  # fmt: skip
        if i > 1 and station.at < declared[i - 2].at:
            values.problem(where, f"{station.at:.6g} mm", f"at least {declared[i - 2].at:.6g} mm, as the one before",
                           "Give the stations in order along the member")  # fmt: skip
        if i > 2 and station.at == declared[i - 2].at == declared[i - 3].at:
            values.problem(where, f"{station.at:.6g} mm, a third time", "two stations at one place make a step")
        is_step = i > 1 and station.at == declared[i - 2].at
        if is_step and station.at >= length * (1.0 - 1e-9):
            values.problem(
                where, "a step at the far end", f"a step before {length:.6g} mm", "Is there a taper as well?"
            )
        if station.shoulder_fillet > 0.0:
            check_shoulder(values, f"{path}.stations[{i}].shoulder_fillet", member, i - 1, is_step)


def check_edges(values: Values, member: Member) -> None:
    """Keep what is wrong with radii on edges."""
    path = f"members.{member.name}.edge_radii"
    outer = ("top left", "top right", "bottom left", "bottom right")
    has_outer = member.section.shape in ("rectangle", "box", "I", "channel", "angle", "tee")
    cuts = list(dict.fromkeys(n for c in member.cuts for n in (c.group, c.name)))
    known = (*(outer if has_outer else ()), "start", "end", *cuts)
    for i, edge in enumerate(member.edge_radii, 1):
        if edge.edges not in known:
            values.unknown(f"{path}[{i}].edges", edge.edges, known, "edges of this shape, or a cut")
            continue
        if edge.edges in [e.edges for e in member.edge_radii[: i - 1]]:
            values.problem(f"{path}[{i}].edges", edge.edges, "one radius for each edge")
        if edge.edges in outer and member.section.dims.get("corner_radius", 0.0) > 0.0:
            values.problem(f"{path}[{i}].edges", edge.edges, "edges that are sharp", "The section has a corner_radius")
        if edge.edges in outer:
            where = f"the edge {edge.edges}"
        else:
            where = f"the rim of the {edge.edges}" if edge.edges in ("start", "end") else f"the rims of {edge.edges}"
        most, what = _largest_edge_radius(member)
        if edge.radius >= most:
            values.problem(f"{path}[{i}].radius", f"{edge.radius:.6g} mm on {where}", f"less than {most:.6g} mm",
                           f"That is half the {what}, and a radius on either side of it must fit")  # fmt: skip


def _largest_edge_radius(member: Member) -> tuple[float, str]:
    """Half the thinnest plate of the member (mm), and that plate in words with its place."""
    names = {"rectangle": ("depth", "width"), "round": ("diameter",)}.get(
        member.section.shape, ("web", "wall", "flange", "bottom_flange", "thickness")
    )
    found = [
        (d[name], x, name)
        for x in knots(member)
        for d in (dims_at(member, x, True), dims_at(member, x))
        for name in names
        if name in d
    ]
    if not found:
        return math.inf, ""
    least, x, name = min(found)
    return least / 2.0, f"{name.replace('_', ' ')} of {least:.6g} mm at {x:.6g} mm along"


def axes_known(member: Member) -> bool:
    """Whether the member's axes can be worked out."""
    return not any(math.isnan(c) for axis in axes_of(member) for c in axis)
