"""Whether a travelling load stays on a face that is there, at every position."""

from __future__ import annotations

import math
from collections.abc import Collection, Iterable

from geometry.part import Member, Part
from geometry.spec.checks.face_gaps import gaps_of
from geometry.spec.checks.names import check_region
from geometry.spec.checks.profile import length_of
from geometry.spec.checks.regions import faces_of, regions_of
from geometry.spec.resolve.travel import Travelling
from geometry.spec.resolve.values import Values

FINEST_STEP = 1e-5  # of the member's length: names of positions have six digits


def check_travelling(values: Values, part: Part, loads: Iterable[Travelling], removed: Collection[str]) -> None:
    """Keep faces that nothing can travel along, and positions, strips and axles that do not fit on them."""
    members = {member.name: member for member in part.members}
    for load in loads:
        path = f"loads.{load.name}"
        if load.on and not check_region(values, f"{path}.on", load.on, part, removed):
            continue
        name, _, face = load.on.partition(".")
        if name not in members:
            continue
        known = [f"{name}.{f}" for f in faces_of(members[name])]
        if load.on not in known and load.on in regions_of(members[name]):
            values.unknown(f"{path}.on", load.on, known, "a face along the member")
            continue
        if not any(load.force):
            values.problem(f"{path}.force", "0 N", "a force other than 0: what each axle does to the part")
        if _check_axles(values, load) and _check_positions(values, load, length_of(members[name])):
            _check_gaps(values, load, members[name], face)


def _check_axles(values: Values, load: Travelling) -> bool:
    path = f"loads.{load.name}.travels.axles"
    before = len(values.problems)
    if load.axles[0] != 0.0 and not math.isnan(load.axles[0]):
        values.problem(f"{path}[1]", f"{load.axles[0]:.6g} mm", "0 mm: the other axles count from the first",
                       "Put 0 mm first; from and to are the positions of that axle")  # fmt: skip
    for k, (one, two) in enumerate(zip(load.axles, load.axles[1:], strict=False), 2):
        if two - one < load.contact:
            values.problem(f"{path}[{k}]", f"{two:.6g} mm",
                           f"at least {one + load.contact:.6g} mm: rising, and one contact length from the axle before",
                           "Sort them; strips that overlap are one axle with a longer contact")  # fmt: skip
    return len(values.problems) == before


def _check_positions(values: Values, load: Travelling, length: float) -> bool:
    """Whether every axle stands between the ends at every position."""
    path = f"loads.{load.name}.travels"
    before = len(values.problems)
    last = max((axle for axle in load.axles if not math.isnan(axle)), default=0.0)  # what is not read has been told
    most = length - last
    if load.contact > length:
        values.problem(f"{path}.contact", f"{load.contact:.6g} mm", f"more than 0, at most the face: {length:.6g} mm")
    if most <= 0.0:
        values.problem(f"{path}.axles", f"{last:.6g} mm from the first to the last",
                       f"less than the member's length, {length:.6g} mm")  # fmt: skip
        return False
    which = "the axle" if len(load.axles) == 1 else "every axle"
    if load.start < 0.0 or load.start >= most:
        values.problem(f"{path}.from", f"{load.start:.6g} mm",
                       f"from 0 to less than {most:.6g} mm, so that {which} is on the part")  # fmt: skip
    if load.end > most * (1.0 + 1e-9) or load.end <= load.start:
        low = max(load.start, 0.0) if load.start < most else 0.0
        fix = "Positions with an axle gone from the part: another load, with the axles that are left"
        values.problem(f"{path}.to", f"{load.end:.6g} mm",
                       f"more than {low:.6g} mm, up to {most:.6g} mm, so that {which} is on the part",
                       fix if load.end > most and last > 0.0 else "")  # fmt: skip
    elif (load.end - load.start) / load.steps < FINEST_STEP * length:
        values.problem(f"{path}.steps", f"{load.steps}: a step of {(load.end - load.start) / load.steps:.3g} mm",
                       f"steps of at least {FINEST_STEP * length:.3g} mm")  # fmt: skip
    return len(values.problems) == before


def _check_gaps(values: Values, load: Travelling, member: Member, face: str) -> None:
    """Keep a gap of the face under a strip; at an end of the part a strip may stand on what is left."""
    length = length_of(member)
    half = load.contact / 2.0
    met: dict[str, list[float]] = {}
    for low, high, what in gaps_of(member, face):
        at_end = low <= 0.0 or high >= length
        for x in load.positions:
            for axle in load.axles:
                a, b = max(x + axle - half, 0.0), min(x + axle + half, length)
                common = min(b, high) - max(a, low)
                if common > (0.5 * (b - a) if at_end else 1e-9 * length):
                    met.setdefault(f"{low:.6g} to {high:.6g} mm ({what})", []).append(x)
    if met:
        gaps = [f"{gap} with the first axle at {_few(sorted(set(xs)))}" for gap, xs in list(met.items())[:4]]
        values.problem(f"loads.{load.name}.travels", f"{load.on} is missing under an axle: {'; '.join(gaps)}",
                       "strips that stand on the face along their whole length",
                       "Travel along another face, or make one load for each stretch that is there")  # fmt: skip


def _few(positions: list[float]) -> str:
    shown = ", ".join(f"{x:.6g}" for x in positions[:3])
    return f"{shown}{f' ... {positions[-1]:.6g}' if len(positions) > 3 else ''} mm"
