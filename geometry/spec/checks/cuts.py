"""Whether cuts lie in the wall that they pass, leave it whole and keep clear of one another."""

from __future__ import annotations

import math
from collections.abc import Iterator

from geometry.part import Cut, Member
from geometry.spec.checks.profile import Profile, length_of, profile_of
from geometry.spec.resolve.values import Values

Interval = tuple[float, float]
MOST_CUTS = 400
ROUND = 32  # points on a rim; the chord falls short of a circle by 0.5 % of its radius, so it is widened

_ANGLES = [2.0 * math.pi * (k + 0.5) / ROUND for k in range(ROUND)]
_CIRCLE = [(math.cos(angle), math.sin(angle)) for angle in _ANGLES]


def check_cuts(values: Values, member: Member, paths: dict[str, str]) -> None:
    """Keep what is wrong with the cuts; `paths` holds the path of each group."""
    if any(math.isnan(v) for v in (length_of(member), *member.section.dims.values())):
        return
    if len(member.cuts) > MOST_CUTS:
        values.problem(f"members.{member.name}", f"{len(member.cuts)} cuts", f"at most {MOST_CUTS}")
        return
    profile = profile_of(member)
    good = []
    for cut in member.cuts:
        if any(math.isnan(v) for v in (cut.at, cut.offset, cut.length, cut.depth, cut.corner_radius, cut.turned)):
            continue
        path = paths[cut.group] + (f" ({cut.name})" if cut.name != cut.group else "")
        shape_is_right = _check_shape(values, path, cut)
        if shape_is_right and _check_place(values, path, profile, cut):
            good.append(cut)
    if _check_apart(values, paths, good):
        _check_whole(values, paths, profile, good)


def _check_shape(values: Values, path: str, cut: Cut) -> bool:
    before = len(values.problems)
    if cut.kind == "slot" and cut.length <= cut.depth:
        values.problem(f"{path}.length", f"{cut.length:.6g} mm", f"more than its width, {cut.depth:.6g} mm",
                       "A slot that is as long as it is wide is a hole")  # fmt: skip
    if cut.kind == "opening" and cut.corner_radius >= min(cut.length, cut.depth) / 2.0 > 0.0:
        values.problem(f"{path}.corner_radius", f"{cut.corner_radius:.6g} mm",
                       f"less than half its smaller side: {min(cut.length, cut.depth) / 2.0:.6g} mm",
                       "Use a slot for round ends")  # fmt: skip
    most = min(cut.length / 2.0, cut.depth)
    if cut.kind == "notch" and cut.corner_radius > most * (1.0 + 1e-9):
        values.problem(f"{path}.corner_radius", f"{cut.corner_radius:.6g} mm",
                       f"at most half its length and at most its depth: {most:.6g} mm")  # fmt: skip
    return len(values.problems) == before


def rim(cut: Cut) -> list[tuple[float, float]]:
    """Points round a cut: distance along the member, and across it from the line, mm."""
    c, s = math.cos(cut.turned), math.sin(cut.turned)
    if cut.kind in ("hole", "slot"):
        r, half = cut.depth / 2.0, (cut.length - cut.depth) / 2.0
        wide = r / math.cos(math.pi / ROUND)
        own = [(math.copysign(half, cosine) + wide * cosine, wide * sine) for cosine, sine in _CIRCLE]
    else:
        a, b = cut.length / 2.0, cut.depth / 2.0
        own = [(-a, -b), (0.0, -b), (a, -b), (a, 0.0), (a, b), (0.0, b), (-a, b), (-a, 0.0)]
    return [(cut.at + c * x - s * y, cut.offset + s * x + c * y) for x, y in own]


