"""``notch_stress`` figures: nominal stress times a published factor, where one applies.

Signed longitudinal stress at the two rim points across the member (see `fem.figure`), mean through the thickness.
Where no published factor reaches, there is no figure but a note that says why.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from fem.beam import notch_factors as factors
from fem.beam.cut_stiffness import extent
from fem.beam.figures import Solved, forces_at
from fem.beam.notch_factors import FLAT_BAND, ROUND_TENSION_BAND, OutOfRange
from fem.beam.regions import EndFace, Face
from fem.beam.section import OutlineIntegrals
from fem.figure import Figure, FigureKey
from geometry.part import BearingLoad, Cut, Pressure, RegionLoad, RemotePoint, StripLoad

CLEAR = 3.0
"""Other features, supports and loads must be this many diameters away (common practice, no source)."""
SMALL_HOLE = 0.15
"""Largest hole / width of the wall for the small-hole rule: the finite width then adds up to 5 %."""
MOST_SLOPE = 0.1
"""Largest change of depth or width per length at a notch."""

Values = Callable[[str, np.ndarray], tuple[float, float]]
"""Stress and its band, MPa, at the upper or lower point for section forces (7,)."""


def notch_figures(s: Solved) -> tuple[list[Figure], list[str]]:
    """Figures of all cuts and filleted shoulders in all cases, and the notes on those left out."""
    figures: list[Figure] = []
    notes: list[str] = []
    for place, x, sides, zone, rule in _features(s):
        try:
            values, note = rule()
        except OutOfRange as reason:
            notes.append(f"{place}: no published stress concentration factor applies: {reason}")
            continue
        forces, near = forces_at(s, x), _loaded_near(s, *zone)
        if near:
            notes.append(f"{place}: no published stress concentration factor applies in {len(near)} of the cases of a "
                         f"travelling load, which stands within {zone[2]:.4g} mm")
        for k, case in enumerate(s.mesh.part.cases):
            if k in near:
                continue
            for side in sides:
                value, band = values(side, forces[:, k])
                figures.append(Figure(FigureKey(case.name, place, "notch_stress", f"xx@{side}", "member"), value, "MPa",
                                      error=band, note=note))
    return figures, notes


Zone = tuple[float, float, float]
"""Start and end of a feature and how far other things must be away, mm."""


def _loaded_near(s: Solved, start: float, end: float, distance: float) -> set[int]:
    """Cases in which a strip of a travelling load stands within `distance` of a feature."""
    strips = {v.name for v in s.mesh.part.loads if isinstance(v, StripLoad) and any(
        max(c - 0.5 * v.length - end, start - c - 0.5 * v.length) < distance for c in v.centres)}
    return {k for k, case in enumerate(s.mesh.part.cases) if any(case.factors.get(name) for name in strips)}


def _features(s: Solved) -> Iterator[tuple[str, float, tuple[str, ...], Zone, Callable[[], tuple[Values, str]]]]:
    member = s.mesh.member
    for cut in member.cuts:
        sides: tuple[str, ...] = ("upper", "lower")
        if cut.kind == "notch":
            sides = ("lower",) if cut.edge in ("top", "right") else ("upper",)
        zone = (*extent(cut), CLEAR * cut.length)
        yield f"{member.name}.{cut.name}", cut.at, sides, zone, lambda c=cut: _cut_rule(s, c)  # type: ignore[misc]
    for before, after in zip(member.stations, member.stations[1:], strict=False):
        if before.at == after.at and after.shoulder_fillet > 0.0:
            at, r = after.at, after.shoulder_fillet
            way = _narrow_side(s, at)
            end = s.mesh.node(_nearest(s, at + way * r))
            e = s.mesh.sections.integrals(at + way * 1e-6 * s.mesh.length).extremes
            zone = (at, at, float(e[0, 1] - e[1, 1]))
            yield (f"{member.name}.step@{at:.6g}", float(s.mesh.x[end]), ("upper", "lower"), zone,
                   lambda a=at, f=r, w=way: _shoulder_rule(s, a, f, w))  # type: ignore[misc]


def _nearest(s: Solved, x: float) -> float:
    return float(s.mesh.x[np.argmin(np.abs(s.mesh.x - x))])


def _narrow_side(s: Solved, at: float) -> float:
    before, after = (s.mesh.sections.integrals(at + d * 1e-6 * s.mesh.length).area for d in (-1.0, 1.0))
    return 1.0 if after < before else -1.0


def clear_of_others(s: Solved, own: tuple[str, ...], start: float, end: float, distance: float) -> None:
    """Raise `OutOfRange` when another feature, a support or a concentrated load lies within `distance` (mm)."""
    member, part = s.mesh.member, s.mesh.part
    zones = [(f"cut {c.name}", *extent(c)) for c in member.cuts if c.name not in own]
    zones += [(f"step at {a.at:.6g} mm", a.at, a.at) for b, a in zip(member.stations, member.stations[1:], strict=False)
              if b.at == a.at and f"step@{a.at:.6g}" not in own]
    used = [(f"support {v.name}", v.on) for v in part.supports]
    used += [(f"load {v.name}", v.on) for v in part.loads
             if isinstance(v, RegionLoad | RemotePoint | BearingLoad | Pressure)]
    for what, on in used:
        region = s.actions.region(on)
        if isinstance(region, EndFace):
            x = float(s.mesh.x[region.node])
            zones.append((what, x, x))
        elif isinstance(region, Face):
            zones.append((what, float(s.mesh.x[region.lengths[0]]), float(s.mesh.x[region.lengths[-1] + 1])))
        else:
            zones.append((what, float(region.points[:, 0].min()), float(region.points[:, 0].max())))
    zones += [("the end", 0.0, 0.0), ("the end", s.mesh.length, s.mesh.length)]
    for what, a, b in zones:
        gap = max(a - end, start - b)
        if gap < distance:
            raise OutOfRange(f"{what} is {max(gap, 0.0):.4g} mm away, less than {distance:.4g} mm")


def _straight_here(s: Solved, start: float, end: float) -> None:
    a, b = (s.mesh.sections.integrals(float(np.clip(x, 0.0, s.mesh.length))).extremes for x in (start, end))
    slope = float(np.abs(a - b).max()) / (end - start)
    if slope > MOST_SLOPE:
        raise OutOfRange(f"the section tapers by {slope:.2g} mm per mm here, more than {MOST_SLOPE:g}")


def _cut_rule(s: Solved, cut: Cut) -> tuple[Values, str]:
    start, end = extent(cut)
    if cut.kind == "hole":
        clear_of_others(s, (cut.name,), start, end, CLEAR * cut.length)
        _straight_here(s, start, end)
        return _hole_rule(s, cut)
    if cut.kind == "notch":
        return _notch_rule(s, cut)
    raise OutOfRange(f"a {cut.kind} has no published factor here")


def _plane_of(cut: Cut, e: np.ndarray) -> tuple[int, float, float]:
    """Index of the section moment in the plane of the cut, and the outline's range across (z for axis y)."""
    return (4, float(e[1, 1]), float(e[0, 1])) if cut.axis == "y" else (5, float(e[2, 0]), float(e[3, 0]))


