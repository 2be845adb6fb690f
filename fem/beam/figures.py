"""From the states of the line to figures."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from fem.beam.actions import Actions
from fem.beam.element import GAUSS
from fem.beam.equations import Row, States
from fem.beam.law import LineProperties, section_flexibility, torque_row
from fem.beam.mesh import BeamMesh
from fem.beam.outlines import dims_at
from fem.beam.result import Diagram
from fem.beam.section import OutlineIntegrals
from fem.figure import Figure, FigureKey, Quantity, station_place

Array = NDArray[np.float64]
XYZ = ("x", "y", "z")
STATIONS = 20


@dataclass(frozen=True)
class Solved:
    """Everything that the figures are made from; loads and temperature changes by case (last axis)."""

    mesh: BeamMesh
    actions: Actions
    rows: list[Row]
    nodal: Array
    lengths: Array
    change: Array
    states: States

    @cached_property
    def energies(self) -> Array:
        """(2, cases) see `energies`."""
        return _energies(self)


def station_values(mesh: BeamMesh) -> Array:
    """(21,) stations at which both models report, mm."""
    return np.arange(STATIONS + 1) * mesh.length / STATIONS


class LineKey(NamedTuple):
    """What one row of `LineValues` is: a `FigureKey` without its case, and the unit."""

    place: str
    quantity: Quantity
    component: str
    axes: Literal["global", "member"]
    unit: str


@dataclass(frozen=True, slots=True)
class LineValues:
    """Displacements, reactions, section forces and strain energy: `keys` (k,) and `values` (k, cases)."""

    keys: tuple[LineKey, ...]
    values: Array


def line_values(s: Solved) -> LineValues:
    """Displacements, reactions, section forces and strain energy of all cases."""
    blocks = [*_displacements(s), *_reactions(s), *_section_forces(s)]
    blocks.append(([LineKey("", "strain_energy", "", "global", "N mm")], energies(s).sum(axis=0)[None]))
    return LineValues(tuple(key for keys, _ in blocks for key in keys), np.vstack([values for _, values in blocks]))


def line_figures(s: Solved) -> list[Figure]:
    """`line_values` as figures, case by case."""
    return as_figures(s, line_values(s))


def as_figures(s: Solved, line: LineValues) -> list[Figure]:
    """Figures, case by case."""
    return [Figure(FigureKey(case.name, key.place, key.quantity, key.component, key.axes), value, key.unit)
            for case, column in zip(s.mesh.part.cases, line.values.T.tolist(), strict=True)
            for key, value in zip(line.keys, column, strict=True)]


def all_figures(s: Solved, line: LineValues) -> tuple[list[Figure], list[str]]:
    """Every figure of the beam model (`line`: those of `line_values`), and notes on those that it withholds."""
    from fem.beam.notches import notch_figures
    from fem.beam.stress import nominal_stresses

    figures = [*as_figures(s, line), *nominal_stresses(s), *mass_figures(s.mesh)]
    notched, notes = notch_figures(s)
    return figures + notched, notes


def places(mesh: BeamMesh) -> Iterator[tuple[str, float]]:
    """Name and x of each place at which displacements are reported."""
    name = mesh.member.name
    yield f"{name}.start", 0.0
    yield f"{name}.end", mesh.length
    for place in mesh.part.places:
        if place.member == name:
            yield place.name, place.at
    for x in station_values(mesh):
        yield station_place(name, float(x)), float(x)


def forces_at(s: Solved, x: float) -> Array:
    """(7, cases) N, Vy, Vz, T, My, Mz, B at `x`; at an inner jump the mean of both sides."""
    k = s.mesh.node(x)
    m = len(s.mesh.x) - 1
    sides = []
    if k > 0:
        sides.append(s.states.end[k - 1, 7:])
    if k < m:
        sides.append(s.states.start[k, 7:])
    return np.asarray(np.mean(sides, axis=0))


Block = tuple[list[LineKey], Array]


def _displacements(s: Solved) -> Iterator[Block]:
    R = s.mesh.axes
    named = list(places(s.mesh))
    p = sections_after(s.mesh, np.array([x for _, x in named]))
    for (place, x), yc, zc in zip(named, p.yc, p.zc, strict=True):
        k = s.mesh.node(x)
        d = s.states.freedoms[7 * k:7 * k + 6]
        # the section's mean is that of its centroid; free expansion moves it across the member as well
        u = d[:3] + section_arm(yc, zc) @ d[3:6]
        u[1] += s.mesh.part.material.expansion * s.change * yc
        u[2] += s.mesh.part.material.expansion * s.change * zc
        yield [LineKey(place, "displacement", c, "global", "mm") for c in XYZ], R.T @ u
        yield [LineKey(place, "rotation", c, "global", "rad") for c in XYZ], R.T @ d[3:6]


def sections_after(mesh: BeamMesh, x: Array) -> LineProperties:
    """Net sections at stations `x` (k,), just behind each one; before the last end of the member."""
    at = np.where(x >= mesh.length, np.nextafter(mesh.length, 0.0), x)
    return mesh.sections.net(at)


def section_arm(yc: float, zc: float) -> Array:
    """(3, 3) A with A @ rotation = rotation x (0, yc, zc)."""
    return np.array([[0.0, zc, -yc], [-zc, 0.0, 0.0], [yc, 0.0, 0.0]])


def row_resultants(s: Solved, centre: Array, vectors: Array) -> Array:
    """(rows, 6) force and moment about `centre` (member axes) of generalised forces `vectors` (rows, n_freedoms)."""
    line = np.zeros((len(s.mesh.x), 3))
    line[:, 0] = s.mesh.x
    points = np.vstack([line, *(p[None] for p in s.actions.rigid_points)])
    n = 7 * len(line)
    blocks = np.concatenate([vectors[:, :n].reshape(len(vectors), -1, 7)[:, :, :6],
                             vectors[:, n:].reshape(len(vectors), -1, 6)], axis=1)
    force = blocks[:, :, :3]
    moment = blocks[:, :, 3:] + np.cross(points - centre, force)
    return np.hstack([force.sum(axis=1), moment.sum(axis=1)])


def reaction(s: Solved, support: str) -> Array:
    """(6, cases) force and moment about its region's centroid (member axes) that a support exerts on the part."""
    on = next(v.on for v in s.mesh.part.supports if v.name == support)
    own = [k for k, row in enumerate(s.rows) if row.owner == support]
    vectors = np.array([s.rows[k].vector for k in own]).reshape(len(own), s.actions.freedoms)
    return np.asarray(row_resultants(s, s.actions.region(on).centroid, vectors).T @ s.states.reactions[own])