def walls_of(profile: Profile, cut: Cut, dims: dict[str, float]) -> Iterator[tuple[str, list[Interval]]]:
    """For each wall that a cut passes: its name and the free stretches across the member, from the line."""
    oy, oz = profile.origin(dims)
    low_y, high_y, low_z, high_z = profile.box(dims)
    shape, d = profile.member.section.shape, dims
    whole = [(low_z, high_z)] if cut.axis == "y" else [(low_y, high_y)]
    if shape == "tube":
        clear = d["diameter"] / 2.0 - d["wall"]
        middle = oz if cut.axis == "y" else oy
        yield "clear bore", [(middle - clear, middle + clear)]
    elif shape == "box":
        low, high = whole[0]
        corner = max(d["wall"], d["corner_radius"], d["wall"] + d["inner_radius"])
        yield "flat of the wall", [(low + corner, high - corner)]
    elif cut.through == "web":
        r = d["root_radius"]
        bottom = {"I": d.get("bottom_flange", 0.0) + r, "channel": d["flange"] + r}.get(shape, 0.0)
        yield "flat of the web", [(low_z + bottom, high_z - d["flange"] - r)]
    elif cut.through in ("flanges", "top flange", "bottom flange"):
        yield from _flanges(cut, shape, d, oy)
    elif cut.through == "upright leg":
        yield "flat of the upright leg", [(low_z + d["thickness"] + d["root_radius"], high_z)]
    elif cut.through == "bottom leg":
        yield "flat of the bottom leg", [(low_y + d["thickness"] + d["root_radius"], high_y)]
    else:
        yield "section", whole


def _flanges(cut: Cut, shape: str, d: dict[str, float], oy: float) -> Iterator[tuple[str, list[Interval]]]:
    web, r = d["web"], d["root_radius"]
    for side in ("top", "bottom"):
        if cut.through in ("flanges", f"{side} flange"):
            width = d["bottom_width"] if shape == "I" and side == "bottom" else d["width"]
            if shape == "channel":
                yield f"flat of the {side} flange", [(oy + web + r, oy + width)]
            else:
                half = web / 2.0 + r
                yield f"flat of the {side} flange", [(oy - width / 2.0, oy - half), (oy + half, oy + width / 2.0)]


def _check_place(values: Values, path: str, profile: Profile, cut: Cut) -> bool:
    """Whether the whole rim lies in the wall; keeps a problem otherwise."""
    length = length_of(profile.member)
    if cut.kind == "notch":
        return _check_notch(values, path, profile, cut)
    points = rim(cut)
    low, high = min(x for x, _ in points), max(x for x, _ in points)
    if low <= 0.0 or high >= length:
        values.problem(f"{path}.at", f"{cut.at:.6g} mm: it reaches from {low:.6g} to {high:.6g} mm",
                       f"a cut that stays between the ends, 0 and {length:.6g} mm")  # fmt: skip
        return False
    if _box_fits(profile, cut, low, high, [s for _, s in points]):
        return True
    for x, s in points:
        for before in profile.sides(x):
            for wall, stretches in walls_of(profile, cut, profile.dims(x, before)):
                near = min(stretches, key=lambda t: abs(cut.offset - (t[0] + t[1]) / 2.0))
                if not near[0] < s < near[1]:
                    _misplaced(values, path, profile, cut, wall, near, x)
                    return False
    return True


def _box_fits(profile: Profile, cut: Cut, low: float, high: float, across: list[float]) -> bool:
    """Whether the rectangle about the rim lies in the walls at both its ends, with no station between them.

    Then so does every point of the rim, for the bounds of a wall vary linearly. The other way round nothing follows.
    """
    if any(low <= station.at <= high for station in profile.member.stations):
        return False
    least, greatest = min(across), max(across)
    margin = 1e-9 * (1.0 + abs(least) + abs(greatest))
    for x in (low, high):
        for _, stretches in walls_of(profile, cut, profile.dims(x)):
            a, b = min(stretches, key=lambda t: abs(cut.offset - (t[0] + t[1]) / 2.0))
            if not a + margin < least <= greatest < b - margin:
                return False
    return True


