"""Meshes of outlines that have arcs.

The mesher's curve meshing may not end on an arc (its 1D integration of a size that jumps where curvature
takes over). Arcs are therefore handed over as chords, and the boundary nodes are then put on their arcs: the
mesh that comes back is curved like one of the outline itself. Chords of hollow arcs stay below the 5 degrees
at which the mesher takes a vertex for a re-entrant corner; round arcs get 16 to the full turn.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fem.beam.section.integrals import sweep
from geometry.outline import Arc, Edge, Line, Outline
from mesher import OutlineMesh, mesh_outlines

_ROUND, _HOLLOW = math.radians(22.6), math.radians(4.8)

Owners = list[list[Arc | None]]


def mesh_sections(outlines: Sequence[Outline], sizes: Sequence[float]) -> list[OutlineMesh]:
    """Curved triangles of each outline, all in one child process; see `mesher.mesh_outlines`."""
    replaced = [_with_chords(outline, size) for outline, size in zip(outlines, sizes, strict=True)]
    meshes = mesh_outlines([outline for outline, _ in replaced], sizes)
    return [_on_arcs(mesh, owners) for mesh, (_, owners) in zip(meshes, replaced, strict=True)]


def _with_chords(outline: Outline, size: float) -> tuple[Outline, Owners]:
    """The outline with chords, and the arc that each edge of each loop stands for."""
    loops: list[tuple[Edge, ...]] = []
    owners: Owners = []
    for loop in (outline.outer, *outline.inner):
        edges: list[Edge] = []
        arcs: list[Arc | None] = []
        for edge in loop:
            pieces = _chords(edge, size) if isinstance(edge, Arc) else [edge]
            edges += pieces
            arcs += [edge if isinstance(edge, Arc) else None] * len(pieces)
        loops.append(tuple(edges))
        owners.append(arcs)
    return Outline(loops[0], tuple(loops[1:])), owners


def _chords(arc: Arc, size: float) -> list[Edge]:
    radius, first, turn = sweep(arc)
    # putting nodes back on the arc moves them by radius angle^2/8: a twentieth of a triangle at the most
    angle = min(_ROUND if arc.ccw else _HOLLOW, math.sqrt(0.4 * size / radius))
    n = math.ceil(abs(turn) / angle)
    angles = [first + turn * k / n for k in range(1, n)]
    inner = [(arc.centre[0] + radius * math.cos(a), arc.centre[1] + radius * math.sin(a)) for a in angles]
    stops = [arc.start, *inner, arc.end]
    return [Line(a, b) for a, b in zip(stops[:-1], stops[1:], strict=True)]


def _on_arcs(mesh: OutlineMesh, owners: Owners) -> OutlineMesh:
    nodes = np.array(mesh.nodes)
    for loop, arcs in enumerate(owners):
        for arc in {a for a in arcs if a is not None}:
            edges = [i for i, a in enumerate(arcs) if a is arc]
            mine = np.unique(mesh.boundary[:, (mesh.loop == loop) & np.isin(mesh.edge, edges)])
            radial = nodes[:, mine] - np.array(arc.centre)[:, None]
            nodes[:, mine] = np.array(arc.centre)[:, None] + radial * (sweep(arc)[0] / np.hypot(*radial))
    return replace(mesh, nodes=nodes)
