"""From the freedoms of a shape to a `Mode`."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.beam.figures import section_arm, sections_after
from fem.beam.law import section_flexibility, torque_row
from fem.beam.mesh import BeamMesh
from fem.beam.modes.shape_functions import simpson
from fem.mode import SHAPE_STATIONS, Mode

Array = NDArray[np.float64]
NAMES = ("axial", "bending about y", "bending about z", "torsion")
PURE = 0.85
"""Share of the energy from which a shape has one name (judgement, no source)."""


def modes_of(mesh: BeamMesh, at_stations: Array, state: Array, values: Array, residuals: Array,
             mass_share: Array | None = None, case: str = "") -> list[Mode]:
    """Modes from the motion of their sections and what happens inside.

    Parameters
    ----------
    at_stations
        (SHAPE_STATIONS, 6, c) displacement and rotation of the line's points, member axes.
    state
        (m, 3, 14, c) displacements and forces at the start, middle and end of each length of the mesh.
    """
    x = np.linspace(0.0, mesh.length, SHAPE_STATIONS)
    p = sections_after(mesh, x)
    arms = np.array([section_arm(y, z) for y, z in zip(p.yc, p.zc, strict=True)])
    line, turn = at_stations[:, :3], at_stations[:, 3:6]
    u = line + arms @ turn
    corners = [mesh.sections.integrals(min(float(v), np.nextafter(mesh.length, 0.0))).extremes for v in x]
    moved = [line + np.array([section_arm(*e[k]) for e in corners]) @ turn for k in range(4)]
    reach = np.linalg.norm(moved, axis=2).max(axis=(0, 1))
    names = kinds(mesh, state)
    found = []
    for i in range(len(values)):
        share = np.zeros(6) if mass_share is None else mass_share[i]
        found.append(Mode(float(values[i]), u[:, :, i] @ mesh.axes / reach[i], turn[:, :, i] @ mesh.axes / reach[i],
                          names[i], residual=float(residuals[i]), mass_share=share, case=case))
    return found


def kinds(mesh: BeamMesh, state: Array) -> list[str]:
    """What each shape mostly is, by its strain energy (`state` as in `modes_of`).

    Stretching of the centroid, bending about the centroid with the shear that goes with it, and twist about the shear
    centre with warping. A part of next to no energy that moves as a rigid body is named by what little there is.
    """
    x, weight = simpson(mesh)
    p, material = mesh.stiffness(x.ravel()), mesh.part.material
    E, G = material.E, material.E / (2.0 * (1.0 + material.nu))
    state = state.reshape(-1, *state.shape[2:])
    f, chi, B = state[:, 7:13], state[:, 6], state[:, 13]
    t = torque_row(p)
    warps = np.repeat(mesh.line.warping, 3)[:, None]
    torque = np.einsum("pi,pic->pc", t, f)
    rate = np.where(warps, chi, torque / (G * p.J)[:, None])
    e = section_flexibility(p, E, G) @ f + t[:, :, None] * rate[:, None, :]
    yc, zc, ys, zs = (v[:, None] for v in (p.yc, p.zc, p.ys, p.zs))
    parts = np.array([
        f[:, 0] * (e[:, 0] + zc * e[:, 4] - yc * e[:, 5]),
        (f[:, 4] - zc * f[:, 0]) * e[:, 4] + f[:, 2] * (e[:, 2] + ys * e[:, 3]),
        (f[:, 5] + yc * f[:, 0]) * e[:, 5] + f[:, 1] * (e[:, 1] - zs * e[:, 3]),
        np.where(warps, (G * p.J)[:, None] * chi**2 + B**2 / (E * np.maximum(p.Iw, 1e-300))[:, None], torque * rate),
    ])
    energy = np.abs(np.einsum("qpc,p->qc", parts, weight.ravel()))
    return [_kind(column / max(column.sum(), 1e-300)) for column in energy.T]


def _kind(share: Array) -> str:
    best = int(np.argmax(share))
    if share[best] >= PURE:
        return NAMES[best]
    if share[1] + share[2] >= PURE:
        return "bending"
    if share[1:].sum() >= PURE:
        return "lateral-torsional"
    return NAMES[best]
