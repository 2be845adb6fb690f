"""Curved triangles of section outlines, all in one child process."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geometry.outline import Arc, Edge, Outline
from geometry.problem import MeshError
from mesher.child import ChildFailure, ChildResult, run_child
from mesher.measure import triangle_areas
from mesher.numbering import from_gmsh
from mesher.outline_checks import check_outline, outline_area, reentrant_corners, swept_angle
from mesher.outline_mesh import OutlineMesh

_START_SECONDS = 20.0
_SECONDS_PER_OUTLINE = 10.0

MOST_TRIANGLES = 40_000
"""Of one section. A wall 1000 times as long as it is thick has about 6000; more is a slip of a unit, and would take
minutes in the mesher and again in the beam model."""


def mesh_outlines(outlines: Sequence[Outline], size: Sequence[float], memory: float = 2048.0) -> list[OutlineMesh]:
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
        An outline could not be meshed (open, crossing itself, or so thin that it would take more than
        `MOST_TRIANGLES`), or the mesh does not fill it.
    """
    if len(outlines) != len(size):
        raise MeshError(f"{len(outlines)} outlines, but {len(size)} sizes; give one size for each outline")
    if not outlines:
        return []
    job = {"task": "outlines", "outlines": [_as_job(o, float(h)) for o, h in zip(outlines, size, strict=True)]}
    try:
        result = run_child(job, _START_SECONDS + _SECONDS_PER_OUTLINE * len(outlines), memory)
    except ChildFailure as failure:
        if failure.ending == "killed":  # nothing says that the section is at fault
            raise MeshError(f"the section could not be meshed: {failure}.") from failure
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
    extent = float(np.ptp(points, axis=0).max())
    check_outline(outline, extent)
    triangles = 4 / math.sqrt(3) * outline_area(outline) / size**2
    if triangles > MOST_TRIANGLES:
        raise MeshError(
            f"a section of {extent:.4g} mm would need about {triangles:.0f} triangles of {size:.3g} mm, and at most"
            f" {MOST_TRIANGLES} are made: its walls are too thin for its size. Look at the unit of the thickness."
        )
    return {
        "size": size,
        "extent": extent,
        "corners": [corner for loop in loops for corner in reentrant_corners(loop)],
        "loops": [[_edge_as_job(edge) for edge in loop] for loop in loops],
    }


def _edge_as_job(edge: Edge) -> dict[str, Any]:
    centre = list(edge.centre) if isinstance(edge, Arc) else None
    turn = swept_angle(edge) if isinstance(edge, Arc) else 0.0
    return {"start": list(edge.start), "end": list(edge.end), "centre": centre, "turn": turn}


def _as_mesh(result: ChildResult, number: int, outline: Outline) -> OutlineMesh:
    part = {name: result.arrays[f"{name}{number}"] for name in ("tags", "points", "cells", "boundary", "owner")}
    nodes, tris, index = from_gmsh(part["tags"], part["points"], part["cells"])
    areas = triangle_areas(nodes[:2], tris)
    if areas.min() <= 0:
        raise MeshError(f"section mesh: {int((areas <= 0).sum())} inverted triangles; use a smaller size")
    area, exact = float(areas.sum()), outline_area(outline)
    if abs(area - exact) > 1e-4 * exact:
        raise MeshError(
            f"section mesh: area {area:.6g} mm^2, but the outline encloses {exact:.6g} mm^2. Is the outer loop"
            " counter-clockwise, every inner loop clockwise and inside it, and no loop open?"
        )
    boundary = _with_material_on_the_left(index[part["boundary"].T], tris)
    owner = part["owner"]
    return OutlineMesh(np.ascontiguousarray(nodes[:2]), tris, boundary, owner[:, 0], owner[:, 1], area)


def _with_material_on_the_left(lines: NDArray[np.int64], tris: NDArray[np.int64]) -> NDArray[np.int64]:
    """Turn boundary lines (start, end, middle) so that they run as their triangle's edge does."""
    runs = np.concatenate([tris[[a, b]] for a, b in ((0, 1), (1, 2), (2, 0))], axis=1)
    size = int(tris.max()) + 1
    known = np.isin(lines[0] * size + lines[1], runs[0] * size + runs[1])
    return np.where(known, lines, lines[[1, 0, 2]])
