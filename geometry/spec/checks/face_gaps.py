"""Line loads on a face that something interrupts over its whole width: such a gap can carry no load."""

from __future__ import annotations

import math

from geometry.part import Cut, LineLoad, Member, Part
from geometry.spec.checks.cuts import Interval, rim, span_at
from geometry.spec.checks.profile import Profile, length_of, profile_of
from geometry.spec.checks.regions import faces_of
from geometry.spec.checks.shoulders import fillets
from geometry.spec.resolve.values import Values

Gap = tuple[float, float, str]
"""From, to (mm along the member) and what makes it."""

ENDS = 1e-3  # share of the length by which a face may fall short of its load at the ends, as in the solid model
TOP_BOTTOM = ("all", "flanges", "top flange", "bottom flange", "top wall", "bottom wall", "bottom leg")
UPRIGHT = ("all", "web", "left wall", "right wall", "upright leg")


def check_line_loads(values: Values, part: Part) -> None:
    """Keep line loads whose face is interrupted, with the stretches that are there."""
    members = {member.name: member for member in part.members}
    for load in part.loads:
        if isinstance(load, LineLoad):
            name, _, face = load.on.partition(".")
            if name in members and face in faces_of(members[name]) and load.start < load.end:
                _check_load(values, load, members[name], face)


def _check_load(values: Values, load: LineLoad, member: Member, face: str) -> None:
    length = length_of(member)
    found = []
    for low, high, what in sorted(gaps_of(member, face)):
        low, high = max(low, load.start), min(high, load.end)
        at_end = low == load.start or high == load.end
        if high - low > (ENDS * length if at_end else 1e-9 * length):
            found.append((low, high, what))
    if not found:
        return
    left, reach = [], load.start
    for low, high, _ in found:
        if low > reach:
            left.append((reach, low))
        reach = max(reach, high)
    if load.end > reach:
        left.append((reach, load.end))
    fix = "; ".join(f"from {a:.6g} to {b:.6g} mm" for a, b in left[:6]) + (" ..." if len(left) > 6 else "")
    what = "" if len(left) < 2 else "a load of its own on each of these stretches: " if len(left) > 2 else "two loads: "
    gaps = ", ".join(f"{low:.6g} to {high:.6g} mm ({what})" for low, high, what in found[:4])
    gaps += f" and {len(found) - 4} more" if len(found) > 4 else ""
    values.problem(
        f"loads.{load.name}", f"{load.on} from {load.start:.6g} to {load.end:.6g} mm, where it is missing at {gaps}",
        "a stretch on which the face is there all along", f"Give {what}{fix}" if left else "Load another face",
    )  # fmt: skip


def gaps_of(member: Member, face: str) -> list[Gap]:
    """Where nothing of a face is left, mm along the member."""
    length = length_of(member)
    gaps = [(low, high, "a shoulder fillet") for side, low, high in fillets(member) if face in (side, "surface")]
    for edge in member.edge_radii:
        if edge.edges == "start" and face != "bore":
            gaps.append((0.0, edge.radius, "the edge radius of start"))
        elif edge.edges == "end" and face != "bore":
            gaps.append((length - edge.radius, length, "the edge radius of end"))
    profile = profile_of(member)
    for cut in member.cuts:
        xs = [x for x, _ in rim(cut)] if cut.kind != "notch" else [cut.at - cut.length / 2.0, cut.at + cut.length / 2.0]
        if _leaves_nothing(profile, face, cut):
            gaps.append((min(xs), max(xs), cut.name))
    return gaps


def _leaves_nothing(profile: Profile, face: str, cut: Cut) -> bool:
    """Whether a cut takes the whole width of a face at its middle."""
    if cut.kind == "notch" and cut.edge == face:
        return True
    box = profile.box(dims := profile.dims(cut.at))
    if face in ("top", "bottom"):
        if cut.axis != "z" or cut.through not in TOP_BOTTOM:
            return False
    elif face in ("left", "right", "web_left", "web_right"):
        if cut.axis != "y" or cut.through not in UPRIGHT:
            return False
    else:
        return False  # round about: no cut takes all of it
    low, high = (box[0], box[1]) if cut.axis == "z" else (box[2], box[3])
    if cut.kind == "notch":
        near = cut.edge in ("top", "right")
        removed: Interval | None = (high - cut.depth, math.inf) if near else (-math.inf, low + cut.depth)
    else:
        removed = span_at(cut, cut.at)
    here = _width(profile, face, dims)
    return removed is not None and here is not None and removed[0] <= here[0] and here[1] <= removed[1]


def _width(profile: Profile, face: str, d: dict[str, float]) -> Interval | None:
    """Range of y (top, bottom) or z of a face, from the line, mm; None where it is not worked out (outlines)."""
    shape, oy = profile.member.section.shape, profile.origin(d)[0]
    low_y, high_y, low_z, high_z = profile.box(d)
    if shape in ("rectangle", "box"):
        low, high = (low_y, high_y) if face in ("top", "bottom") else (low_z, high_z)
        radii = {e.edges: e.radius for e in profile.member.edge_radii}
        ends = {"top": ("top left", "top right"), "bottom": ("bottom left", "bottom right"),
                "left": ("bottom left", "top left"), "right": ("bottom right", "top right")}[face]  # fmt: skip
        first, last = (max(d["corner_radius"], radii.get(end, 0.0)) for end in ends)
        return low + first, high - last
    if shape in ("I", "tee") and face == "bottom":
        half = d["bottom_width" if shape == "I" else "web"] / 2.0
        return oy - half, oy + half
    if shape in ("I", "tee", "channel") and face == "top":
        return (low_y, high_y) if shape == "channel" else (oy - d["width"] / 2.0, oy + d["width"] / 2.0)
    if face in ("web_left", "web_right") and shape in ("I", "tee", "channel"):
        r = d["root_radius"]
        below = {"I": d.get("bottom_flange", 0.0) + r, "channel": d["flange"] + r}.get(shape, 0.0)
        return low_z + below, high_z - d["flange"] - r
    return None
