"""Points strictly inside each face, with outward normals: what regions are told by."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from OCP.BRep import BRep_Tool
from OCP.BRepAdaptor import BRepAdaptor_Surface
from OCP.BRepLProp import BRepLProp_SLProps
from OCP.BRepMesh import BRepMesh_IncrementalMesh
from OCP.BRepTools import BRepTools
from OCP.TopAbs import TopAbs_REVERSED
from OCP.TopLoc import TopLoc_Location

from geometry.problem import SolidError
from geometry.solid.kernel import faces_of

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class FaceSamples:
    """(n, 3) points inside a face and (n, 3) outward unit normals there, in the axes of the solid."""

    points: Array
    normals: Array


def sample_faces(solid: Any, most: int = 12) -> list[FaceSamples]:
    """Samples of every face of `solid`, in the kernel's order.

    A triangulation of each face gives parameter points that are surely inside it; the points themselves are
    taken from the exact surface. At most `most` points a face: in its largest triangles,
    and in others spread evenly.
    """
    BRepMesh_IncrementalMesh(solid, 0.5, False, 0.3, False).Perform()
    try:
        return [_samples(face, most) for face in faces_of(solid)]
    finally:
        BRepTools.Clean_s(solid, True)


def _samples(face: Any, most: int) -> FaceSamples:
    mesh = BRep_Tool.Triangulation_s(face, TopLoc_Location())
    if mesh is None or not mesh.HasUVNodes():
        raise SolidError("a face of the solid could not be triangulated.")
    count = mesh.NbTriangles()
    uv = np.array([(p.X(), p.Y()) for p in map(mesh.UVNode, range(1, mesh.NbNodes() + 1))])
    corners = np.array([mesh.Triangle(k).Get() for k in range(1, count + 1)]) - 1
    nodes = np.array([(p.X(), p.Y(), p.Z()) for p in map(mesh.Node, range(1, mesh.NbNodes() + 1))])[corners]
    size = np.linalg.norm(np.cross(nodes[:, 1] - nodes[:, 0], nodes[:, 2] - nodes[:, 0]), axis=1)
    largest = np.argsort(-size.round(9), kind="stable")[: most // 2]
    picks = np.unique(np.concatenate([largest, np.linspace(0, count - 1, min(count, most // 2)).astype(int)]))
    adaptor = BRepAdaptor_Surface(face)
    sign = -1.0 if face.Orientation() == TopAbs_REVERSED else 1.0
    points, normals = [], []
    for k in picks:
        u, v = uv[corners[k]].mean(axis=0)
        props = BRepLProp_SLProps(adaptor, float(u), float(v), 1, 1e-9)
        point = props.Value()
        if not props.IsNormalDefined():
            continue
        normal = props.Normal()
        points.append((point.X(), point.Y(), point.Z()))
        normals.append((sign * normal.X(), sign * normal.Y(), sign * normal.Z()))
    return FaceSamples(np.array(points), np.array(normals))