def _hole_rule(s: Solved, cut: Cut) -> tuple[Values, str]:
    gross, net = s.mesh.sections.both_integrals(cut.at)
    moment, low, high = _plane_of(cut, gross.extremes)
    size, d = high - low, cut.length
    flat = s.mesh.member.section.shape == "rectangle" and cut.through == "all"
    if flat and abs(cut.offset - 0.5 * (low + high)) < 0.01 * size:
        tension, bending = factors.hole_tension(d, size), factors.hole_bending(d, size)

        def central(side: str, f: np.ndarray) -> tuple[float, float]:
            way = 1.0 if side == "upper" else -1.0
            mean = tension * f[0] / net.area
            bent = bending * _moment(f, gross, moment) * 0.5 * d * way / (net.Iyy if moment == 4 else net.Izz)
            return float(mean + bent), FLAT_BAND * float(abs(mean) + abs(bent))

        return central, (f"net section; Kt {tension:.3f} in tension (Pilkey & Pilkey, chart 4.1), {bending:.3f} in "
                         "bending at the hole's edge (ch. 4)")
    wall_low, wall_high = (low, high) if flat or cut.through == "all" else _wall_range(s, cut, low, high)
    room = 2.0 * min(wall_high - cut.offset, cut.offset - wall_low)
    if d > SMALL_HOLE * room:
        raise OutOfRange(f"the hole is {d / room:.2g} of twice its distance to the next edge or wall, more than "
                         f"{SMALL_HOLE:g}, and it is not in the middle of a flat bar")

    def small(side: str, f: np.ndarray) -> tuple[float, float]:
        m = _moment(f, gross, moment)
        slope = m / (gross.Iyy if moment == 4 else gross.Izz)
        centre = gross.zc if moment == 4 else gross.yc
        at = f[0] / gross.area + slope * (cut.offset - centre) + _across(s, cut, f, gross)
        value = factors.small_hole(at, slope, 0.5 * d, side == "upper")
        return value, FLAT_BAND * (3.0 * abs(at) + abs(slope) * d)

    return small, "gross section; small hole: 3 at its middle, 2 on the gradient (Kirsch)"


def _across(s: Solved, cut: Cut, f: np.ndarray, gross: OutlineIntegrals) -> float:
    """Stress of the moment out of the wall's plane, at the middle of the walls that are cut."""
    points = s.mesh.region(f"{s.mesh.member.name}.{cut.name}").centroid
    if cut.axis == "y":
        return float(-(f[5] + gross.yc * f[0]) / gross.Izz * (points[1] - gross.yc))
    return float((f[4] - gross.zc * f[0]) / gross.Iyy * (points[2] - gross.zc))


