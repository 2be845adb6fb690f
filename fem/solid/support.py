"""Held freedoms as an exact elimination u = T y + g, and a few rows C u = d for mean values.

Each node, or each rigid region with its six freedoms, is a *block* with the rows that the supports put on it.
The rows' null space gives the block's free unknowns, so that any mixture (normal directions, an edge shared by two
supports, a rigid region that touches a held face) is eliminated exactly and K stays positive definite. Mean values
(`average`) couple many nodes: they stay as rows and are met by `fem.solid.system`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.frame import member_frame
from fem.solid.region import Region, surface_region
from fem.solid.shape import Array
from geometry.part import Part, RegionLoad, RemotePoint, Support
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

_AXIS = {"x": 0, "y": 1, "z": 2, "rx": 0, "ry": 1, "rz": 2}
PLANE = 1 - 1e-6
"""Least size of the mean unit normal of a face that counts as plane."""


@dataclass(frozen=True, slots=True)
class Row:
    """One held freedom: `direction` (3,) of a displacement or, with `turn`, of a rotation; its value; its support."""

    support: str
    direction: Array
    turn: bool
    value: float


@dataclass(frozen=True, slots=True)
class Block:
    """Nodes that share their rows: `nodes` (k,) each with three freedoms, or one rigid region with six.

    rows (r, 3 or 6) on the block's freedoms, values (r,), and the support of each row. A rigid block's freedoms are
    the displacement and the rotation at `centre`.
    """

    nodes: NDArray[np.int64]
    rows: Array
    values: Array
    supports: tuple[str, ...]
    centre: Array | None = None


@dataclass(frozen=True, slots=True)
class Constraints:
    """u = T y + g; rows @ u = row_values for mean values, one support name a row."""

    T: sp.csr_matrix
    g: Array
    rows: sp.csr_matrix
    row_values: Array
    row_supports: tuple[str, ...]
    blocks: tuple[Block, ...]
    regions: dict[str, Region]


def rigid_map(nodes: Array, centre: Array) -> Array:
    """(k, 3, 6) displacement of points (3, k) for unit displacement and rotation at `centre`."""
    r = nodes - centre[:, None]
    out = np.zeros((nodes.shape[1], 3, 6))
    out[:, range(3), range(3)] = 1.0
    for i, j, m in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):  # u_i = w_j r_m - w_m r_j
        out[:, i, 3 + j] = r[m]
        out[:, i, 3 + m] = -r[j]
    return out


def support_rows(part: Part, support: Support, region: Region) -> list[Row]:
    """Held freedoms of a support as directions in global components."""
    axes = np.eye(3)
    if support.axes == "member":
        member = next((m for m in part.members if m.name == support.on.partition(".")[0]), None)
        if member is None:
            raise SolveError(f"Support {support.name!r} uses member axes, but {support.on!r} is on no member.")
        axes = member_frame(member).axes
    rows = []
    for freedom, value in support.held.items():
        turn = freedom.startswith("r")
        if turn and support.coupling == "surface":
            raise SolveError(
                f"Support {support.name!r} holds the rotation {freedom} point by point; a point has no "
                "rotation. Use the coupling rigid or average."
            )
        if freedom == "normal":
            if region.flatness < PLANE:
                raise SolveError(
                    f"Support {support.name!r} holds the normal direction of {support.on!r}, which is "
                    f"not plane (mean normal {region.flatness:.4f}). Hold x, y or z."
                )
            rows.append(Row(support.name, region.normal, False, value))
        else:
            rows.append(Row(support.name, axes[_AXIS[freedom]], turn, value))
    return rows


def _null_space(rows: Array, values: Array, where: str) -> tuple[Array, Array]:
    """(f, f - r) orthonormal basis of the free motions and (f,) the least motion that meets the values."""
    u, s, vt = np.linalg.svd(rows)
    rank = int((s > 1e-9 * max(s[0], 1e-300)).sum())
    shift = vt[:rank].T @ ((u.T @ values)[:rank] / s[:rank])
    gap = float(np.abs(rows @ shift - values).max())
    if gap > 1e-9 * max(1e-12, float(np.abs(values).max())):
        raise SolveError(f"The prescribed values contradict each other at {where} (by {gap:.3g}).")
    return vt[rank:].T, shift


def rigid_regions(part: Part) -> list[str]:
    """Regions that move as one rigid body."""
    named = [s.on for s in part.supports if s.coupling == "rigid"]
    named += [x.on for x in part.loads if isinstance(x, RegionLoad | RemotePoint) and x.coupling == "rigid"]
    return list(dict.fromkeys(named))


def _blocks(part: Part, mesh: NamedMesh, regions: dict[str, Region]) -> tuple[list[Block], list[Block]]:
    """Point blocks (held nodes, grouped by the supports on them) and rigid blocks."""
    supports = {s.name: s for s in part.supports}
    rows = {s.name: support_rows(part, s, regions[s.on]) for s in part.supports}
    owner = np.full(mesh.nodes.shape[1], -1)
    rigid_names = rigid_regions(part)
    for k, name in enumerate(rigid_names):
        nodes = regions[name].nodes
        if (owner[nodes] >= 0).any():
            other = rigid_names[int(owner[nodes].max())]
            raise SolveError(f"The rigid regions {other!r} and {name!r} share points. Make one of them average.")
        owner[nodes] = k
    at_point = [s for s in part.supports if s.coupling == "surface"]
    mask = np.zeros(mesh.nodes.shape[1], dtype=np.int64)
    for bit, support in enumerate(at_point):
        mask[regions[support.on].nodes] |= 1 << bit

    rigid_blocks = []
    for k, name in enumerate(rigid_names):
        region = regions[name]
        held = [r for s in part.supports if s.coupling == "rigid" and s.on == name for r in rows[s.name]]
        lines = [np.r_[np.zeros(3), r.direction] if r.turn else np.r_[r.direction, np.zeros(3)] for r in held]
        values, names = [r.value for r in held], [r.support for r in held]
        shared = np.flatnonzero((owner == k) & (mask > 0))
        for node, motion in zip(shared, rigid_map(mesh.nodes[:, shared], region.centroid), strict=True):
            for bit, support in enumerate(at_point):
                if mask[node] >> bit & 1:
                    for r in rows[support.name]:
                        lines.append(r.direction @ motion)
                        values.append(r.value)
                        names.append(r.support)
        rigid_blocks.append(
            Block(region.nodes, np.array(lines).reshape(-1, 6), np.array(values), tuple(names), region.centroid)
        )
    point_blocks = []
    for value in np.unique(mask[(mask > 0) & (owner < 0)]):
        held = [r for bit, s in enumerate(at_point) if value >> bit & 1 for r in rows[supports[s.name].name]]
        if held:
            point_blocks.append(
                Block(
                    np.flatnonzero((mask == value) & (owner < 0)),
                    np.array([r.direction for r in held]),
                    np.array([r.value for r in held]),
                    tuple(r.support for r in held),
                )
            )
    return point_blocks, rigid_blocks


def _eliminate(mesh: NamedMesh, points: Sequence[Block], rigid: Sequence[Block]) -> tuple[sp.csr_matrix, Array]:
    """T and g. The unknowns of a node stand together and follow the order of the nodes; those of the rigid regions
    come last. `fem.solid.solver.elimination` relies on it."""
    n = mesh.nodes.shape[1]
    g = np.zeros((n, 3))
    count = np.full(n, 3)
    bases = []
    for block in points:
        basis, shift = _null_space(block.rows, block.values, f"the supports {', '.join(sorted(set(block.supports)))}")
        g[block.nodes] = shift
        count[block.nodes] = basis.shape[1]
        bases.append(basis)
    for block in rigid:
        count[block.nodes] = 0
    plain = np.ones(n, dtype=bool)
    for block in (*points, *rigid):
        plain[block.nodes] = False
    first = np.cumsum(count) - count
    nodes = np.flatnonzero(plain)
    rows, columns = [(3 * nodes[:, None] + np.arange(3)).ravel()], [(first[nodes][:, None] + np.arange(3)).ravel()]
    values: list[Array] = [np.ones(rows[0].size)]
    for block, basis in zip(points, bases, strict=True):
        _add(values, rows, columns, block.nodes, np.repeat(basis[None], block.nodes.size, axis=0), first[block.nodes])
    total = int(count.sum())
    for block in rigid:
        size = float(np.ptp(mesh.nodes[:, block.nodes], axis=1).max())
        scale = np.r_[np.ones(3), np.full(3, 1.0 / size)]  # unknown rotations as the displacement at the rim
        motion = rigid_map(mesh.nodes[:, block.nodes], np.asarray(block.centre)) * scale
        basis, shift = np.eye(6), np.zeros(6)
        if block.rows.size:
            held = block.rows * scale
            weight = np.linalg.norm(held, axis=1)
            basis, shift = _null_space(
                held / weight[:, None], block.values / weight, f"the supports {', '.join(sorted(set(block.supports)))}"
            )
        g[block.nodes] = motion @ shift
        _add(values, rows, columns, block.nodes, motion @ basis, np.full(block.nodes.size, total))
        total += basis.shape[1]
    T = sp.csr_matrix((np.concatenate(values), (np.concatenate(rows), np.concatenate(columns))), shape=(3 * n, total))
    T.eliminate_zeros()
    T.sort_indices()
    return T, g.ravel()


def _add(
    values: list[Array],
    rows: list[NDArray[np.int64]],
    columns: list[NDArray[np.int64]],
    nodes: NDArray[np.int64],
    basis: Array,
    first: NDArray[np.int64],
) -> None:
    """Entries of basis (k, 3, f) for k nodes, whose unknowns begin at `first` (k,)."""
    values.append(basis.ravel())
    rows.append(np.broadcast_to((3 * nodes[:, None] + np.arange(3))[:, :, None], basis.shape).ravel())
    columns.append(np.broadcast_to(first[:, None, None] + np.arange(basis.shape[2]), basis.shape).ravel())


def build_constraints(part: Part, mesh: NamedMesh) -> Constraints:
    """Elimination and mean rows of every support and every rigid region of the part."""
    names = [s.on for s in part.supports] + rigid_regions(part)
    regions = {name: surface_region(mesh, name) for name in dict.fromkeys(names)}
    points, rigid = _blocks(part, mesh, regions)
    T, g = _eliminate(mesh, points, rigid)
    n = mesh.nodes.shape[1]
    data, columns, values, supports = [], [], [], []
    for support in part.supports:
        if support.coupling == "average":
            region = regions[support.on]
            mean, turn = region.mean_rows()
            for row in support_rows(part, support, region):
                data.append(np.tensordot(row.direction, turn if row.turn else mean, axes=1).ravel())
                columns.append((3 * region.nodes[:, None] + np.arange(3)).ravel())
                values.append(row.value)
                supports.append(support.name)
    index = np.concatenate([np.full(c.size, i) for i, c in enumerate(columns)]) if columns else np.zeros(0, int)
    C = sp.csr_matrix(
        (
            np.concatenate(data) if data else np.zeros(0),
            (index, np.concatenate(columns) if columns else np.zeros(0, int)),
        ),
        shape=(len(data), 3 * n),
    )
    return Constraints(T, g, C, np.array(values, dtype=float), tuple(supports), tuple(points + rigid), regions)
