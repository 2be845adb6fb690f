"""Curved triangles of section outlines, all in one child process."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from geometry.outline import Arc, Edge, Outline
from geometry.problem import MeshError
from mesher.child import ChildFailure, ChildResult, run_child
from mesher.measure import triangle_areas
from mesher.numbering import from_gmsh
from mesher.outline_mesh import OutlineMesh

_START_SECONDS = 20.0
_SECONDS_PER_OUTLINE = 10.0


def mesh_outlines(
    outlines: Sequence[Outline], size: Sequence[float], memory: float = 2048.0
) -> list[OutlineMesh]:
    """Mesh sections with curved 6-node triangles; lines and arcs are met exactly by the nodes.

    Parameters
    ----------
    outlines
        The sections; loops as `geometry.outline.Outline` says, coordinates in mm.
    size
        Element size of each, mm. Two layers through the thinnest wall need half its thickness. At re-entrant
        corners a quarter of it is used, and an arc gets at least 16 elements to the full turn.
    memory
        Limit of the child process, MiB.

    Raises
    ------
    MeshError
        An outline could not be meshed (open, crossing itself), or the mesh does not fill it.
    """
    if len(outlines) != len(size):
        raise MeshError(f"{len(outlines)} outlines, but {len(size)} sizes; give one size for each outline")
    if not outlines:
        return []
    job = {"task": "outlines", "outlines": [_as_job(o, float(h)) for o, h in zip(outlines, size, strict=True)]}
    try:
        result = run_child(job, _START_SECONDS + _SECONDS_PER_OUTLINE * len(outlines), memory)
    except ChildFailure as failure:
        raise MeshError(
            f"the section could not be meshed: {failure}. Look for crossing or open loops, or a size far smaller"
            f" than the section.\n{failure.log[-1000:]}"
        ) from failure
    return [_as_mesh(result, number, outline) for number, outline in enumerate(outlines)]


def _as_job(outline: Outline, size: float) -> dict[str, Any]:
    loops = (outline.outer, *outline.inner)
    points = np.array([edge.start for loop in loops for edge in loop])
    if not (math.isfinite(size) and size > 0):
        raise MeshError(f"element size of a section: given {size}; it must be a positive length in mm")
    return {
        "size": size,
        "extent": float(np.ptp(points, axis=0).max()),
        "corners": [corner for loop in loops for corner in _reentrant(loop)],
        "loops": [[_edge_as_job(edge) for edge in loop] for loop in loops],
    }


def _edge_as_job(edge: Edge) -> dict[str, Any]:
    centre = list(edge.centre) if isinstance(edge, Arc) else None
    turn = swept_angle(edge) if isinstance(edge, Arc) else 0.0
    return {"start": list(edge.start), "end": list(edge.end), "centre": centre, "turn": turn}


def swept_angle(arc: Arc) -> float:
    """Signed angle that an arc sweeps, rad; positive counter-clockwise."""
    (y0, z0), (y1, z1), (cy, cz) = arc.start, arc.end, arc.centre
    turn = math.atan2(z1 - cz, y1 - cy) - math.atan2(z0 - cz, y0 - cy)
    turn %= 2 * math.pi
    return turn if arc.ccw else turn - 2 * math.pi


def _directions(edge: Edge) -> tuple[tuple[float, float], tuple[float, float]]:
    """Unit tangents at the start and the end of an edge."""
    if isinstance(edge, Arc):
        sign = 1.0 if edge.ccw else -1.0
        tangents = []
        for y, z in (edge.start, edge.end):
            dy, dz = y - edge.centre[0], z - edge.centre[1]
            r = math.hypot(dy, dz)
            tangents.append((-sign * dz / r, sign * dy / r))
        return tangents[0], tangents[1]
    dy, dz = edge.end[0] - edge.start[0], edge.end[1] - edge.start[1]
    length = math.hypot(dy, dz)
    return (dy / length, dz / length), (dy / length, dz / length)


def _reentrant(loop: Sequence[Edge]) -> list[list[float]]:
    """Corners where the boundary, with the material on its left, turns right by more than 5 degrees."""
    corners = []
    for edge, following in zip(loop, [*loop[1:], loop[0]], strict=True):
        (ay, az), (by, bz) = _directions(edge)[1], _directions(following)[0]
        if ay * bz - az * by < -math.sin(math.radians(5.0)):
            corners.append(list(edge.end))
    return corners


def _outline_area(outline: Outline) -> float:
    """Exact area by Green's theorem, mm^2."""
    total = 0.0
    for loop in (outline.outer, *outline.inner):
        for edge in loop:
            (y0, z0), (y1, z1) = edge.start, edge.end
            total += (y0 * z1 - y1 * z0) / 2
            if isinstance(edge, Arc):  # the segment between chord and arc
                turn = swept_angle(edge)
                radius = math.hypot(y0 - edge.centre[0], z0 - edge.centre[1])
                total += radius**2 * (turn - math.sin(turn)) / 2
    return total


def _as_mesh(result: ChildResult, number: int, outline: Outline) -> OutlineMesh:
    part = {name: result.arrays[f"{name}{number}"] for name in ("tags", "points", "cells", "boundary", "owner")}
    nodes, tris, index = from_gmsh(part["tags"], part["points"], part["cells"])
    areas = triangle_areas(nodes[:2], tris)
    if areas.min() <= 0:
        raise MeshError(f"section mesh: {int((areas <= 0).sum())} inverted triangles; use a smaller size")
    area, exact = float(areas.sum()), _outline_area(outline)
    if abs(area - exact) > 1e-4 * exact:
        raise MeshError(
            f"section mesh: area {area:.6g} mm^2, but the outline encloses {exact:.6g} mm^2. Is the outer loop"
            " counter-clockwise, every inner loop clockwise and inside it, and no loop open?"
        )
    boundary = _with_material_on_the_left(index[part["boundary"].T], tris)
    owner = part["owner"]
    return OutlineMesh(np.ascontiguousarray(nodes[:2]), tris, boundary, owner[:, 0], owner[:, 1], area)


def _with_material_on_the_left(lines: np.ndarray, tris: np.ndarray) -> np.ndarray:
    """Turn boundary lines (start, end, middle) so that they run as their triangle's edge does."""
    runs = np.concatenate([tris[[a, b]] for a, b in ((0, 1), (1, 2), (2, 0))], axis=1)
    size = int(tris.max()) + 1
    known = np.isin(lines[0] * size + lines[1], runs[0] * size + runs[1])
    return np.where(known, lines, lines[[1, 0, 2]])
