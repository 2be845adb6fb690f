"""All load cases of a part at once: loads combined, supports as rows, one factorisation."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fem.beam.actions import Actions
from fem.beam.equations import Row, present, solve_line
from fem.beam.figures import Solved
from fem.beam.mesh import BeamMesh
from geometry.problem import RunError, SolveError

Array = NDArray[np.float64]


def solve_cases(mesh: BeamMesh) -> Solved:
    """All cases of a part: loads combined here, one factorisation."""
    part = mesh.part
    actions = Actions(mesh)
    loads = {load.name: load for load in part.loads}
    n, m, cases = actions.freedoms, len(mesh.x) - 1, len(part.cases)
    nodal, lengths, change = np.zeros((n, cases)), np.zeros((m, 13, cases)), np.zeros(cases)
    single = {name: actions.forces(load) for name, load in loads.items()
              if any(name in case.factors for case in part.cases)}
    for k, case in enumerate(part.cases):
        for name, factor in case.factors.items():
            if name not in loads:
                raise RunError("beam", f"case {case.name} names the load {name}, which does not exist")
            nodal[:, k] += factor * single[name].freedoms
            lengths[:, :12, k] += factor * single[name].lengths
            change[k] += factor * single[name].change
    lengths[:, 12, :] = part.material.expansion * change
    line = replace(mesh.line, extra=6 * len(actions.rigid_points))
    rows = support_rows(mesh, actions, change)
    states = solve_line(line, rows, nodal, lengths, actions.rigid_motions(), f"member {mesh.member.name}")
    return Solved(mesh, actions, rows, nodal, lengths, change, states)


def support_rows(mesh: BeamMesh, actions: Actions, change: Array | None = None) -> list[Row]:
    """Independent rows of rigid regions and supports in cases of the temperature `change` (cases,), K.

    Without it one case in which all prescribed values are zero.
    """
    values = np.zeros(1) if change is None else change
    rows = [*actions.ties, *(row for s in mesh.part.supports for row in actions.rows(s, values))]
    if change is None:
        rows = [replace(row, value=np.zeros(1)) for row in rows]
    # a row that stops warping says nothing where the section is free of it
    there = present(replace(mesh.line, extra=6 * len(actions.rigid_points)))
    return independent([row for row in rows if row.vector[there].any()], len(mesh.x), len(values))


def independent(rows: Sequence[Row], nodes: int, cases: int) -> list[Row]:
    """The rows without those that repeat, at one node, what earlier rows hold there.

    Raises
    ------
    SolveError
        Two supports prescribe different values of the same motion of one section.
    """
    kept: list[Row] = []
    base: dict[int, list[tuple[Array, Array, str]]] = {}
    for row in rows:
        used = np.flatnonzero(row.vector)
        node = int(used[0]) // 7
        if used[-1] // 7 != node or node >= nodes:
            kept.append(row)
            continue
        v = row.vector[7 * node:7 * node + 7].copy()
        size = np.linalg.norm(v)
        v /= size
        value = np.broadcast_to(row.value, (cases,)) / size
        owners = []
        for b, b_value, owner in base.setdefault(node, []):
            share = float(b @ v)
            if abs(share) > 1e-12:
                owners.append(owner)
            v, value = v - share * b, value - share * b_value
        left = np.linalg.norm(v)
        if left > 1e-7:
            base[node].append((v / left, value / left, row.owner))
            kept.append(row)
        elif np.abs(value).max(initial=0.0) > 1e-9:
            raise SolveError(f"supports {row.owner} and {', '.join(sorted(set(owners)))} prescribe different values of "
                             f"the same motion (difference {np.abs(value).max():.3g}); remove one of them")
    return kept
