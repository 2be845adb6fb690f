"""Plane cuts of the CAD solid across the member: area, centroid and second moments, for a check of the beam."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray
from OCP.BRepAlgoAPI import BRepAlgoAPI_Common
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeFace
from OCP.BRepGProp import BRepGProp
from OCP.gp import gp_Dir, gp_Pln, gp_Pnt
from OCP.GProp import GProp_GProps
from OCP.TopTools import TopTools_ListOfShape

from geometry.problem import SolidError
from geometry.solid.kernel import area_of, faces_of
from geometry.solid.plane_cut import PlaneCuts

COUNT = 9
"""Slices along a member."""


def slice_places(length: float, avoid: Sequence[tuple[float, float]]) -> list[float]:
    """Places of the slices, mm: spread evenly, moved off the ranges in `avoid` where there is room beside them."""
    step = length / COUNT
    found = []
    for k in range(COUNT):
        middle = (k + 0.5) * step
        tries = [middle + sign * j * step / 24.0 for j in range(12) for sign in (1.0, -1.0)]
        free = (x for x in tries if all(not a - 1e-3 * step <= x <= b + 1e-3 * step for a, b in avoid))
        found.append(next(free, middle))
    return found


def slices_of(solid: Any, places: Sequence[float], reach: float) -> NDArray[np.float64]:
    """(n, 7) rows x, A, yc, zc, Iyy, Izz, Iyz of plane cuts of `solid` (member axes; see `NamedSolid.slices`).

    Raises
    ------
    SolidError
        A plane cuts nothing.
    """
    cuts = PlaneCuts(solid)
    moments = {x: cuts.moments(x) for x in places}
    by_kernel = kernel_slices(solid, [x for x in places if moments[x] is None], reach)
    return np.array([by_kernel[x] if (m := moments[x]) is None else _row_of_moments(x, m) for x in places])


def _row_of_moments(x: float, m: NDArray[np.float64]) -> tuple[float, ...]:
    area, sy, sz, syy, syz, szz = (float(v) for v in m)
    if not area > 0.0:
        raise SolidError(f"slice at {x:g} mm: the plane cuts nothing of the solid.")
    y, z = sy / area, sz / area
    return (x, area, y, z, szz - area * z * z, syy - area * y * y, syz - area * y * z)


def kernel_slices(solid: Any, places: Sequence[float], reach: float) -> dict[float, tuple[float, ...]]:
    """The rows by place, from the kernel's own intersection of the solid with planes: dear, and right for any solid."""
    if not places:
        return {}
    first, sheets = TopTools_ListOfShape(), TopTools_ListOfShape()
    first.Append(solid)
    for x in places:
        plane = gp_Pln(gp_Pnt(x, 0, 0), gp_Dir(1, 0, 0))
        sheets.Append(BRepBuilderAPI_MakeFace(plane, -reach, reach, -reach, reach).Face())
    # All planes in one operation: the solid is prepared once.
    common = BRepAlgoAPI_Common()
    common.SetArguments(first)
    common.SetTools(sheets)
    common.SetRunParallel(False)
    common.Build()
    faces = faces_of(common.Shape())
    where = np.array([area_of(face)[1][0] for face in faces])
    return {x: _row(x, [f for f, at in zip(faces, where, strict=True) if abs(at - x) < 1e-6]) for x in places}


def _row(x: float, faces: Sequence[Any]) -> tuple[float, ...]:
    # Moments about a point in the plane: no digits lost to a far origin.
    props = GProp_GProps(gp_Pnt(x, 0, 0))
    for face in faces:
        part = GProp_GProps(gp_Pnt(x, 0, 0))
        BRepGProp.SurfaceProperties_s(face, part)
        props.Add(part)
    if not props.Mass() > 0.0:
        raise SolidError(f"slice at {x:g} mm: the plane cuts nothing of the solid.")
    centre, inertia = props.CentreOfMass(), props.MatrixOfInertia()
    # The kernel's matrix about the centroid, x = 0 there: int z^2 at (2,2), int y^2 at (3,3), -int y z at (2,3).
    return (x, props.Mass(), centre.Y(), centre.Z(), inertia.Value(2, 2), inertia.Value(3, 3), -inertia.Value(2, 3))
