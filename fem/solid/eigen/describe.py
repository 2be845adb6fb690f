"""A shape of the solid in the words of a beam: motion of its sections, and what they explain of it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem.mode import SHAPE_STATIONS
from fem.solid.cut import Cut, Cutter, section_means
from fem.solid.frame import Frame, member_frame
from fem.solid.model import SolidModel
from fem.solid.region import inertia
from fem.solid.scalar_matrix import ScalarMatrix
from fem.solid.sections import member_elements
from fem.solid.shape import Array
from geometry.problem import SolveError

PURE = 0.85
"""Share from which a shape is called by one name: set by trial."""
TOGETHER = 0.05
"""Least share of the turns for which bending and twist are named together: set by trial."""
LOCAL = 0.5
"""Share of a shape that its sections explain below which it is called local: set by trial."""


@dataclass(frozen=True, slots=True)
class ShapeSections:
    """Sections of the (one) member at SHAPE_STATIONS equal steps.

    cuts, frame; at (s,) mm; area (s,) mm^2; second (s, 3, 3) int (r.r I - r r) dA about the centroid, in member axes,
    mm^4.
    """

    cuts: list[Cut]
    frame: Frame
    at: Array
    area: Array
    second: Array


def shape_sections(model: SolidModel, cutter: Cutter | None = None) -> ShapeSections:
    """Cut the part at the stations that modes are given at."""
    member, mesh = model.part.members[0], model.mesh
    frame = member_frame(member)
    cutter = cutter or Cutter(mesh)
    at = np.linspace(0.0, frame.length, SHAPE_STATIONS)
    alone = len(model.part.members) == 1
    cuts = [cutter.cut(frame, x, None if alone else member_elements(mesh, member, frame, alone, x)) for x in at]
    for x, cut in zip(at, cuts, strict=True):
        if not cut.weights.size:
            raise SolveError(f"The mesh has no material at {member.name}@{x:.6g}: a mode has no motion there.")
    second = np.array([inertia(cut.points - cut.centroid[:, None], cut.weights) for cut in cuts])
    return ShapeSections(cuts, frame, at, np.array([cut.area for cut in cuts]), second)


def section_shapes(sections: ShapeSections, model: SolidModel, u: Array) -> tuple[Array, Array]:
    """Mean displacement and rotation (modes, s, 3), global, of shapes u (modes, 3, n)."""
    means = [section_means(cut, u, sections.frame) for cut in sections.cuts]
    return np.array([m[0] for m in means]).transpose(1, 0, 2), np.array([m[1] for m in means]).transpose(1, 0, 2)


def rigid_section_field(sections: ShapeSections, model: SolidModel, mean: Array, turn: Array) -> Array:
    """(modes, 3, n) displacement of the nodes if every section moved rigidly with the motion of its stations.

    The motion of the member's line is interpolated, not that of the centroids, which jump at openings.
    """
    frame = sections.frame
    local = frame.local(model.mesh.nodes)
    x = np.clip(local[0], sections.at[0], sections.at[-1])
    across = local.copy()
    across[0] -= x
    across = frame.axes.T @ across
    centre = np.array([cut.centroid for cut in sections.cuts])
    centre[:, 0] -= sections.at
    centre = centre @ frame.axes
    line = mean - np.cross(turn, centre)
    out = np.empty((mean.shape[0], 3, x.size))
    for k in range(mean.shape[0]):
        w = np.array([np.interp(x, sections.at, turn[k, :, i]) for i in range(3)])
        out[k] = np.array([np.interp(x, sections.at, line[k, :, i]) for i in range(3)]) + np.cross(w.T, across.T).T
    return out


def section_shares(
    sections: ShapeSections, model: SolidModel, mass: ScalarMatrix, u: Array, mean: Array, turn: Array
) -> Array:
    """(modes,) mass-weighted share of the shapes' square that rigid sections explain."""
    k, _, n = u.shape
    off = (u - rigid_section_field(sections, model, mean, turn)).transpose(2, 1, 0).reshape(3 * n, k)
    whole = u.transpose(2, 1, 0).reshape(3 * n, k)
    left = np.einsum("ik,ik->k", off, mass @ off) / np.einsum("ik,ik->k", whole, mass @ whole)
    return np.maximum(1.0 - left, 0.0)


def vibration_kind(sections: ShapeSections, mean: Array, turn: Array, share: float) -> str:
    """Name of one shape (s, 3) by the kinetic energy of its sections."""
    u, w = mean @ sections.frame.axes.T, turn @ sections.frame.axes.T
    rotary = np.einsum("sii,si->si", sections.second, w**2)
    sums = np.asarray(np.trapezoid(np.hstack([sections.area[:, None] * u**2, rotary]), sections.at, axis=0))
    return _kind(sums[0], sums[2] + sums[4], sums[1] + sums[5], sums[3], share, PURE)


def buckling_kind(sections: ShapeSections, mean: Array, turn: Array, share: float) -> str:
    """Name of one shape (s, 3) by the turns of its sections; along the line only where these are small."""
    u, w = mean @ sections.frame.axes.T, turn @ sections.frame.axes.T
    radius = np.trace(sections.second, axis1=1, axis2=2)[:, None] / sections.area[:, None]
    moved = np.asarray(np.trapezoid(np.hstack([u**2, radius * w**2]), sections.at, axis=0))
    along = moved[0] / max(float(moved.sum()), 1e-300)
    turned = np.asarray(np.trapezoid(w**2, sections.at, axis=0))
    turned = turned / max(float(turned.sum()), 1e-300)
    if along > PURE:
        return _kind(1.0, 0.0, 0.0, 0.0, share, PURE)
    return _kind(0.0, turned[1], turned[2], turned[0], share, 1.0 - TOGETHER)


def _kind(axial: float, about_y: float, about_z: float, torsion: float, share: float, pure: float) -> str:
    total = axial + about_y + about_z + torsion
    if share < LOCAL or not total > 0:
        return "local"
    names = {"axial": axial, "bending about y": about_y, "bending about z": about_z, "torsion": torsion}
    name = max(names, key=lambda k: names[k])
    if names[name] >= pure * total:
        return name
    if about_y + about_z >= pure * total:
        return "bending"
    if about_y + about_z + torsion >= pure * total:
        return "lateral-torsional"
    return name
