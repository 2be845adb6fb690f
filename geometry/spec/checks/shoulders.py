"""Steps of a member: how high they are on each side, and which length their fillets take up."""

from __future__ import annotations

from geometry.part import Member
from geometry.spec.checks.profile import bounds, dims_at, length_of
from geometry.spec.resolve.values import Values

SIDES = ("left", "right", "top", "bottom")
LEVEL = 1e-9  # mm; sides closer than this stay in line
Reach = tuple[str, float, float]
"""Side, and the stretch (mm along the member) that the fillet takes of it."""


def check_shoulder(values: Values, path: str, member: Member, index: int, is_step: bool) -> None:
    """Keep a shoulder fillet that has no step, is higher than its step, or longer than the side beside it."""
    station = member.stations[index]
    given = f"{station.shoulder_fillet:.6g} mm"
    if not is_step:
        values.problem(path, given, "only on the second of two stations at one place",
                       "Give the dimensions before the step in a station at the same place")  # fmt: skip
        return
    heights = [abs(h) for h in step_heights(member, station.at) if abs(h) > LEVEL]
    if not heights:
        values.problem(path, given, "only where the sides step", "The two stations have the same outer dimensions")
    elif station.shoulder_fillet >= min(heights) * (1.0 - 1e-3):
        values.problem(path, given, f"less than the step: {min(heights):.6g} mm")
    else:
        _check_length(values, path, member, station.at, station.shoulder_fillet)


def step_heights(member: Member, x: float) -> tuple[float, ...]:
    """How far left, right, top and bottom step inwards at x, mm: positive when the part is smaller behind it."""
    first, last = dims_at(member, x, before=True), dims_at(member, x)
    a, b = bounds(member.section, first), bounds(member.section, last)
    deep = (a[3] - a[2]) - (b[3] - b[2])
    top, bottom = {"top": (0.0, deep), "bottom": (deep, 0.0)}.get(member.anchor, (deep / 2.0, deep / 2.0))
    return b[0] - a[0], a[1] - b[1], top, bottom


def fillets(member: Member) -> list[Reach]:
    """Stretches that shoulder fillets take of the sides, on the smaller part of each step."""
    found = []
    for station in member.stations:
        r, x = station.shoulder_fillet, station.at
        for side, height in zip(SIDES, step_heights(member, x), strict=True):
            if r > 0.0 and abs(height) > LEVEL:
                found.append((side, x, x + r) if height > 0.0 else (side, x - r, x))
    return found


def _check_length(values: Values, path: str, member: Member, x: float, radius: float) -> None:
    """Compare a radius with the length from its step to where its side ends, and to a fillet that comes from there."""
    length = length_of(member)
    declared = member.stations
    steps = {b.at for a, b in zip(declared, declared[1:], strict=False) if a.at == b.at}
    for k, height in enumerate(step_heights(member, x)):
        if abs(height) <= LEVEL:
            continue
        ahead = height > 0.0
        others = [s for s in steps if abs(step_heights(member, s)[k]) > LEVEL and (s > x if ahead else s < x)]
        limit = min(others, default=length) if ahead else max(others, default=0.0)
        meets = [to - start for side, start, to in fillets(member) if side == SIDES[k] and ahead and to == limit]
        room = abs(limit - x) - sum(meets)
        if radius >= room * (1.0 - 1e-3):
            what = f"the step at {limit:.6g} mm" if others else "the end" if ahead else "the start"
            less = f", less the {meets[0]:.6g} mm of the fillet there" if meets else ""
            values.problem(path, f"{radius:.6g} mm", f"less than {max(room, 0.0):.6g} mm",
                           f"The smaller part is only {abs(limit - x):.6g} mm long from the step at {x:.6g} mm to "
                           f"{what}{less}, and a fillet lies on it with its whole radius")  # fmt: skip
            return
