"""Whether the supports hold the part against every motion as a rigid body.

Rows of a small matrix say what each support holds of the motion u = t + w x p, for a handful of points p of
its region; a motion that no row sees is free. Only the rank matters, so the points are those of the bounding
rectangle of the section (of a hole: of its axis and rim), with no claim to exactness.
"""

from __future__ import annotations

import math

from geometry.part import Cut, Member, Part, Support, Vector
from geometry.spec.checks.frame import axes_of, cross, plus, scaled
from geometry.spec.checks.profile import Profile, length_of, profile_of
from geometry.spec.checks.section import axes_known
from geometry.spec.resolve.values import Values

Row = list[float]
GLOBAL: tuple[Vector, Vector, Vector] = ((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))
ZERO_PIVOT = 1e-7


def check_held(values: Values, part: Part) -> None:
    """Keep one problem that names every rigid motion left free."""
    members = {member.name: member for member in part.members}
    if not part.supports or not all(_usable(member) for member in part.members):
        return
    scale = max((length_of(member) for member in part.members), default=1.0)
    centre = part.members[0].start
    rows: list[Row] = []
    for support in part.supports:
        name, _, region = support.on.partition(".")
        if name not in members:
            return  # reported as an unknown region
        rows += _rows(support, members[name], region, centre, scale)
    free = _free_motions(rows, centre, scale)
    if free:
        values.problem(
            "supports",
            "these motions are free: " + "; ".join(free),
            "supports that hold the part against every rigid motion",
            "Hold another freedom, or another region",
        )


def _usable(member: Member) -> bool:
    dims = (*member.section.dims.values(), length_of(member), member.roll)
    if member.section.shape == "outline" and (member.section.outline is None or not member.section.outline.outer):
        return False
    return not any(math.isnan(v) for v in dims) and length_of(member) > 0.0 and axes_known(member)


def _rows(support: Support, member: Member, region: str, centre: Vector, scale: float) -> list[Row]:
    axes = axes_of(member) if support.axes == "member" else GLOBAL
    points, normal = _points(member, region)
    arms = [scaled(plus(p, scaled(centre, -1.0)), 1.0 / scale) for p in points]
    if support.coupling != "surface":
        mean = scaled(plus((0.0, 0.0, 0.0), _sum(arms)), 1.0 / len(arms))
        arms = [mean]
    rows = []
    for freedom in support.held:
        if freedom in ("rx", "ry", "rz"):
            rows.append([0.0, 0.0, 0.0, *axes[("rx", "ry", "rz").index(freedom)]])
            continue
        direction = normal if freedom == "normal" else axes[("x", "y", "z").index(freedom)]
        rows += [[*direction, *cross(arm, direction)] for arm in arms]
    return rows


def _sum(vectors: list[Vector]) -> Vector:
    return (sum(v[0] for v in vectors), sum(v[1] for v in vectors), sum(v[2] for v in vectors))


def _points(member: Member, region: str) -> tuple[list[Vector], Vector]:
    """Points of a region (global, mm), and its outward normal when it is plane."""
    profile, axes, length = profile_of(member), axes_of(member), length_of(member)
    cuts = [cut for cut in member.cuts if region in (cut.name, cut.group)]
    patch = next((p for p in member.patches if p.name == region), None)
    if cuts:
        local = [p for cut in cuts for p in _cut_points(profile, cut)]
        return [_placed(member, axes, p) for p in local], axes[0]
    if region in ("start", "end"):
        x = 0.0 if region == "start" else length
        local = [(x, y, z) for y, z in _corners(profile.box(profile.dims(x, x > 0.0)))]
        return [_placed(member, axes, p) for p in local], scaled(axes[0], -1.0 if region == "start" else 1.0)
    face = patch.face if patch else region
    low, high = (patch.start, patch.end) if patch else (0.0, length)
    normal = scaled(axes[1 if face in ("left", "right", "web_left", "web_right") else 2],
                    -1.0 if face in ("left", "web_left", "bottom") else 1.0)  # fmt: skip
    across = patch.across if patch else None
    local = [(x, y, z) for x in (low, high) for y, z in _side(profile.box(profile.dims(x)), face, across)]
    return [_placed(member, axes, p) for p in local], normal