def _misplaced(values: Values, path: str, profile: Profile, cut: Cut, wall: str, room: Interval, x: float) -> None:
    axis = "z" if cut.axis == "y" else "y"
    low, high = _offsets(profile, cut, "")
    if low >= high:  # where the walls have no offset in common, the one at fault is told first
        low, high = _offsets(profile, cut, wall)
    if low >= high:
        where = f"the {wall}, {axis} from {room[0]:.6g} to {room[1]:.6g} mm at {x:.6g} mm along"
        name, size = {"hole": "diameter", "slot": "width", "opening": "height"}[cut.kind], cut.depth
        if cut.kind != "hole" and abs(math.sin(cut.turned)) * cut.length > cut.depth:
            name, size = "length", cut.length  # turned, it is its length that lies across
        values.problem(f"{path}.{name}", f"{size:.6g} mm", f"less than {max(room[1] - room[0], 0.0):.6g} mm",
                       f"It must lie within {where}")  # fmt: skip
    else:
        walls = dict(walls_of(profile, cut, profile.dims(cut.at)))
        a, b = min(walls.get(wall, [room]), key=lambda t: abs(cut.offset - (t[0] + t[1]) / 2.0))
        values.problem(f"{path}.offset", f"{cut.offset:.6g} mm",
                       f"more than {low:.6g} mm and less than {high:.6g} mm, which keeps the cut within the {wall}, "
                       f"{axis} from {a:.6g} to {b:.6g} mm at {cut.at:.6g} mm along",
                       f"Offset is counted from the member's line ({axis} of the member)")  # fmt: skip


def _offsets(profile: Profile, cut: Cut, wall: str) -> Interval:
    """Between which offsets the whole rim lies in a wall (or, without a name, in all), mm; its taper included."""
    low, high = -math.inf, math.inf
    for x, s in rim(cut):
        for before in profile.sides(x):
            for name, stretches in walls_of(profile, cut, profile.dims(x, before)):
                if wall in ("", name):
                    a, b = min(stretches, key=lambda t: abs(cut.offset - (t[0] + t[1]) / 2.0))
                    low, high = max(low, a - (s - cut.offset)), min(high, b - (s - cut.offset))
    return low, high


def _side_depth(profile: Profile, cut: Cut, x: float) -> float:
    """Size of the section in the direction of a notch, mm."""
    sizes = []
    for before in profile.sides(x):
        low_y, high_y, low_z, high_z = profile.box(profile.dims(x, before))
        sizes.append(high_z - low_z if cut.axis == "y" else high_y - low_y)
    return min(sizes)


def _check_notch(values: Values, path: str, profile: Profile, cut: Cut) -> bool:
    length = length_of(profile.member)
    low, high = cut.at - cut.length / 2.0, cut.at + cut.length / 2.0
    if profile.member.section.shape in ("round", "tube", "outline"):
        values.problem(f"{path}.edge", cut.edge, "a shape with flat sides",
                       f"The shape {profile.member.section.shape} takes holes, slots and openings")  # fmt: skip
        return False
    if low <= 0.0 or high >= length:
        values.problem(f"{path}.at", f"{cut.at:.6g} mm: it reaches from {low:.6g} to {high:.6g} mm",
                       f"a notch that stays between the ends, 0 and {length:.6g} mm")  # fmt: skip
        return False
    most = min(_side_depth(profile, cut, x) for x in (low, cut.at, high))
    if cut.depth >= most:
        values.problem(f"{path}.depth", f"{cut.depth:.6g} mm", f"less than the section there: {most:.6g} mm",
                       "The notch would cut the part in two")  # fmt: skip
        return False
    return True


def _passes_same_wall(a: Cut, b: Cut) -> bool:
    if a.axis != b.axis:
        return False
    if "all" in (a.through, b.through) or a.through == b.through:
        return True
    return "flanges" in (a.through, b.through) and "web" not in (a.through, b.through)