def _reactions(s: Solved) -> Iterator[Block]:
    for support in s.mesh.part.supports:
        total, back = reaction(s, support.name), s.mesh.axes.T
        yield [LineKey(support.name, "reaction_force", c, "global", "N") for c in XYZ], back @ total[:3]
        yield [LineKey(support.name, "reaction_moment", c, "global", "N mm") for c in XYZ], back @ total[3:]


def _section_forces(s: Solved) -> Iterator[Block]:
    for x in station_values(s.mesh):
        place = station_place(s.mesh.member.name, float(x))
        f = forces_at(s, float(x))
        yield [LineKey(place, "section_force", c, "member", "N") for c in ("N", "Vy", "Vz")], f[:3]
        yield [LineKey(place, "section_moment", c, "member", "N mm") for c in ("T", "My", "Mz")], f[3:6]


def energies(s: Solved) -> Array:
    """(2, cases) elastic energy without shear, and of shear, N mm (Simpson's rule on each length)."""
    return s.energies


def _energies(s: Solved) -> Array:
    mesh, material = s.mesh, s.mesh.part.material
    E, G = material.E, material.E / (2.0 * (1.0 + material.nu))
    x = mesh.x
    h = np.diff(x)
    inset = 1e-7 * h
    out = np.zeros((2, s.nodal.shape[1]))
    for at, states, w in ((x[:-1] + inset, s.states.start, 1.0), (0.5 * (x[:-1] + x[1:]), s.states.middle, 4.0),
                          (x[1:] - inset, s.states.end, 1.0)):
        p = mesh.stiffness(at)
        f = states[:, 7:13]
        whole = (f * (section_flexibility(p, E, G) @ f)).sum(axis=1)
        p.shear[:] = 0.0
        bending = (f * (section_flexibility(p, E, G) @ f)).sum(axis=1)
        torque = np.einsum("mi,mic->mc", torque_row(p), f)
        chi, B = states[:, 6], states[:, 13]
        free = torque**2 / (G * p.J)[:, None]
        held = (G * p.J)[:, None] * chi**2 + B**2 / (E * np.maximum(p.Iw, 1e-300))[:, None]
        twist = np.where(mesh.line.warping[:, None], held, free)
        out += w / 12.0 * np.stack([h @ (bending + twist), h @ (whole - bending)])
    return out


