"""Natural frequencies of the beam model.

First with static shape functions between nodes a fortieth of the length apart: with the flexibility F = K^-1 of the
held part and the mass M = B B^T, the eigenvalues of the dense symmetric matrix B^T F B are 1 / omega^2. All of them
come from one decomposition, so that none is missed, and the lowest frequencies, the largest eigenvalues, are the most
accurate. Then the shapes are bent once more, exactly, by their own inertia, and combined again (subspace iteration;
K. J. Bathe, Finite Element Procedures, 1996, ch. 11), until the frequencies stand.

A free part is held statically determinate and its motions kept square (in the mass) to the six rigid ones: F then
stands between P and P^T, P = 1 - R (R^T M R)^-1 R^T M.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh

from fem.beam.actions import Actions
from fem.beam.along import SectionSolver
from fem.beam.cases import support_rows
from fem.beam.equations import Row, States, solve_line
from fem.beam.mesh import BeamMesh
from fem.beam.modes.describe import modes_of
from fem.beam.modes.mass import lumped_rows, section_inertia
from fem.beam.modes.shape_functions import ShapeFunctions, simpson, touched
from fem.beam.section import sections_properties
from fem.mode import SHAPE_STATIONS, Mode
from geometry.part import Part, RegionLoad, RemotePoint, Vibration
from geometry.problem import RunError, SolveError

Array = NDArray[np.float64]
CONVERGED = 1e-6
"""Largest change of a frequency in the last step, relative."""
STEPS = SHAPE_STATIONS - 1
FINER = 4
"""Lengths of the mesh to one of the first shape functions."""
ROUNDS = 12
GUARDS = 6
"""More shapes than are wanted, for the subspace."""


def beam_vibration(
    part: Part, mesh: BeamMesh | None = None, *, shear: bool = True,
    section_solver: SectionSolver = sections_properties,
) -> tuple[Mode, ...]:
    """The natural frequencies that `part.vibration` asks for (six where it asks for none), lowest first.

    A free part keeps regions rigid that loads hold together, not those that only supports do.

    Parameters
    ----------
    mesh
        The part's own beam mesh, if there is one already; its sections are used again.
    shear
        False leaves shear flexibility and the rotary inertia of bending out.

    Raises
    ------
    RunError
        Stage ``beam``: a material without density, or what the beam model cannot represent.
    SolveError
        The supports leave a motion free, or the frequencies do not converge.
    """
    mesh = mesh or BeamMesh.of(part, section_solver, shear)
    wanted = part.vibration or Vibration()
    if part.material.density <= 0.0:
        raise RunError("beam", f"material {part.material.name} has no density, so the part has no natural frequencies")
    held = replace(part, supports=() if wanted.free else part.supports, loads=_acting(part))
    # twelve modes in one plane have waves of a sixth of the length
    lengths = STEPS * max(1, int(np.ceil(wanted.modes / 12)))
    mesh = mesh.finer(held, STEPS, FINER * lengths)
    model = _Model.of(mesh, Actions(mesh), wanted.free)
    trial = model.first(mesh.length / lengths, wanted.modes + GUARDS)
    before = np.zeros(wanted.modes)
    for _ in range(ROUNDS):
        pairs, trial = model.improved(trial, wanted.modes)
        f = pairs.frequency
        change = float(np.abs(before[:len(f)] / f - 1.0).max(initial=0.0))
        if change <= CONVERGED:
            return tuple(modes_of(mesh, pairs.at_stations, pairs.state, f, pairs.residual, pairs.mass_share))
        before = f
    raise SolveError(f"member {mesh.member.name}: the frequencies of the beam model did not converge in {ROUNDS} "
                     f"rounds (last change {change:.1e}, allowed {CONVERGED:g}); ask for fewer modes")


def _acting(part: Part) -> tuple[RegionLoad | RemotePoint, ...]:
    """Loads that hold a region together or have mass, without what they exert."""
    return tuple(replace(v, force=(0.0, 0.0, 0.0), moment=(0.0, 0.0, 0.0)) for v in part.loads
                 if isinstance(v, RegionLoad | RemotePoint))


def _held(mesh: BeamMesh, actions: Actions, free: bool) -> list[Row]:
    """Rows of the supports and of rigid regions; of a free part six that hold its first section."""
    rows = support_rows(mesh, actions)
    for k in range(6 if free else 0):
        vector = np.zeros(actions.freedoms)
        vector[k] = 1.0
        rows.append(Row(vector, np.zeros(1), "free"))
    return rows


@dataclass(frozen=True)
class _Pairs:
    """Frequencies (c,), Hz, motion of the stations and inside (see `modes_of`), residuals (c,), mass shares (c, 6)."""

    frequency: Array
    at_stations: Array
    state: Array
    residual: Array
    mass_share: Array


@dataclass(frozen=True)
class _Trial:
    """Motions: displacements (m, 3, 7, c) at the points of each length, and freedoms (n_freedoms, c)."""

    inside: Array
    freedoms: Array

    def __matmul__(self, a: NDArray[np.floating[Any]]) -> _Trial:
        return _Trial(self.inside @ a, self.freedoms @ a)

    def __sub__(self, other: _Trial) -> _Trial:
        return _Trial(self.inside - other.inside, self.freedoms - other.freedoms)


@dataclass(frozen=True)
class _Forces:
    """Forces on each length (m, 6, c) at its start and their growth per mm, and on the freedoms (n_freedoms, c)."""

    start: Array
    growth: Array
    nodal: Array


@dataclass(frozen=True)
class _Model:
    """Mass and stiffness of the part: `inertia` (m, 3, 7, 7) per length at the points, `lumped` (r, n_freedoms)."""

    mesh: BeamMesh
    actions: Actions
    rows: list[Row]
    inertia: Array
    weight: Array
    lumped: Array
    rigid: _Trial
    free: bool

    @classmethod
    def of(cls, mesh: BeamMesh, actions: Actions, free: bool) -> _Model:
        x, weight = simpson(mesh)
        inertia = section_inertia(mesh, x.ravel()).reshape(*x.shape, 7, 7)
        inside = np.zeros((*x.shape, 7, 6))
        inside[..., :6, :] = np.eye(6)
        inside[..., 1, 5], inside[..., 2, 4] = x, -x
        rigid = _Trial(inside, actions.rigid_motions())
        return cls(mesh, actions, _held(mesh, actions, free), inertia, weight, lumped_rows(mesh, actions), rigid, free)

    def first(self, spacing: float, count: int) -> _Trial:
        """The lowest `count` shapes by static shape functions."""
        mesh = self.mesh
        needed = touched([r.vector for r in self.rows] + list(self.lumped), len(mesh.x))
        needed |= {mesh.node(k * mesh.length / STEPS) for k in range(SHAPE_STATIONS)}
        shapes = ShapeFunctions.of(mesh, self.actions, needed, spacing)
        local = np.zeros((*self.weight.shape, 14, 14))
        local[..., :7, :7] = self.inertia
        M, own = shapes.weighed(local), shapes.row(self.lumped)
        massive = np.flatnonzero(np.diag(M) > 0.0)  # a rigid region's own freedoms have no mass of the sections
        B = np.zeros((shapes.size, len(massive) + len(own)))
        B[massive, :len(massive)] = np.linalg.cholesky(M[np.ix_(massive, massive)])
        B[:, len(massive):] = own.T
        F = shapes.flexibility(self.rows, self._name)
        if self.free:
            M, R = M + own.T @ own, shapes.rigid_motions()
            P = np.eye(shapes.size) - R @ np.linalg.solve(R.T @ M @ R, R.T @ M)
            F = P @ F @ P.T
        A = B.T @ F @ B
        size = len(A)
        mu, y = eigh(0.5 * (A + A.T), subset_by_index=[max(size - count, 0), size - 1])
        there = mu > 1e-12 * mu[-1]
        phi = F @ (B @ y[:, there][:, ::-1])
        freedoms = np.zeros((self.actions.freedoms, phi.shape[1]))
        full = shapes.everywhere(phi)
        for k, node in enumerate(shapes.keep):
            freedoms[7 * node:7 * node + 7] = full[7 * k:7 * k + 7]
        freedoms[7 * len(mesh.x):] = full[7 * len(shapes.keep):]
        return _Trial(shapes.states(phi)[:, :, :7], freedoms)

    @property
    def _name(self) -> str:
        return f"member {self.mesh.member.name}"

    def kinetic(self, a: _Trial, b: _Trial) -> Array:
        """(ca, cb) a^T M b."""
        inside = np.einsum("mp,mpia,mpib->ab", self.weight, a.inside, self.inertia @ b.inside, optimize=True)
        return np.asarray(inside + (self.lumped @ a.freedoms).T @ (self.lumped @ b.freedoms))

    def _inertia_forces(self, trial: _Trial) -> _Forces:
        """Of motions: varying in a straight line along each length."""
        force = (self.inertia @ trial.inside)[..., :6, :]
        growth = (force[:, 2] - force[:, 0]) / np.diff(self.mesh.x)[:, None, None]
        return _Forces(force[:, 0], growth, self.lumped.T @ (self.lumped @ trial.freedoms))

    def _work(self, motion: _Trial, forces: _Forces) -> Array:
        """(ca, cb) work of forces on motions."""
        h = np.diff(self.mesh.x)[:, None, None]
        inside = np.stack([forces.start + t * h * forces.growth for t in (0.0, 0.5, 1.0)], axis=1)
        along = np.einsum("mp,mpia,mpib->ab", self.weight, motion.inside[..., :6, :], inside, optimize=True)
        return np.asarray(along + motion.freedoms.T @ forces.nodal)

    def _bent(self, forces: _Forces) -> States:
        count = forces.nodal.shape[1]
        loads = np.concatenate([forces.start, forces.growth, np.zeros((len(forces.start), 1, count))], axis=1)
        line = replace(self.mesh.line, extra=6 * len(self.actions.rigid_points))
        rows = [replace(row, value=np.zeros(count)) for row in self.rows]
        return solve_line(line, rows, forces.nodal, loads, self.actions.rigid_motions(), self._name)

    def improved(self, trial: _Trial, wanted: int) -> tuple[_Pairs, _Trial]:
        """One step of subspace iteration: the part bent by the trial shapes' inertia, and the best combinations."""
        R = self.rigid
        if self.free:  # nothing may be left for what holds the first section
            held = self._work(R, self._inertia_forces(R))
            trial = trial - R @ np.linalg.solve(held, self._work(R, self._inertia_forces(trial)))
        forces = self._inertia_forces(trial)
        states = self._bent(forces)
        whole = np.stack([states.start, states.middle, states.end], axis=1)
        bent = _Trial(whole[:, :, :7], states.freedoms)
        if self.free:
            bent = bent - R @ np.linalg.solve(self.kinetic(R, R), self.kinetic(R, bent))
        K = self._work(bent, forces)
        M = self.kinetic(bent, bent)
        size = 1.0 / np.sqrt(np.diag(M))
        value, a = eigh(0.5 * (K + K.T) * np.outer(size, size), M * np.outer(size, size))
        a = size[:, None] * a
        new = bent @ a
        # K new = M trial a: what is left is M (trial a - omega^2 new)
        pushed = trial @ a
        off = pushed - new @ np.diag(value)
        residual = np.sqrt(np.abs(np.diag(self.kinetic(off, off)) / np.diag(self.kinetic(pushed, pushed))))
        at = [self.mesh.node(k * self.mesh.length / STEPS) for k in range(SHAPE_STATIONS)]
        d = new.freedoms[:7 * len(self.mesh.x)].reshape(len(self.mesh.x), 7, -1)[at, :6, :wanted]
        frequency = np.sqrt(np.maximum(value, 0.0)) / (2.0 * np.pi)
        return _Pairs(frequency[:wanted], d, (whole @ a)[..., :wanted], residual[:wanted],
                      self._mass_shares(new)[:wanted]), new

    def _mass_shares(self, shapes: _Trial) -> Array:
        """(c, 6) (phi^T M r)^2 / (phi^T M phi . r^T M r), r the rigid motions about the centre of mass, global axes."""
        inertia = self.kinetic(self.rigid, self.rigid)
        # a turn about the line's start moves the centre of mass by turn x c: rows of M r give mass times that
        centre = np.array([inertia[1, 5], inertia[2, 3], inertia[0, 4]]) / inertia[0, 0]
        about = np.eye(6)
        about[:3, 3:] = -np.cross(np.eye(3), centre).T
        about[:, :3], about[:, 3:] = about[:, :3] @ self.mesh.axes, about[:, 3:] @ self.mesh.axes
        rigid = self.rigid @ about
        size = np.diag(self.kinetic(rigid, rigid))
        modal = np.diag(self.kinetic(shapes, shapes))
        return np.asarray(self.kinetic(shapes, rigid) ** 2 / modal[:, None] / size)