def _check_apart(values: Values, paths: dict[str, str], cuts: list[Cut]) -> bool:
    """Keep one pair of cuts of each two tables that run into one another (notches: see `_check_whole`)."""
    told: set[tuple[str, str]] = set()
    boxes = []
    for cut in cuts:
        points = rim(cut)
        xs, ss = [p[0] for p in points], [p[1] for p in points]
        boxes.append((min(xs), max(xs), min(ss), max(ss)))
    for i, a in enumerate(cuts):
        for j in range(i):
            b = cuts[j]
            if "notch" in (a.kind, b.kind) or (a.group, b.group) in told or not _passes_same_wall(a, b):
                continue
            p, q = boxes[i], boxes[j]
            if p[0] < q[1] and q[0] < p[1] and p[2] < q[3] and q[2] < p[3] and _meet(a, b):
                told.add((a.group, b.group))
                gap = math.hypot(a.at - b.at, a.offset - b.offset)
                values.problem(paths[a.group], f"{a.name}, {gap:.6g} mm from {b.name}", "cuts that do not overlap",
                               "Move one, or make one cut of the two")  # fmt: skip
    return not told


def _meet(a: Cut, b: Cut) -> bool:
    """Whether two convex rims meet (separating axis over the directions of both rims)."""
    if a.kind == b.kind == "hole":
        return math.hypot(a.at - b.at, a.offset - b.offset) < (a.length + b.length) / 2.0
    one, two = rim(a), rim(b)
    for points in (one, two):
        for (x0, y0), (x1, y1) in zip(points, [*points[1:], points[0]], strict=True):
            nx, ny = y1 - y0, x0 - x1
            first = [nx * x + ny * y for x, y in one]
            last = [nx * x + ny * y for x, y in two]
            if max(first) <= min(last) or max(last) <= min(first):
                return False
    return True


def _check_whole(values: Values, paths: dict[str, str], profile: Profile, cuts: list[Cut]) -> None:
    """Keep stations at which the cuts through the whole section leave nothing of it."""
    for axis in ("y", "z"):
        through = [cut for cut in cuts if cut.axis == axis and (cut.through == "all" or cut.kind == "notch")]
        if not through:
            continue
        stations = {cut.at for cut in through}
        ends = [(cut.at - cut.length / 2.0, cut.at + cut.length / 2.0) for cut in through]
        stations.update((max(a[0], b[0]) + min(a[1], b[1])) / 2.0 for a in ends for b in ends
                        if max(a[0], b[0]) < min(a[1], b[1]))  # fmt: skip
        # One message is enough: the stations of one mistake lie side by side.
        any(not _check_station(values, paths, profile, through, axis, x) for x in sorted(stations))


def _check_station(
    values: Values, paths: dict[str, str], profile: Profile, cuts: list[Cut], axis: str, x: float
) -> bool:
    """Whether the cuts at a station keep apart and leave some of the section."""
    low_y, high_y, low_z, high_z = profile.box(profile.dims(x))
    low, high = (low_z, high_z) if axis == "y" else (low_y, high_y)
    removed = []
    for cut in cuts:
        if cut.kind == "notch" and abs(x - cut.at) < cut.length / 2.0:
            removed.append(
                (high - cut.depth, high, cut) if cut.edge in ("top", "right") else (low, low + cut.depth, cut)
            )
        elif cut.kind != "notch" and (span := span_at(cut, x)):
            removed.append((*span, cut))
    removed.sort(key=lambda r: r[:2])
    reach, last_end = low, -math.inf
    for first, last, cut in removed:
        if first < last_end - 1e-9:
            values.problem(paths[cut.group], f"{cut.name} at {x:.6g} mm", "cuts that do not run into one another")
            return False
        last_end = last
        reach = last if first <= reach + 1e-9 else reach
    if not removed or reach < high - 1e-9:
        return True
    values.problem(paths[removed[-1][2].group], f"{' and '.join(r[2].name for r in removed)} at {x:.6g} mm",
                   "cuts that leave some of the section", "They would cut the part in two")  # fmt: skip
    return False


def span_at(cut: Cut, x: float) -> Interval | None:
    """Stretch across the member that a cut takes away at a distance from the start."""
    points = rim(cut)
    crossings = []
    for (x0, s0), (x1, s1) in zip(points, [*points[1:], points[0]], strict=True):
        if min(x0, x1) <= x <= max(x0, x1) and x0 != x1:
            crossings.append(s0 + (s1 - s0) * (x - x0) / (x1 - x0))
    return (min(crossings), max(crossings)) if crossings else None
