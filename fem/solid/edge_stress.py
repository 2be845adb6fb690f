"""Stress along the member at the section's extreme points, at the rims of cuts and at shoulder fillets."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.figure import Figure, FigureKey, station_place
from fem.solid.frame import Frame, member_frame, stations
from fem.solid.model import SolidModel
from fem.solid.outline_cut import SIDES, Outline, extreme_value, side_segments
from fem.solid.shape import Array
from fem.solid.stress import along
from geometry.part import Cut, Member
from mesher.named_mesh import NamedMesh

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


@dataclass(frozen=True, slots=True)
class SurfaceStress:
    """Nodal stress (c, 6, s) and its spread (c, s) on the surface's nodes; place (n,): number of each node there."""

    stress: Array
    spread: Array
    place: NDArray[np.int64]

    def outline(self, mesh: NamedMesh, facets: NDArray[np.int64], frame: Frame) -> Outline:
        """Facets (6, k) of the boundary to be cut, with the surface's numbers as their nodes."""
        return Outline(mesh.nodes, facets, frame, self.place)


def surface_stress(mesh: NamedMesh, stress: Array, spread: Array) -> SurfaceStress:
    """What the figures need of the nodal stress (c, 6, n) and of its spread (c, n)."""
    nodes = np.unique(mesh.boundary)
    place = np.full(mesh.nodes.shape[1], -1)
    place[nodes] = np.arange(nodes.size)
    return SurfaceStress(stress[:, :, nodes], spread[:, nodes], place)


def outer_facets(model: SolidModel, member: Member) -> NDArray[np.int64]:
    """Facets of the member's outline: all boundary for a single member, else the member's own outer faces."""
    mesh = model.mesh
    if len(model.part.members) > 1:
        own = [
            mesh.facets[f"{member.name}.{side}"]
            for side in (*SIDES, "surface")
            if f"{member.name}.{side}" in mesh.facets
        ]
        if own:
            return np.concatenate(own, axis=1)
    return mesh.boundary


def nominal_figures(model: SolidModel, stress: Array, spread: Array) -> Iterator[Figure]:
    """``xx@top`` and so on at the 21 stations; nothing where the section has no outline there."""
    surface = surface_stress(model.mesh, stress, spread)
    c = stress.shape[0]
    for member in model.part.members:
        frame = member_frame(member)
        outline = surface.outline(model.mesh, outer_facets(model, member), frame)
        values = np.concatenate([along(surface.stress, frame.axes[0]), surface.spread])
        for at in stations(frame.length):
            segments = outline.at(float(at))
            if not segments.facets.size:
                continue
            for side in SIDES:
                found, _ = extreme_value(segments, side, values)
                yield from _figures(
                    model, station_place(member.name, float(at)), "nominal_stress", f"xx@{side}", found[:c], found[c:]
                )


def _cut_figures(
    model: SolidModel, member: Member, cut: Cut, surface: SurfaceStress, values: Array
) -> Iterator[Figure]:
    """Mean through the thickness of the stress along the member at the two points of the rim across it."""
    name = f"{member.name}.{cut.name}"
    facets = model.mesh.facets.get(name)
    if facets is None or not facets.shape[1]:
        return
    frame = member_frame(member)
    segments = surface.outline(model.mesh, facets, frame).at(cut.at)
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
    model: SolidModel, member: Member, outline: Outline, at: float, radius: float, surface: SurfaceStress
) -> Iterator[Figure]:
    """Greatest thickness mean along the fillet of the stress along its surface, where the section is smaller.

    Published factors are for that stress, and its greatest value lies where the surface is turned by 10 to 25 degrees:
    the component along the member alone is 5 to 10 % less. On a surface without traction it is the principal stress
    of greater size in the plane of the fillet's profile.
    """
    frame = member_frame(member)
    stress, spread = surface.stress, surface.spread
    c = stress.shape[0]
    for side, name in (("top", "upper"), ("bottom", "lower")):
        axis, sign = SIDES[side]
        reach = {}
        for way, end in ((-1.0, 0.0), (1.0, frame.length)):
            beside = min(2 * radius, abs(end - at) / 2)  # a shoulder may lie closer to an end than two radii
            segments = outline.at(at + way * beside)
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
            segments = outline.at(float(x))
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
    surface = surface_stress(model.mesh, stress, spread)
    for member in model.part.members:
        frame = member_frame(member)
        values = np.concatenate([along(surface.stress, frame.axes[0]), surface.spread])
        for cut in member.cuts:
            yield from _cut_figures(model, member, cut, surface, values)
        pairs = zip(member.stations, member.stations[1:], strict=False)
        steps = [(b.at, b.shoulder_fillet) for a, b in pairs if a.at == b.at and b.shoulder_fillet > 0]
        if steps:
            outline = surface.outline(model.mesh, outer_facets(model, member), frame)
            for at, radius in steps:
                yield from _shoulder_figures(model, member, outline, at, radius, surface)
