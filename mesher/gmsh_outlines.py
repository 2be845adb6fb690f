"""Meshing section outlines with gmsh. Runs in the child only."""

from __future__ import annotations

import math
from typing import Any

import gmsh
import numpy as np

from mesher.gmsh_session import kernel_version, session

Edge = dict[str, Any]


class _Points:
    """Points of one outline; ends of neighbouring edges that coincide become one point."""

    def __init__(self, tolerance: float) -> None:
        self.tolerance = tolerance
        self.known: list[tuple[float, float, int]] = []

    def tag(self, y: float, z: float) -> int:
        for ky, kz, tag in self.known:
            if math.hypot(y - ky, z - kz) <= self.tolerance:
                return tag
        tag = int(gmsh.model.geo.addPoint(y, z, 0.0))
        self.known.append((y, z, tag))
        return tag


def mesh_all(job: dict[str, Any]) -> tuple[dict[str, Any], dict[str, Any]]:
    """Mesh ``job["outlines"]``: each ``{"loops": [[edge, ...], ...], "size": mm, "corners": [[y, z], ...]}``."""
    arrays: dict[str, Any] = {}
    with session():
        gmsh.option.setNumber("Mesh.ElementOrder", 2)
        gmsh.option.setNumber("Mesh.SecondOrderLinear", 0)
        gmsh.option.setNumber("Mesh.Algorithm", 6)
        gmsh.option.setNumber("Mesh.MeshSizeExtendFromBoundary", 0)
        gmsh.option.setNumber("Mesh.MeshSizeFromPoints", 0)
        gmsh.option.setNumber("Mesh.MeshSizeFromCurvature", 16)
        for number, outline in enumerate(job["outlines"]):
            gmsh.clear()
            _mesh_one(outline, arrays, number)
        return {"version": kernel_version()}, arrays


def _mesh_one(outline: dict[str, Any], arrays: dict[str, Any], number: int) -> None:
    size = outline["size"]
    points = _Points(1e-7 * outline["extent"])
    curves: list[list[list[int]]] = [[_add_edge(edge, points) for edge in loop] for loop in outline["loops"]]
    loops = [gmsh.model.geo.addCurveLoop([c for edge in loop for c in edge]) for loop in curves]
    gmsh.model.geo.addPlaneSurface(loops)
    gmsh.model.geo.synchronize()
    _set_size(size, [points.tag(*corner) for corner in outline["corners"]])
    gmsh.model.mesh.generate(2)

    tags, coords, _ = gmsh.model.mesh.getNodes()
    _, cells = gmsh.model.mesh.getElementsByType(9)
    arrays[f"tags{number}"] = tags.astype(np.int64)
    arrays[f"points{number}"] = coords.reshape(-1, 3)
    arrays[f"cells{number}"] = cells.astype(np.int64).reshape(-1, 6)
    boundary, owner = [], []
    for loop_index, loop in enumerate(curves):
        for edge_index, edge in enumerate(loop):
            for curve in edge:
                _, lines = gmsh.model.mesh.getElementsByType(8, curve)
                lines = lines.astype(np.int64).reshape(-1, 3)
                boundary.append(lines)
                owner.append(np.tile((loop_index, edge_index), (len(lines), 1)))
    arrays[f"boundary{number}"] = np.concatenate(boundary)
    arrays[f"owner{number}"] = np.concatenate(owner)


def _add_edge(edge: Edge, points: _Points) -> list[int]:
    """Curves of one edge. An arc is cut into pieces under a half turn: the kernel takes no longer ones."""
    first, last = edge["start"], edge["end"]
    if edge["centre"] is None:
        return [int(gmsh.model.geo.addLine(points.tag(*first), points.tag(*last)))]
    cy, cz = edge["centre"]
    radius = math.hypot(first[0] - cy, first[1] - cz)
    angle = math.atan2(first[1] - cz, first[0] - cy)
    turn = edge["turn"]  # signed angle swept, rad
    pieces = max(1, math.ceil(abs(turn) / (0.6 * math.pi)))
    centre = points.tag(cy, cz)
    stops = [tuple(first)]
    for k in range(1, pieces):
        a = angle + turn * k / pieces
        stops.append((cy + radius * math.cos(a), cz + radius * math.sin(a)))
    stops.append(tuple(last))
    return [
        int(gmsh.model.geo.addCircleArc(points.tag(*a), centre, points.tag(*b)))
        for a, b in zip(stops[:-1], stops[1:], strict=True)
    ]


def _set_size(size: float, corners: list[int]) -> None:
    """Even size, with a quarter of it at re-entrant corners."""
    field = gmsh.model.mesh.field
    if corners:
        near = field.add("Distance")
        field.setNumbers(near, "PointsList", corners)
        background = field.add("Threshold")
        for name, value in (("InField", near), ("SizeMin", size / 4), ("SizeMax", size), ("DistMin", 0.0),
                            ("DistMax", 2.5 * size)):
            field.setNumber(background, name, value)
    else:
        background = field.add("MathEval")
        field.setString(background, "F", repr(float(size)))
    field.setAsBackgroundMesh(background)
