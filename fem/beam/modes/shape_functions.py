"""Displacements between chosen nodes of the member as static shape functions, for mass and geometric stiffness.

Between two kept nodes the member is bent, twisted and stretched by what happens at them alone: the exact static
solution of `fem.beam.element`, shear, taper, coupling and restrained warping included. Stiffness by these functions is
exact; consistent mass then gives frequencies with an error of the fourth power of the spacing (G. Strang and G. J. Fix,
An Analysis of the Finite Element Method, 1973, ch. 6).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fem.beam.actions import Actions
from fem.beam.equations import Line, Row, present, solve_line
from fem.beam.mesh import BeamMesh
from geometry.problem import SolveError

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def simpson(mesh: BeamMesh) -> tuple[Array, Array]:
    """(m, 3) start, middle and end of each length of the mesh (just inside it), and the weights of Simpson's rule."""
    h = np.diff(mesh.x)
    inset = 1e-7 * h
    x = np.stack([mesh.x[:-1] + inset, 0.5 * (mesh.x[:-1] + mesh.x[1:]), mesh.x[1:] - inset], axis=1)
    return x, h[:, None] * np.array([1.0, 4.0, 1.0]) / 6.0


@dataclass(frozen=True)
class ShapeFunctions:
    """Shape functions between the kept nodes of a mesh.

    Attributes
    ----------
    keep
        (k,) indices of the kept nodes of the mesh, in order, both ends among them.
    free
        (n,) which of the 7 k + extra freedoms exist; matrices are over these.
    points, weight
        (m, 3) start, middle and end of each length of the mesh, and the weights of Simpson's rule, mm.
    state
        (m, 3, 14, 14) displacements (7) and forces (7) there by the freedoms of the kept nodes before and behind.
    column
        (m, 14) numbers of those freedoms among the 7 k + extra.
    """

    mesh: BeamMesh
    actions: Actions
    keep: Index
    free: NDArray[np.bool_]
    points: Array
    weight: Array
    state: Array
    column: Index
    line: Line

    @classmethod
    def of(cls, mesh: BeamMesh, actions: Actions, needed: Iterable[int], spacing: float) -> ShapeFunctions:
        """Keep the nodes `needed`, those where warping begins or ends, and others at most `spacing` (mm) apart."""
        warping = mesh.line.warping
        marks = {0, len(mesh.x) - 1, *needed, *(np.flatnonzero(warping[1:] != warping[:-1]) + 1).tolist()}
        keep = _kept(mesh.x, sorted(marks), spacing)
        points, weight = simpson(mesh)
        state, column, halves = np.zeros((len(weight), 3, 14, 14)), np.zeros((len(weight), 14), dtype=np.int64), []
        for k, (a, b) in enumerate(zip(keep[:-1], keep[1:], strict=True)):
            n = 7 if warping[a] else 6
            state[a:b], whole = _between(mesh.line, int(a), int(b), n)
            column[a:b] = np.arange(7 * k, 7 * k + 14)
            padded = np.zeros((2 * n + 13, 2 * n + 13))
            padded[:2 * n, :2 * n] = whole
            halves.append((padded, np.eye(2 * n + 13)))
        line = Line(mesh.x[keep], warping[keep[:-1]], halves, 6 * len(actions.rigid_points))
        return cls(mesh, actions, keep, present(line), points, weight, state, column, line)

    @property
    def size(self) -> int:
        return int(self.free.sum())

    @cached_property
    def _place(self) -> Index:
        """Number of each freedom of the mesh here; -1 where its node is not kept."""
        here = -np.ones(self.actions.freedoms, dtype=np.int64)
        for k, node in enumerate(self.keep):
            here[7 * node:7 * node + 7] = np.arange(7 * k, 7 * k + 7)
        extra = self.actions.freedoms - 7 * len(self.mesh.x)
        here[7 * len(self.mesh.x):] = 7 * len(self.keep) + np.arange(extra)
        return here

    def row(self, vectors: Array) -> Array:
        """(..., n) of vectors (..., n_freedoms) on the freedoms of the mesh, zero at nodes that are not kept."""
        used = self._place >= 0
        out = np.zeros((*vectors.shape[:-1], len(self.free)))
        out[..., self._place[used]] = vectors[..., used]
        return out[..., self.free]

    def assembled(self, local: Array) -> Array:
        """(n, n) sum of matrices (m, 14, 14) on the freedoms around each length."""
        out = np.zeros((len(self.free), len(self.free)))
        np.add.at(out, (self.column[:, :, None], self.column[:, None, :]), local)
        return out[np.ix_(self.free, self.free)]

    def weighed(self, local: Array) -> Array:
        """(n, n) integral of the quadratic form `local` (m, 3, 14, 14) of displacements and forces at the points."""
        W = self.state
        return self.assembled(np.einsum("mp,mpij->mij", self.weight, np.swapaxes(W, 2, 3) @ local @ W))

    def states(self, vectors: Array) -> Array:
        """(m, 3, 14, c) displacements and forces at the points, of vectors (n, c)."""
        return np.asarray(self.state @ self.everywhere(vectors)[self.column][:, None])

    def everywhere(self, vectors: Array) -> Array:
        """(7 k + extra, c) vectors (n, c) with zeros where a freedom does not exist."""
        out = np.zeros((len(self.free), vectors.shape[1]))
        out[self.free] = vectors
        return out

    def rigid_motions(self) -> Array:
        """(n, 6) about the line's start, member axes."""
        return self.row(self.actions.rigid_motions().T).T

    def flexibility(self, rows: Sequence[Row], what: str) -> Array:
        """(n, n) motions for unit forces on the freedoms, held by homogeneous `rows` (on the freedoms of the mesh).

        Raises
        ------
        SolveError
            The rows leave a motion free.
        """
        own = [Row(self.everywhere(self.row(r.vector)[:, None])[:, 0], np.zeros(1), r.owner) for r in rows]
        unit = np.eye(len(self.free))[:, self.free]
        loads = np.zeros((len(self.line.warping), 13, self.size))
        rigid = self.everywhere(self.rigid_motions())
        F = solve_line(self.line, own, unit, loads, rigid, what).freedoms[self.free]
        off = float(np.abs(F - F.T).max() / np.abs(F).max())
        if off > 1e-6:
            raise SolveError(f"{what}: the flexibility of the beam model is symmetric to {off:.1e} only (allowed 1e-6)")
        return np.asarray(0.5 * (F + F.T))


