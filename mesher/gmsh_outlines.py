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
        gmsh.option.setNumber("Mesh.MeshSizeExtendFromBoundary", 0)
        gmsh.option.setNumber("Mesh.MeshSizeFromPoints", 0)
        # Not gmsh's sizes from curvature: with them it once hung on a quarter circle.
        gmsh.option.setNumber("Mesh.MeshSizeFromCurvature", 0)
        for number, outline in enumerate(job["outlines"]):
            arrays |= {f"{name}{number}": values for name, values in _mesh_with_fallback(outline, number).items()}
        return {"version": kernel_version()}, arrays


def _mesh_with_fallback(outline: dict[str, Any], number: int) -> dict[str, Any]:
    """Frontal-Delaunay, then MeshAdapt, then Delaunay: the first that gives a mesh."""
    reasons = []
    for algorithm in (6, 1, 5):
        gmsh.clear()
        gmsh.option.setNumber("Mesh.Algorithm", algorithm)
        try:
            return _mesh_one(outline)
        except Exception as error:  # noqa: BLE001 - gmsh raises bare Exception
            reasons.append(str(error))
    raise ValueError(f"outline {number}: " + "; ".join(dict.fromkeys(reasons)))


def _mesh_one(outline: dict[str, Any]) -> dict[str, Any]:
    size = outline["size"]
    points = _Points(1e-7 * outline["extent"])
    curves: list[list[list[int]]] = [[_add_edge(edge, points) for edge in loop] for loop in outline["loops"]]
    loops = [gmsh.model.geo.addCurveLoop([c for edge in loop for c in edge]) for loop in curves]
    gmsh.model.geo.addPlaneSurface(loops)
    gmsh.model.geo.synchronize()
    arcs: dict[float, list[int]] = {}
    for edges, loop in zip(outline["loops"], curves, strict=True):
        for edge, made in zip(edges, loop, strict=True):
            if edge["centre"] is not None:
                arcs.setdefault(round(math.dist(edge["start"], edge["centre"]), 9), []).extend(made)
    _set_size(size, [points.tag(*corner) for corner in outline["corners"]], arcs)
    gmsh.model.mesh.generate(2)

    tags, coords, _ = gmsh.model.mesh.getNodes()
    _, cells = gmsh.model.mesh.getElementsByType(9)
    if len(cells) == 0:
        raise ValueError("the kernel made no triangles")
    boundary, owner = [], []
    for loop_index, loop in enumerate(curves):
        for edge_index, edge in enumerate(loop):
            for curve in edge:
                _, found = gmsh.model.mesh.getElementsByType(8, curve)
                lines = found.astype(np.int64).reshape(-1, 3)
                boundary.append(lines)
                owner.append(np.tile((loop_index, edge_index), (len(lines), 1)))
    return {
        "tags": tags.astype(np.int64),
        "points": coords.reshape(-1, 3),
        "cells": cells.astype(np.int64).reshape(-1, 6),
        "boundary": np.concatenate(boundary),
        "owner": np.concatenate(owner),
    }


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


def _set_size(size: float, corners: list[int], arcs: dict[float, list[int]]) -> None:
    """Even size; a quarter of it at re-entrant corners, 16 elements to the full turn at arcs (by radius)."""
    field = gmsh.model.mesh.field
    everywhere = field.add("MathEval")
    field.setString(everywhere, "F", repr(float(size)))
    parts = [everywhere]
    if corners:
        parts.append(_graded("PointsList", corners, size / 4, size))
    for radius, curves in arcs.items():
        fine = 2 * math.pi * radius / 16
        if fine < size:
            parts.append(_graded("CurvesList", curves, fine, size))
    background = field.add("Min")
    field.setNumbers(background, "FieldsList", parts)
    field.setAsBackgroundMesh(background)


def _graded(kind: str, tags: list[int], fine: float, size: float) -> int:
    """Field from `fine` at points or curves to `size`, growing by 0.3 mm for each mm."""
    field = gmsh.model.mesh.field
    near = field.add("Distance")
    field.setNumbers(near, kind, tags)
    field.setNumber(near, "Sampling", 40)
    graded = field.add("Threshold")
    reach = (size - fine) / 0.3
    values = {"InField": near, "SizeMin": fine, "SizeMax": size, "DistMin": 0.0, "DistMax": reach}
    for name, value in values.items():
        field.setNumber(graded, name, value)
    return int(graded)
