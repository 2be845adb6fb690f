"""Stress along the member at the section's extreme points, at the rims of cuts and at shoulder fillets."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from fem.figure import Figure, FigureKey, station_place
from fem.solid.frame import Frame, member_frame, stations
from fem.solid.model import SolidModel
from fem.solid.outline_cut import SIDES, Segments, cut_facets, extreme_value, side_segments
from fem.solid.shape import Array
from fem.solid.stress import along
from geometry.part import Cut, Member

RIM = 0.05
"""Points within this part of a cut's half depth from its extreme are its rim."""
FILLET_SAMPLES = 13


def _figures(
    model: SolidModel, place: str, quantity: str, component: str, values: Array, errors: Array | None = None
) -> Iterator[Figure]:
    for k, case in enumerate(model.part.cases):
        error = None if errors is None else float(errors[k])
        yield Figure(
            FigureKey(case.name, place, quantity, component, "member"),  # type: ignore[arg-type]
            float(values[k]),
            "MPa",
            error,
        )


def outer_segments(model: SolidModel, member: Member, frame: Frame, at: float) -> Segments:
    """Outline of the section at a station: all boundary for a single member, else the member's own outer faces."""
    mesh = model.mesh
    facets = mesh.boundary
    if len(model.part.members) > 1:
        own = [
            mesh.facets[f"{member.name}.{side}"]
            for side in (*SIDES, "surface")
            if f"{member.name}.{side}" in mesh.facets
        ]
        if own:
            facets = np.concatenate(own, axis=1)
    return cut_facets(mesh, facets, frame, at)


def nominal_figures(model: SolidModel, stress: Array, spread: Array) -> Iterator[Figure]:
    """``xx@top`` and so on at the 21 stations; nothing where the section has no outline there."""
    for member in model.part.members:
        frame = member_frame(member)
        values = np.concatenate([along(stress, frame.axes[0]), spread])
        c = stress.shape[0]
        for at in stations(frame.length):
            segments = outer_segments(model, member, frame, float(at))
            if not segments.facets.size:
                continue
            for side in SIDES:
                found, _ = extreme_value(segments, side, values)
                yield from _figures(
                    model, station_place(member.name, float(at)), "nominal_stress", f"xx@{side}", found[:c], found[c:]
                )


def _cut_figures(model: SolidModel, member: Member, cut: Cut, values: Array) -> Iterator[Figure]:
    """Mean through the thickness of the stress along the member at the two points of the rim across it."""
    name = f"{member.name}.{cut.name}"
    facets = model.mesh.facets.get(name)
    if facets is None or not facets.shape[1]:
        return
    frame = member_frame(member)
    segments = cut_facets(model.mesh, facets, frame, cut.at)
    if not segments.facets.size:
        return
    axis = 1 if cut.axis == "y" else 0
    offset = segments.yz[axis]
    low, high = float(offset.min()), float(offset.max())
    c = values.shape[0] // 2
    if cut.kind == "notch":  # one root only, on the side away from the edge
        side = "lower" if cut.edge in ("top", "right") else "upper"
        wanted = {side: low if side == "lower" else high}
    else:
        wanted = {"upper": high, "lower": low}
    band = RIM * max((high - low) / 2, cut.depth / 2)
    for side, level in wanted.items():
        chosen = np.flatnonzero((np.abs(offset - level) <= band).all(axis=1))
        if chosen.size:
            found = segments.mean(values, chosen)
            yield from _figures(model, name, "notch_stress", f"xx@{side}", found[:c], found[c:])


def _shoulder_figures(
    model: SolidModel, member: Member, at: float, radius: float, stress: Array, spread: Array
) -> Iterator[Figure]:
    """Greatest thickness mean along the fillet of the stress along its surface, where the section is smaller.

    Published factors are for that stress, and its greatest value lies where the surface is turned by 10 to 25 degrees:
    the component along the member alone is 5 to 10 % less. On a surface without traction it is the principal stress
    of greater size in the plane of the fillet's profile.
    """
    frame = member_frame(member)
    c = stress.shape[0]
    for side, name in (("top", "upper"), ("bottom", "lower")):
        axis, sign = SIDES[side]
        reach = {}
        for way, end in ((-1.0, 0.0), (1.0, frame.length)):
            beside = min(2 * radius, abs(end - at) / 2)  # a shoulder may lie closer to an end than two radii
            segments = outer_segments(model, member, frame, at + way * beside)
            reach[way] = sign * segments.yz[axis].max() if sign > 0 else -segments.yz[axis].min()
        step = reach[-1.0] - reach[1.0]
        if abs(step) < 1e-3 * radius:
            continue
        along_x, across = frame.axes[0], frame.axes[1 + axis]
        parts = (along(stress, along_x), along(stress, across), along(stress, (along_x + across) / np.sqrt(2.0)))
        values = np.concatenate([*parts, spread])
        way = 1.0 if step > 0 else -1.0
        best, error = np.zeros(c), np.zeros(c)
        length = min(1.5 * radius, 0.98 * abs((frame.length if way > 0 else 0.0) - at))
        for x in np.linspace(0.02 * radius, length, FILLET_SAMPLES) * way + at:
            segments = outer_segments(model, member, frame, float(x))
            chosen = side_segments(segments, side)
            # a round section touches its extreme in a point, a flat one along its thickness
            mean = segments.mean(values, chosen) if chosen.size else extreme_value(segments, side, values)[0]
            found = _larger_principal(mean[:c], mean[c : 2 * c], mean[2 * c : 3 * c])
            larger = np.abs(found) > np.abs(best)
            best, error = np.where(larger, found, best), np.where(larger, mean[3 * c :], error)
        yield from _figures(model, f"{member.name}.step@{at:.6g}", "notch_stress", f"xx@{name}", best, error)


def _larger_principal(a: Array, b: Array, diagonal: Array) -> Array:
    """The principal value of greater size of plane tensors with normal components a, b and that between them."""
    middle = (a + b) / 2
    return np.asarray(middle + np.copysign(np.hypot((a - b) / 2, diagonal - middle), middle))


def notch_figures(model: SolidModel, stress: Array, spread: Array) -> Iterator[Figure]:
    """``xx@upper`` and ``xx@lower`` of every cut and every filleted shoulder."""
    for member in model.part.members:
        values = np.concatenate([along(stress, member_frame(member).axes[0]), spread])
        for cut in member.cuts:
            yield from _cut_figures(model, member, cut, values)
        for before, after in zip(member.stations, member.stations[1:], strict=False):
            if before.at == after.at and after.shoulder_fillet > 0:
                yield from _shoulder_figures(model, member, after.at, after.shoulder_fillet, stress, spread)
