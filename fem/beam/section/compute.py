"""Section properties of an outline: exact boundary integrals, and finite elements for torsion and shear."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from skfem import MeshTri2

from fem.beam.section.integrals import outline_integrals, sweep
from fem.beam.section.points import warping_at
from fem.beam.section.properties import SectionProperties
from fem.beam.section.saint_venant import SaintVenant, about_centroid, solved_about
from geometry.outline import Arc, Edge, Outline
from mesher import OutlineMesh, mesh_outlines

Array = NDArray[np.float64]


def section_properties(outline: Outline, nu: float, size: float | None = None) -> SectionProperties:
    """Properties of one outline (see `SectionProperties`); `size` is the edge length of the triangles, mm."""
    return sections_properties([outline], nu, None if size is None else [size])[0]


def sections_properties(
    outlines: Sequence[Outline], nu: float, sizes: Sequence[float] | None = None
) -> list[SectionProperties]:
    """Properties of many outlines, meshed together in one child process."""
    if sizes is None:
        sizes = [mesh_size(outline) for outline in outlines]
    meshes = mesh_outlines(outlines, sizes)
    return [properties_on_mesh(o, as_mesh(m), nu) for o, m in zip(outlines, meshes, strict=True)]


def as_mesh(mesh: OutlineMesh) -> MeshTri2:
    """A section's mesh as scikit-fem's curved triangles."""
    return MeshTri2(mesh.nodes, mesh.tris)


def properties_on_mesh(outline: Outline, mesh: MeshTri2, nu: float) -> SectionProperties:
    """Properties of `outline` with the finite-element constants taken on `mesh`, wherever that came from.

    Solved with cubic elements; the change against quadratic ones on the same mesh is reported as `error`.
    """
    exact = outline_integrals(outline)
    centred, centroid = about_centroid(mesh)
    solved, coarse = (solved_about(centred, centroid, nu, order) for order in (3, 2))
    change = [abs(solved.J / coarse.J - 1), *np.abs(np.diag(solved.compliance) / np.diag(coarse.compliance) - 1)]
    extremes = exact.extremes
    ys, zs = solved.shear_centre
    return SectionProperties(
        area=exact.area, yc=exact.yc, zc=exact.zc, Iyy=exact.Iyy, Izz=exact.Izz, Iyz=exact.Iyz,
        I1=exact.I1, I2=exact.I2, principal_angle=exact.principal_angle,
        ys=exact.yc + float(ys), zs=exact.zc + float(zs), shear_compliance=solved.compliance,
        J=solved.J, Iw=solved.Iw, open_thin=is_open_thin(outline, extremes, solved), extremes=extremes,
        W_top=exact.W_top, W_bottom=exact.W_bottom, W_left=exact.W_left, W_right=exact.W_right,
        torsion_stress=largest_torsion_stress(outline, solved), warping=warping_at(solved, extremes.T),
        error=float(max(change)),
    )


def is_open_thin(outline: Outline, extremes: Array, solved: SaintVenant) -> bool:
    """Whether restrained warping matters: no void, and its effect reaches farther than the section is wide.

    Holding the warping decays over the length sqrt(E Iw / (G J)). For a solid rectangle that is at most
    0.24 of its longer side (Iw = b^3 t^3/144, J = b t^3/3), for an angle less than half its leg: no more
    than the end effect that beam theory leaves out anyway. For an I or a channel it is several depths.
    The line is drawn at one largest dimension of the section.
    """
    if outline.inner:
        return False
    height, width = extremes[0, 1] - extremes[1, 1], extremes[3, 0] - extremes[2, 0]
    return bool(math.sqrt(2 * (1 + solved.nu) * solved.Iw / solved.J) > max(height, width))


def largest_torsion_stress(outline: Outline, solved: SaintVenant) -> float:
    """Largest shear stress for a unit torque, 1/mm^3.

    At a sharp re-entrant corner it has no bound; points nearer to one than half the mean wall
    (area over perimeter) are left out.
    """
    points, stress = solved.nodal_shear()
    size = np.hypot(*stress[2])
    corners = reentrant_corners(outline)
    if len(corners):
        away = points[:, None] - (corners - solved.centroid).T[:, :, None, None]
        size = np.where(np.hypot(*away).min(axis=0) < 0.5 * mean_wall(outline), 0.0, size)
    return float(size.max())


def mean_wall(outline: Outline) -> float:
    """Twice the area over the perimeter, mm: the thickness of a thin wall, the radius of a full circle."""
    perimeter = 0.0
    for loop in (outline.outer, *outline.inner):
        for edge in loop:
            if isinstance(edge, Arc):
                radius, _, turn = sweep(edge)
                perimeter += radius * abs(turn)
            else:
                perimeter += math.dist(edge.start, edge.end)
    return 2 * outline_integrals(outline).area / perimeter


def mesh_size(outline: Outline) -> float:
    """Edge length of the triangles that gives J and the shear compliance to 1e-3, mm."""
    return min(0.6 * mean_wall(outline), math.sqrt(outline_integrals(outline).area / 40))


def reentrant_corners(outline: Outline) -> Array:
    """(k, 2) sharp corners at which the material spans more than 180 degrees."""
    found = []
    for loop in (outline.outer, *outline.inner):
        for i, edge in enumerate(loop):
            (ay, az), (by, bz) = _tangent(loop[i - 1], False), _tangent(edge, True)
            if ay * bz - az * by < -1e-3:
                found.append(edge.start)
    return np.array(found, dtype=float).reshape(-1, 2)


def _tangent(edge: Edge, at_start: bool) -> tuple[float, float]:
    if isinstance(edge, Arc):
        p = edge.start if at_start else edge.end
        ry, rz = p[0] - edge.centre[0], p[1] - edge.centre[1]
        r = math.hypot(ry, rz)
        return (-rz / r, ry / r) if edge.ccw else (rz / r, -ry / r)
    length = math.dist(edge.start, edge.end)
    return (edge.end[0] - edge.start[0]) / length, (edge.end[1] - edge.start[1]) / length
