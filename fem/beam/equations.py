"""The member as one sparse system: displacements of the nodes and section forces at the start of each length.

Keeping both as unknowns (multiple shooting) avoids the loss of digits that a stiffness matrix of many short lengths
suffers (its condition grows with the fourth power of their number). A support is a row ``C d = value``; its
multiplier is the force that the support exerts on the part.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse
from scipy.sparse.linalg import splu

from geometry.problem import SolveError

Array = NDArray[np.float64]
MOTIONS = (
    "sliding along x", "moving along y", "moving along z", "turning about x", "turning about y", "turning about z",
)


@dataclass(frozen=True, slots=True)
class Row:
    """One held quantity: ``vector`` (n_freedoms,) times the freedoms = `value` (cases,), owned by support `owner`."""

    vector: Array
    value: Array
    owner: str


@dataclass(frozen=True, slots=True)
class Line:
    """The member cut into m lengths between m + 1 nodes.

    Attributes
    ----------
    x
        (m + 1,) nodes, mm.
    warping
        (m,) whether the length has the seventh freedom.
    half
        For each length the transfer matrices of its first and second half (see `fem.beam.element`).
    extra
        Number of further freedoms (rigid regions: six each), numbered after the nodes' 7 (m + 1).
    """

    x: Array
    warping: NDArray[np.bool_]
    half: Sequence[tuple[Array, Array]]
    extra: int = 0

    @property
    def freedoms(self) -> int:
        return 7 * len(self.x) + self.extra


@dataclass(frozen=True, slots=True)
class States:
    """Solution for c cases.

    Attributes
    ----------
    start, middle, end
        (m, 14, c) displacements (7) and forces (7) at the start, middle and end of each length; the seventh of each is
        0 where there is no warping freedom.
    freedoms
        (n_freedoms, c)
    reactions
        (rows, c) multiplier of each row: the generalised force that the row exerts on the part.
    """

    start: Array
    middle: Array
    end: Array
    freedoms: Array
    reactions: Array


def solve_line(line: Line, rows: Sequence[Row], nodal: Array, loads: Array, rigid: Array, what: str) -> States:
    """Solve all cases at once.

    Parameters
    ----------
    nodal
        (n_freedoms, c) applied forces.
    loads
        (m, 13, c) load on each length: (c, c', e_free) at its start, see `system_matrices`.
    rigid
        (n_freedoms, 6) the six rigid motions, for the check that the supports stop them.
    what
        Name used in messages.

    Raises
    ------
    SolveError
        A motion is not stopped, or the supports contradict or repeat one another.
    """
    check_stopped(rows, rigid, float(line.x[-1] - line.x[0]), what)
    here_is = present(line)
    at = np.cumsum(here_is) - 1
    sizes = np.where(line.warping, 7, 6)
    start_f = int(here_is.sum()) + np.concatenate([[0], np.cumsum(sizes)])
    total = int(start_f[-1]) + len(rows)
    r, c, v = [], [], []  # triplets
    rhs = np.zeros((total, nodal.shape[1]))

    def put(ri: NDArray[np.int64], ci: NDArray[np.int64], block: Array) -> None:
        """Blocks (..., i, j) at rows (..., i) and columns (..., j)."""
        shape = np.broadcast_shapes(ri[..., :, None].shape, ci[..., None, :].shape)
        r.append(np.broadcast_to(ri[..., :, None], shape).ravel())
        c.append(np.broadcast_to(ci[..., None, :], shape).ravel())
        v.append(np.broadcast_to(block, shape).ravel())

    rhs[at[here_is], :] = -nodal[here_is]
    for which, n, first, second in _groups(line):
        M = second @ first
        node = 7 * which[:, None] + np.arange(n)
        di, dj, f = at[node], at[node + 7], start_f[which][:, None] + np.arange(n)
        # rows f: d_end - Tdd d - Tdf f = td ;  rows of the node: f_start - f_end + applied + reactions = 0
        put(f, dj, np.eye(n))
        put(f, di, -M[:, :n, :n])
        put(f, f, -M[:, :n, n:2 * n])
        put(di, f, np.eye(n))
        put(dj, di, -M[:, n:2 * n, :n])
        put(dj, f, -M[:, n:2 * n, n:2 * n])
        added = M[:, :2 * n, 2 * n:] @ loads[which]
        rhs[f] += added[:, :n]
        rhs[dj] += added[:, n:]  # each node ends one length at most
    for k, row in enumerate(rows):
        used = np.flatnonzero(row.vector)
        used = used[here_is[used]]
        here = np.array([start_f[-1] + k])
        put(here, at[used], row.vector[used])
        put(at[used], here, row.vector[used][:, None])
        rhs[here] = row.value
    matrix = sparse.csc_matrix((np.concatenate(v), (np.concatenate(r), np.concatenate(c))), shape=(total, total))
    unknown = _solve(matrix, rhs, what)
    freedoms = np.zeros_like(nodal)
    freedoms[here_is] = unknown[at[here_is]]
    start, middle, end = _recover(line, freedoms, unknown, start_f, loads)
    return States(start, middle, end, freedoms, unknown[start_f[-1]:])


def _groups(line: Line) -> Iterator[tuple[NDArray[np.int64], int, Array, Array]]:
    """Lengths without and with warping: their indices, n, and the stacked matrices of both halves."""
    for flag, n in ((False, 6), (True, 7)):
        which = np.flatnonzero(line.warping == flag)
        if len(which):
            first, second = (np.stack([line.half[int(e)][k] for e in which]) for k in (0, 1))
            yield which, n, first, second


def present(line: Line) -> NDArray[np.bool_]:
    """Which freedoms exist: the seventh only next to a length with restrained warping."""
    there = np.ones(line.freedoms, dtype=bool)
    near = np.zeros(len(line.x), dtype=bool)
    near[:-1] |= line.warping
    near[1:] |= line.warping
    there[6:7 * len(line.x):7] = near
    return there


def _solve(matrix: sparse.csc_matrix, rhs: Array, what: str) -> Array:
    """Scaled sparse LU with refinement; raises when the residual says that it failed."""
    left, right = np.ones(matrix.shape[0]), np.ones(matrix.shape[1])
    scaled = matrix
    for _ in range(4):  # equilibrate rows and columns
        left /= np.sqrt(abs(scaled).max(axis=1).toarray().ravel())
        right /= np.sqrt(abs(scaled).max(axis=0).toarray().ravel())
        scaled = (sparse.diags(left) @ matrix @ sparse.diags(right)).tocsc()
    b = left[:, None] * rhs
    try:
        lu = splu(scaled, diag_pivot_thresh=1.0)
    except RuntimeError as error:
        raise SolveError(f"{what}: the equations of the beam model are singular; two supports hold the same motion of "
                         "the same place, or a motion is free") from error
    y = lu.solve(b)
    for _ in range(2):
        y += lu.solve(b - scaled @ y)
    residual = np.abs(b - scaled @ y).max(initial=0.0)
    size = np.abs(b).max(initial=0.0) + np.abs(y).max(initial=0.0)
    if not np.isfinite(y).all() or residual > 1e-10 * size:
        raise SolveError(f"{what}: the equations of the beam model left a residual of {residual / (size or 1.0):.1e} "
                         "(allowed 1e-10); two supports may hold the same motion of the same place")
    return np.asarray(right[:, None] * y)


def _recover(line: Line, freedoms: Array, unknown: Array, start_f: NDArray[np.int64], loads: Array) -> list[Array]:
    """States at the start, middle and end of each length."""
    m, cases = len(line.warping), freedoms.shape[1]
    out = [np.zeros((m, 14, cases)) for _ in range(3)]
    for which, n, first, second in _groups(line):
        entries = np.arange(n)
        d, f = freedoms[7 * which[:, None] + entries], unknown[start_f[which][:, None] + entries]
        s = np.concatenate([d, f, loads[which]], axis=1)
        states = [s, first @ s]
        states.append(second @ states[1])
        for k, s in enumerate(states):
            out[k][which, :n], out[k][which, 7:7 + n] = s[:, :n], s[:, n:2 * n]
    return out


def check_stopped(rows: Sequence[Row], rigid: Array, length: float, what: str) -> None:
    """Raise when a rigid motion is left free by the supports."""
    scaled = rigid * np.array([1.0] * 3 + [1.0 / length] * 3)
    held = np.array([row.vector @ scaled for row in rows]).reshape(-1, 6)
    size = np.linalg.norm(held, axis=1, keepdims=True)
    held = held / np.where(size > 0.0, size, 1.0)
    _, s, vt = np.linalg.svd(np.vstack([held, np.zeros((6, 6))]))
    free = vt[s < 1e-7]
    if len(free):
        # name the pure motions inside the free space when there are any
        inside = [MOTIONS[k] for k in range(6) if np.linalg.norm(free[:, k]) > 1.0 - 1e-6]
        words = inside or [_mixed(f) for f in free]
        raise SolveError(f"{what}: the supports leave {len(free)} motion(s) of the part free: {', '.join(words)} "
                         "(member axes); hold a further freedom")


def _mixed(motion: Array) -> str:
    parts = [f"{MOTIONS[k]} ({motion[k]:+.2f})" for k in range(6) if abs(motion[k]) > 1e-6]
    return "a combination of " + ", ".join(parts)