def _cut_points(profile: Profile, cut: Cut) -> list[Vector]:
    low_y, high_y, low_z, high_z = profile.box(profile.dims(cut.at))
    r = cut.depth / 2.0
    points = []
    for dx, ds in ((r, 0.0), (-r, 0.0), (0.0, r), (0.0, -r)):
        x, s = cut.at + dx, cut.offset + ds
        points += [(x, low_y, s), (x, high_y, s)] if cut.axis == "y" else [(x, s, low_z), (x, s, high_z)]
    return points


def _corners(box: tuple[float, float, float, float]) -> list[tuple[float, float]]:
    return [(y, z) for y in box[:2] for z in box[2:]]


def _side(
    box: tuple[float, float, float, float], face: str, across: tuple[float, float] | None
) -> list[tuple[float, float]]:
    """Two points of a face in a section (all corners of a round one)."""
    low_y, high_y, low_z, high_z = box
    if face in ("top", "bottom"):
        z = high_z if face == "top" else low_z
        return [(y, z) for y in across or (low_y, high_y)]
    if face in ("left", "right", "web_left", "web_right"):
        y = low_y if face in ("left", "web_left") else high_y
        return [(y, z) for z in across or (low_z, high_z)]
    return _corners(box)


def _placed(member: Member, axes: tuple[Vector, Vector, Vector], p: Vector) -> Vector:
    point = member.start
    for axis, distance in zip(axes, p, strict=True):
        point = plus(point, scaled(axis, distance))
    return point


def _eliminate(rows: list[Row], columns: int) -> tuple[list[Row], list[int]]:
    """Reduced rows (elimination with row pivoting over the first `columns`) and their pivot columns."""
    rows = [list(row) for row in rows]
    pivots: list[int] = []
    for column in range(columns):
        done = len(pivots)
        pivot = max(range(done, len(rows)), key=lambda r: abs(rows[r][column]), default=None)
        if pivot is None or abs(rows[pivot][column]) < ZERO_PIVOT:
            continue
        rows[done], rows[pivot] = rows[pivot], rows[done]
        rows[done] = [a / rows[done][column] for a in rows[done]]
        for r in range(len(rows)):
            factor = rows[r][column]
            if r != done and factor:
                rows[r] = [a - factor * b for a, b in zip(rows[r], rows[done], strict=True)]
        pivots.append(column)
    return rows, pivots


def _free_motions(rows: list[Row], centre: Vector, scale: float) -> list[str]:
    """Names of the rigid motions that no row sees."""
    missing = 6 - len(_eliminate(rows, 6)[1])
    if missing <= 0:
        return []
    moves = [row[:3] for row in rows]
    free_moves = 3 - len(_eliminate(moves, 3)[1])
    names = [f"translation along {axis}" for k, axis in enumerate("xyz") if all(abs(m[k]) < ZERO_PIVOT for m in moves)]
    names = names[:free_moves] + ["translation along a direction askew"] * (free_moves - len(names))
    turns = [turn for k in range(3) if (turn := _free_turn(rows, k, centre, scale))]
    free_turns = missing - free_moves
    return names + turns[:free_turns] + ["rotation about an axis askew"] * (free_turns - len(turns))


def _free_turn(rows: list[Row], k: int, centre: Vector, scale: float) -> str:
    """Name of the rotation about the global axis `k`, if some translation makes up for it in every row."""
    solved, pivots = _eliminate([[*row[:3], -row[3 + k]] for row in rows], 3)
    if any(abs(row[3]) > ZERO_PIVOT for row in solved[len(pivots) :]):
        return ""
    shift = [0.0, 0.0, 0.0]
    for row, column in zip(solved, pivots, strict=False):
        shift[column] = row[3]
    # u = shift + e x (p - centre) / scale vanishes on the axis through centre + scale (e x shift).
    through = plus(centre, scaled(cross(GLOBAL[k], (shift[0], shift[1], shift[2])), scale))
    point = ", ".join(f"{round(c, 6) + 0.0:.6g}" for c in through)
    return f"rotation about {'xyz'[k]} through ({point}) mm"