def _wall_range(s: Solved, cut: Cut, low: float, high: float) -> tuple[float, float]:
    """Clear range of the wall that a hole passes, across the member."""
    dims = s.mesh.member.section.dims
    shape = s.mesh.member.section.shape
    if shape in ("I", "channel") and cut.through == "web":
        return low + dims.get("bottom_flange", dims["flange"]), high - dims["flange"]
    if shape == "box":
        return low + dims["wall"], high - dims["wall"]
    raise OutOfRange(f"a hole through {cut.through} of a {shape} has no published factor here")


def _moment(f: np.ndarray, o: OutlineIntegrals, index: int) -> float:
    """Moment about the centroid with a positive sign for tension on the upper (+z or +y) side."""
    return float(f[4] - o.zc * f[0]) if index == 4 else -float(f[5] + o.yc * f[0])


def _notch_rule(s: Solved, cut: Cut) -> tuple[Values, str]:
    member = s.mesh.member
    opposite = {"top": "bottom", "bottom": "top", "left": "right", "right": "left"}[cut.edge]
    twins = [c for c in member.cuts if c.kind == "notch" and c.edge == opposite and abs(c.at - cut.at) < 1e-6
             and abs(c.depth - cut.depth) < 1e-6 and abs(c.length - cut.length) < 1e-6]
    if member.section.shape != "rectangle" or not twins:
        raise OutOfRange("only two equal notches opposite one another in a flat bar are published")
    if abs(cut.depth - 0.5 * cut.length) > 1e-6 * cut.length or abs(cut.corner_radius - cut.depth) > 1e-6 * cut.length:
        raise OutOfRange("only semicircular notches are published here")
    start, end = extent(cut)
    clear_of_others(s, (cut.name, twins[0].name), start, end, CLEAR * cut.length)
    _straight_here(s, start, end)
    gross, net = s.mesh.sections.both_integrals(cut.at)
    moment, low, high = _plane_of(cut, gross.extremes)
    tension = factors.notch_tension(cut.depth, high - low)
    bending = factors.notch_bending(cut.depth, high - low)
    reach = 0.5 * (high - low) - cut.depth

    def both(side: str, f: np.ndarray) -> tuple[float, float]:
        way = 1.0 if side == "lower" else -1.0  # the root of a notch from the top lies above the middle
        mean = tension * f[0] / net.area
        bent = bending * _moment(f, net, moment) * reach * way / (net.Iyy if moment == 4 else net.Izz)
        return float(mean + bent), FLAT_BAND * float(abs(mean) + abs(bent))

    return both, f"net section; Kt {tension:.3f} in tension, {bending:.3f} in bending (Pilkey & Pilkey, ch. 2)"


def _shoulder_rule(s: Solved, at: float, radius: float, way: float) -> tuple[Values, str]:
    inset = 1e-6 * s.mesh.length
    narrow, wide = (s.mesh.sections.integrals(at + w * way * inset) for w in (1.0, -1.0))
    shape = s.mesh.member.section.shape
    d, H = (float(o.extremes[0, 1] - o.extremes[1, 1]) for o in (narrow, wide))
    clear_of_others(s, (f"step@{at:.6g}",), at, at, d)
    _straight_here(s, min(at, at + way * d), max(at, at + way * d) - (0.0 if way > 0 else inset))
    if abs(narrow.zc - wide.zc) > 1e-3 * d or abs(narrow.yc - wide.yc) > 1e-3 * d:
        raise OutOfRange("the step is not the same on both sides")
    if shape == "rectangle":
        widths = [float(o.extremes[3, 0] - o.extremes[2, 0]) for o in (narrow, wide)]
        if abs(widths[0] - widths[1]) > 1e-6 * d:
            raise OutOfRange("the width changes as well as the depth")
        fits, bands, words = (factors.FLAT_TENSION, factors.FLAT_BENDING), (FLAT_BAND, FLAT_BAND), "charts 3.1 and 3.8"
    elif shape == "round":
        fits, words = (factors.ROUND_TENSION, factors.ROUND_BENDING), "charts 3.4 and 3.10"
        bands = (ROUND_TENSION_BAND, FLAT_BAND)
    else:
        raise OutOfRange(f"a stepped {shape} has no published factor here")
    tension, bending = (factors.shoulder(H, d, radius, fit) for fit in fits)

    def both(side: str, f: np.ndarray) -> tuple[float, float]:
        z = narrow.extremes[0 if side == "upper" else 1, 1] - narrow.zc
        mean = tension * f[0] / narrow.area
        bent = bending * (f[4] - narrow.zc * f[0]) * z / narrow.Iyy
        return float(mean + bent), float(bands[0] * abs(mean) + bands[1] * abs(bent))

    return both, f"narrow section; Kt {tension:.3f} in tension, {bending:.3f} in bending (Pilkey & Pilkey, {words})"

