"""Nominal stress: longitudinal at the extreme points of the outline, shear at the centroid's level."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from fem.beam.section import OutlineIntegrals
from fem.figure import Figure, FigureKey, station_place

if TYPE_CHECKING:
    from fem.beam.figures import Solved

Array = NDArray[np.float64]
POINTS = ("top", "bottom", "left", "right")


def bending_stress(o: OutlineIntegrals, forces: Array, y: float, z: float) -> Array:
    """Longitudinal stress (MPa) at (y, z) of a section under (N, Vy, Vz, T, My, Mz, ...) about the line; (cases,)."""
    N, My, Mz = forces[0], forces[4] - o.zc * forces[0], forces[5] + o.yc * forces[0]
    det = o.Iyy * o.Izz - o.Iyz**2
    ky, kz = (o.Izz * My + o.Iyz * Mz) / det, (o.Iyz * My + o.Iyy * Mz) / det
    return np.asarray(N / o.area + ky * (z - o.zc) - kz * (y - o.yc))


def nominal_stresses(s: Solved) -> Iterator[Figure]:
    """xx at the four extreme points of the section at the 21 stations; of the net section where a cut passes."""
    from fem.beam.figures import forces_at, station_values

    mesh = s.mesh
    found: list[tuple[str, str, str, list[float]]] = []
    for x in station_values(mesh):
        at = min(max(float(x), 1e-9 * mesh.length), (1.0 - 1e-9) * mesh.length)
        gross = mesh.sections.integrals(at)
        cut = any(e.start < at < e.end for e in mesh.sections.effects)
        used = mesh.sections.both_integrals(at)[1] if cut else gross
        f = forces_at(s, float(x))
        bimoment = np.zeros((4, f.shape[1]))
        if mesh.sections.piece(at).open_thin:
            warping = mesh.sections.warping_at_extremes(at) / mesh.sections.gross(np.array([at])).Iw[0]
            bimoment = np.outer(warping, f[6])
        for i, point in enumerate(POINTS):
            values = bending_stress(used, f, *used.extremes[i]) + bimoment[i]
            found.append((station_place(mesh.member.name, float(x)), f"xx@{point}",
                          "net section" if cut else "gross section", values.tolist()))
    for k, case in enumerate(mesh.part.cases):
        for place, component, note, values in found:
            yield Figure(FigureKey(case.name, place, "nominal_stress", component, "member"), values[k], "MPa",
                         note=note)


def nominal_shear(s: Solved) -> Array:
    """(21, 4, cases) x, mean shear stress along z and y at the centroid's level, largest Saint-Venant torsion stress.

    MPa, on the section without cuts. The first two follow from equilibrium, the inclination of tapered sides included
    (see `fem.beam.taper_shear`): V S/(I b) where the member is prismatic. The third is unsigned and taken from the
    analysed section that is nearest in area, scaled with J.
    """
    from fem.beam.figures import forces_at, station_values

    mesh = s.mesh
    G = mesh.part.material.E / (2.0 * (1.0 + mesh.part.material.nu))
    rows = []
    for x in station_values(mesh):
        at = min(max(float(x), 1e-3 * mesh.length), (1.0 - 1e-3) * mesh.length)
        f = forces_at(s, float(x))
        o = mesh.sections.integrals(at)
        My, Mz = f[4] - o.zc * f[0], f[5] + o.yc * f[0]
        unit_z, unit_y = mesh.sections.unit_shear(at)
        p = mesh.sections.gross(np.array([at]))
        torque = f[3] + p.zs[0] * f[1] - p.ys[0] * f[2]
        if mesh.sections.piece(at).open_thin:
            torque = G * p.J[0] * s.states.freedoms[7 * mesh.node(float(x)) + 6]
        near = min(mesh.sections.solved, key=lambda q: abs(q.area - p.area[0]))
        rows.append([np.full(f.shape[1], x), unit_z @ np.array([f[2], f[0], My]), unit_y @ np.array([f[1], f[0], -Mz]),
                     np.abs(torque) / p.J[0] * near.torsion_stress * near.J])
    return np.array(rows)
