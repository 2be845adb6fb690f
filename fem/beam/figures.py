"""From the states of the line to figures."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.beam.actions import Actions
from fem.beam.equations import Row, States
from fem.beam.law import section_flexibility, torque_row
from fem.beam.mesh import BeamMesh
from fem.beam.outlines import dims_at
from fem.beam.result import Diagram
from fem.beam.section import OutlineIntegrals, outline_integrals
from fem.figure import Figure, FigureKey, station_place

Array = NDArray[np.float64]
XYZ = ("x", "y", "z")
STATIONS = 20


@dataclass(frozen=True, slots=True)
class Solved:
    """Everything that the figures are made from; loads and temperature changes by case (last axis)."""

    mesh: BeamMesh
    actions: Actions
    rows: list[Row]
    nodal: Array
    lengths: Array
    change: Array
    states: States


def station_values(mesh: BeamMesh) -> Array:
    """(21,) stations at which both models report, mm."""
    return np.arange(STATIONS + 1) * mesh.length / STATIONS


def line_figures(s: Solved) -> list[Figure]:
    """Displacements, reactions, section forces and strain energy of all cases."""
    figures: list[Figure] = []
    energy = energies(s).sum(axis=0)
    for k, case in enumerate(s.mesh.part.cases):
        figures += _displacements(s, k, case.name)
        figures += _reactions(s, k, case.name)
        figures += _section_forces(s, k, case.name)
        figures.append(Figure(FigureKey(case.name, "", "strain_energy", ""), float(energy[k]), "N mm"))
    return figures


def all_figures(s: Solved) -> tuple[list[Figure], list[str]]:
    """Every figure of the beam model, and notes on those that it withholds."""
    from fem.beam.notches import notch_figures
    from fem.beam.stress import nominal_stresses

    figures = line_figures(s)
    for k, case in enumerate(s.mesh.part.cases):
        figures += nominal_stresses(s, k, case.name)
    figures += _mass(s.mesh)
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


def forces_at(s: Solved, x: float, case: int) -> Array:
    """(7,) N, Vy, Vz, T, My, Mz, B at `x`; at an inner jump the mean of both sides."""
    k = s.mesh.node(x)
    m = len(s.mesh.x) - 1
    sides = []
    if k > 0:
        sides.append(s.states.end[k - 1, 7:, case])
    if k < m:
        sides.append(s.states.start[k, 7:, case])
    return np.asarray(np.mean(sides, axis=0))


def _displacements(s: Solved, case: int, name: str) -> Iterator[Figure]:
    R = s.mesh.axes
    for place, x in places(s.mesh):
        k = s.mesh.node(x)
        d = s.states.freedoms[7 * k:7 * k + 6, case]
        p = s.mesh.sections.net(np.array([x]), "after" if x < s.mesh.length else "before")
        r = np.array([0.0, p.yc[0], p.zc[0]])
        # the section's mean is that of its centroid; free expansion moves it across the member as well
        u = d[:3] + np.cross(d[3:6], r) + s.mesh.part.material.expansion * s.change[case] * r
        for i, (value, turn) in enumerate(zip(R.T @ u, R.T @ d[3:6], strict=True)):
            yield Figure(FigureKey(name, place, "displacement", XYZ[i]), float(value), "mm")
            yield Figure(FigureKey(name, place, "rotation", XYZ[i]), float(turn), "rad")


def reaction(s: Solved, support: str, case: int) -> tuple[Array, Array]:
    """Force and moment about its region's centroid (member axes) that a support exerts on the part."""
    on = next(v.on for v in s.mesh.part.supports if v.name == support)
    centre = s.actions.region(on).centroid
    total = np.zeros(s.actions.freedoms)
    for row, value in zip(s.rows, s.states.reactions[:, case], strict=True):
        if row.owner == support:
            total += value * row.vector
    points = [np.array([x, 0.0, 0.0]) for x in s.mesh.x]
    blocks = [total[7 * i:7 * i + 6] for i in range(len(points))]
    points += s.actions.rigid_points
    blocks += list(total[7 * len(s.mesh.x):].reshape(-1, 6))
    F, M = np.zeros(3), np.zeros(3)
    for point, w in zip(points, blocks, strict=True):
        F += w[:3]
        M += w[3:] + np.cross(point - centre, w[:3])
    return F, M


def _reactions(s: Solved, case: int, name: str) -> Iterator[Figure]:
    for support in s.mesh.part.supports:
        force, moment = (s.mesh.axes.T @ v for v in reaction(s, support.name, case))
        for i in range(3):
            yield Figure(FigureKey(name, support.name, "reaction_force", XYZ[i]), float(force[i]), "N")
            yield Figure(FigureKey(name, support.name, "reaction_moment", XYZ[i]), float(moment[i]), "N mm")


def _section_forces(s: Solved, case: int, name: str) -> Iterator[Figure]:
    for x in station_values(s.mesh):
        f = forces_at(s, float(x), case)
        place = station_place(s.mesh.member.name, float(x))
        for i, component in enumerate(("N", "Vy", "Vz")):
            yield Figure(FigureKey(name, place, "section_force", component, "member"), float(f[i]), "N")
        for i, component in enumerate(("T", "My", "Mz")):
            yield Figure(FigureKey(name, place, "section_moment", component, "member"), float(f[3 + i]), "N mm")


def energies(s: Solved) -> Array:
    """(2, cases) elastic energy without shear, and of shear, N mm (Simpson's rule on each length)."""
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
        whole = np.einsum("mic,mij,mjc->mc", f, section_flexibility(p, E, G), f)
        p.shear[:] = 0.0
        bending = np.einsum("mic,mij,mjc->mc", f, section_flexibility(p, E, G), f)
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


def _mass(mesh: BeamMesh) -> Iterator[Figure]:
    t, w = np.polynomial.legendre.leggauss(4)
    h = np.diff(mesh.x)
    x = (mesh.x[:-1, None] + h[:, None] * 0.5 * (t + 1.0)).ravel()
    p = mesh.sections.net(x)
    dv = p.area * (h[:, None] * 0.5 * w).ravel()
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
    from fem.beam.outlines import net_section

    rows = []
    for x in station_values(mesh):
        at = min(max(float(x), 1e-9 * mesh.length), (1.0 - 1e-9) * mesh.length)
        o = outline_integrals(net_section(mesh.member, at))
        rows.append([x, o.area, o.yc, o.zc, o.Iyy, o.Izz, o.Iyz])
    return np.array(rows)


def diagram(s: Solved, case: int) -> Diagram:
    """Diagrams of one case."""
    both = np.stack([s.states.start[..., case], s.states.end[..., case]], axis=1).reshape(-1, 14)
    x = np.stack([s.mesh.x[:-1], s.mesh.x[1:]], axis=1).ravel()
    N, Vy, Vz, T, My, Mz, B = both[:, 7:].T
    return Diagram(x, N, Vy, Vz, T, My, Mz, B, both[:, :3], both[:, 3:6])
