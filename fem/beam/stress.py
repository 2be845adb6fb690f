"""Nominal longitudinal stress at the extreme points of the outline."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from fem.beam.outlines import net_section
from fem.beam.section import OutlineIntegrals, outline_integrals
from fem.figure import Figure, FigureKey, station_place

if TYPE_CHECKING:
    from fem.beam.figures import Solved

POINTS = ("top", "bottom", "left", "right")


def bending_stress(o: OutlineIntegrals, forces: np.ndarray, y: float, z: float) -> float:
    """Longitudinal stress (MPa) at (y, z) of a section under (N, Vy, Vz, T, My, Mz, ...) about the line."""
    N, My, Mz = forces[0], forces[4] - o.zc * forces[0], forces[5] + o.yc * forces[0]
    det = o.Iyy * o.Izz - o.Iyz**2
    ky, kz = (o.Izz * My + o.Iyz * Mz) / det, (o.Iyz * My + o.Iyy * Mz) / det
    return float(N / o.area + ky * (z - o.zc) - kz * (y - o.yc))


def nominal_stresses(s: Solved, case: int, name: str) -> Iterator[Figure]:
    """xx at the four extreme points of the gross outline, at the 21 stations; net section where a cut passes."""
    from fem.beam.figures import forces_at, station_values

    mesh = s.mesh
    for x in station_values(mesh):
        at = min(max(float(x), 1e-9 * mesh.length), (1.0 - 1e-9) * mesh.length)
        gross = mesh.sections.integrals(at)
        cut = any(e.start < at < e.end for e in mesh.sections.effects)
        used = outline_integrals(net_section(mesh.member, at)) if cut else gross
        f = forces_at(s, float(x), case)
        piece = mesh.sections.piece(at)
        bimoment = np.zeros(4)
        if piece.open_thin:
            bimoment = f[6] / mesh.sections.gross(np.array([at])).Iw[0] * mesh.sections.warping_at_extremes(at)
        for i, point in enumerate(POINTS):
            value = bending_stress(used, f, *gross.extremes[i]) + bimoment[i]
            yield Figure(FigureKey(name, station_place(mesh.member.name, float(x)), "nominal_stress", f"xx@{point}",
                                   "member"), float(value), "MPa", note="net section" if cut else "gross section")