def touched(vectors: Iterable[Array], nodes: int) -> set[int]:
    """Nodes that vectors (n_freedoms,) act on."""
    found: set[int] = set()
    for v in vectors:
        found.update((np.flatnonzero(v[:7 * nodes]) // 7).tolist())
    return found


def _kept(x: Array, marks: list[int], spacing: float) -> Index:
    keep = []
    for a, b in zip(marks[:-1], marks[1:], strict=True):
        keep.append(a)
        steps = int(np.ceil((x[b] - x[a]) / spacing - 1e-6))
        inner = [a + int(np.argmin(np.abs(x[a:b] - v))) for v in np.linspace(x[a], x[b], steps + 1)[1:-1]]
        keep += sorted({k for k in inner if a < k < b})
    return np.array([*keep, marks[-1]])


def _between(line: Line, a: int, b: int, n: int) -> tuple[Array, Array]:
    """States (b - a, 3, 14, 14) of the lengths a to b by the displacements of their outer ends; the transfer matrix."""
    reached, inside = np.eye(2 * n), []
    for e in range(a, b):
        first, second = (M[:2 * n, :2 * n] for M in line.half[e])
        middle = first @ reached
        end = second @ middle
        inside.append((reached, middle, end))
        reached = end
    # f at the start from d at both ends:  d_b = Tdd d_a + Tdf f_a
    by_ends = np.zeros((2 * n, 14))
    by_ends[:n, :n] = np.eye(n)
    by_ends[n:, :n] = -np.linalg.solve(reached[:n, n:], reached[:n, :n])
    by_ends[n:, 7:7 + n] = np.linalg.inv(reached[:n, n:])
    found = np.array(inside) @ by_ends
    out = np.zeros((b - a, 3, 14, 14))
    out[:, :, :n], out[:, :, 7:7 + n] = found[:, :, :n], found[:, :, n:]
    return out, reached