def fillet_volumes(mesh: BeamMesh) -> Iterator[tuple[float, Array]]:
    """Volume (mm^3) and centroid (member axes) of the material in each shoulder fillet.

    The corner outside a quarter circle has the area (1 - pi/4) r^2, its centroid (10 - 3 pi)/(12 - 3 pi) r from either
    side. Taken where a rectangle, a round or the width of an I steps by at least the radius; other shapes' fillets are
    left out of the mass.
    """
    member = mesh.member
    for before, after in zip(member.stations, member.stations[1:], strict=False):
        r = after.shoulder_fillet
        if before.at != after.at or r == 0.0:
            continue
        inset = 1e-9 * mesh.length
        sides = [mesh.sections.integrals(after.at + d * inset) for d in (-1.0, 1.0)]
        way = 1.0 if sides[1].area < sides[0].area else -1.0
        wide, narrow = sides if way > 0 else sides[::-1]
        corner, arm = (1.0 - np.pi / 4.0) * r * r, (10.0 - 3.0 * np.pi) / (12.0 - 3.0 * np.pi) * r
        x = after.at + way * arm
        size = np.array([narrow.extremes[3, 0] - narrow.extremes[2, 0], narrow.extremes[0, 1] - narrow.extremes[1, 1]])
        if member.section.shape == "round":
            if wide.extremes[0, 1] - narrow.extremes[0, 1] >= r * (1 - 1e-9):
                yield float(2.0 * np.pi * (0.5 * size[1] + arm) * corner), np.array([x, narrow.yc, narrow.zc])
        elif member.section.shape == "rectangle":
            # top, bottom, left, right
            for i, (axis, sign) in enumerate(((1, 1.0), (1, -1.0), (0, -1.0), (0, 1.0))):
                step = sign * (wide.extremes[i, axis] - narrow.extremes[i, axis])
                if step >= r * (1 - 1e-9):
                    point = np.array([x, narrow.yc, narrow.zc])
                    point[1 + axis] = narrow.extremes[i, axis] + sign * arm
                    yield float(corner * size[1 - axis]), point
        elif member.section.shape == "I" and "bottom_width" not in member.section.dims:
            centre = np.array([x, narrow.yc, narrow.zc])
            yield from _flange_fillets(mesh, after.at, wide, narrow, r, corner, centre, arm)


def _flange_fillets(mesh: BeamMesh, at: float, wide: OutlineIntegrals, narrow: OutlineIntegrals, r: float,
                    corner: float, centre: Array, arm: float) -> Iterator[tuple[float, Array]]:
    """Fillets on the tips of both flanges of an I whose width steps."""
    flange = dims_at(mesh.member, at)["flange"]
    for i, sign in ((2, -1.0), (3, 1.0)):
        if sign * (wide.extremes[i, 0] - narrow.extremes[i, 0]) < r * (1 - 1e-9):
            continue
        for level in (narrow.extremes[0, 1] - 0.5 * flange, narrow.extremes[1, 1] + 0.5 * flange):
            point = centre.copy()
            point[1:] = narrow.extremes[i, 0] + sign * arm, level
            yield float(corner * flange), point


def mass_figures(mesh: BeamMesh) -> Iterator[Figure]:
    """Mass, then the three coordinates of the centre of mass; of exact section integrals alone."""
    h = np.diff(mesh.x)
    # the points at which the stiffness is taken: the net sections there are known
    halves = np.stack([mesh.x[:-1], 0.5 * (mesh.x[:-1] + mesh.x[1:])], axis=1)
    x = (halves[..., None] + 0.5 * h[:, None, None] * GAUSS).ravel()
    p = mesh.sections.net(x)
    dv = p.area * np.repeat(0.25 * h, 4)
    moment = np.array([dv @ x, dv @ p.yc, dv @ p.zc])
    whole = float(dv.sum())
    for volume, point in fillet_volumes(mesh):
        whole += volume
        moment += volume * point
    centre = moment / whole  # of the volume: it has one even when no density is declared
    yield Figure(FigureKey("", "", "mass", ""), mesh.part.material.density * whole, "t")
    for i, value in enumerate(mesh.axes.T @ centre + np.array(mesh.member.start)):
        yield Figure(FigureKey("", "", "centre_of_mass", XYZ[i]), float(value), "mm")


def properties_table(mesh: BeamMesh) -> Array:
    """(21, 7) x, A, yc, zc, Iyy, Izz, Iyz of the net section at the stations."""
    rows = []
    for x in station_values(mesh):
        at = min(max(float(x), 1e-9 * mesh.length), (1.0 - 1e-9) * mesh.length)
        o = mesh.sections.both_integrals(at)[1]
        rows.append([x, o.area, o.yc, o.zc, o.Iyy, o.Izz, o.Iyz])
    return np.array(rows)


def diagram(s: Solved, case: int) -> Diagram:
    """Diagrams of one case."""
    both = np.stack([s.states.start[..., case], s.states.end[..., case]], axis=1).reshape(-1, 14)
    x = np.stack([s.mesh.x[:-1], s.mesh.x[1:]], axis=1).ravel()
    N, Vy, Vz, T, My, Mz, B = both[:, 7:].T
    return Diagram(x, N, Vy, Vz, T, My, Mz, B, both[:, :3], both[:, 3:6])
