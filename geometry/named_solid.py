"""A solid whose faces are named: what the solid builder hands to the mesher."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Vector = tuple[float, float, float]


@dataclass(frozen=True, slots=True)
class FaceMark:
    """One face of the solid, told by numbers that survive a change of geometry kernel."""

    area: float
    """mm^2"""
    centroid: Vector
    """global, mm"""
    box: tuple[float, float, float, float, float, float]
    """xmin, ymin, zmin, xmax, ymax, zmax, global, mm"""


@dataclass(frozen=True, slots=True)
class SizeHint:
    """Where the mesh must be fine: a place that raises stress, or a wall that must be spanned.

    Attributes
    ----------
    kind
        ``hole``, ``fillet``, ``step``, ``rim``: fine, graded from the feature; ``wall``: one layer.
    label
        What a person would call it: ``hole pivot``, ``root fillet``, ``shoulder at 200 mm``.
    faces
        Indices of the faces (into `NamedSolid.faces`) that carry the feature.
    radius
        Its radius, mm (0: sharp).
    thickness
        Thickness of the wall it is in, mm.
    """

    kind: str
    label: str
    faces: tuple[int, ...]
    radius: float
    thickness: float


@dataclass(frozen=True, slots=True)
class SharpEdge:
    """A re-entrant corner (no radius) of the solid: stress there has no converged value."""

    label: str
    points: NDArray[np.float64]
    """(n, 3) points along the edge, global, mm"""


@dataclass(frozen=True, slots=True)
class NamedSolid:
    """One valid solid.

    Attributes
    ----------
    brep
        The solid as BREP text bytes (global axes, mm). Only bytes cross from kernel to kernel.
    step
        The same as STEP text bytes.
    faces
        One mark for each face, in BREP order.
    regions
        Face indices of each region, by full name (``arm.start``). A face may be in several regions.
    volume, area, centroid
        mm^3, mm^2, mm: of the CAD solid.
    volume_estimate
        Independent estimate (integrated section areas less cuts), mm^3.
    hints, sharp_edges
        For mesh grading and for places with no converged value.
    least_wall
        Thinnest wall, mm.
    slices
        Area, centroid and second moments of plane cuts of the CAD solid, one row a station:
        x, A, yc, zc, Iyy, Izz, Iyz (member axes from the line; Iyy = int z^2, Izz = int y^2, Iyz = int y z,
        about the section's own centroid).
    """

    brep: bytes
    step: bytes
    faces: tuple[FaceMark, ...]
    regions: Mapping[str, tuple[int, ...]]
    volume: float
    area: float
    centroid: Vector
    volume_estimate: float
    hints: tuple[SizeHint, ...] = ()
    sharp_edges: tuple[SharpEdge, ...] = ()
    least_wall: float = 0.0
    slices: NDArray[np.float64] = field(default_factory=lambda: np.empty((0, 7)))
