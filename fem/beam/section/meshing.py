"""Meshes of outlines that have fillets.

The mesher's curve meshing does not end on loops that mix lines and arcs (its 1D integration of a size that
jumps between the two); whole circles are safe. Such loops are therefore handed over with each arc as chords
of less than 5 degrees, which the mesher does not take for corners, and the boundary nodes are then put on
their arcs: the mesh that comes back is curved like one of the outline itself.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fem.beam.section.integrals import sweep
from geometry.outline import Arc, Edge, Line, Outline
from mesher import OutlineMesh, mesh_outlines

_CHORD = math.radians(4.8)

Owners = list[list[Arc | None]]


def mesh_sections(outlines: Sequence[Outline], sizes: Sequence[float]) -> list[OutlineMesh]:
    """Curved triangles of each outline, all in one child process; see `mesher.mesh_outlines`."""
    replaced = [_with_chords(outline) for outline in outlines]
    meshes = mesh_outlines([outline for outline, _ in replaced], sizes)
    return [_on_arcs(mesh, owners) for mesh, (_, owners) in zip(meshes, replaced, strict=True)]


def _with_chords(outline: Outline) -> tuple[Outline, Owners]:
    """The outline with chords in mixed loops, and the arc that each edge of each loop stands for."""
    loops: list[tuple[Edge, ...]] = []
    owners: Owners = []
    for loop in (outline.outer, *outline.inner):
        mixed = any(isinstance(edge, Line) for edge in loop)
        edges: list[Edge] = []
        arcs: list[Arc | None] = []
        for edge in loop:
            pieces = _chords(edge) if mixed and isinstance(edge, Arc) else [edge]
            edges += pieces
            arcs += [edge if mixed and isinstance(edge, Arc) else None] * len(pieces)
        loops.append(tuple(edges))
        owners.append(arcs)
    return Outline(loops[0], tuple(loops[1:])), owners


def _chords(arc: Arc) -> list[Edge]:
    radius, first, turn = sweep(arc)
    n = math.ceil(abs(turn) / _CHORD)
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
