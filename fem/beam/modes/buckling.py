"""Linear buckling of the beam model: (K + G_fixed + factor G_varying) phi = 0.

With K^-1 = C C^T of the held part and phi = C y this is the dense symmetric problem C^T G_varying C y = mu (1 + C^T
G_fixed C) y, factor = -1/mu: all factors of both signs come from one decomposition. The part is taken in the shape it
was made in: deflection before buckling is neglected, and sections keep their shape.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh

from fem.beam.along import SectionSolver
from fem.beam.cases import solve_cases
from fem.beam.equations import Row
from fem.beam.figures import Solved
from fem.beam.mesh import BeamMesh
from fem.beam.modes.describe import modes_of
from fem.beam.modes.geometric import geometric_stiffness
from fem.beam.modes.levers import Levers, load_levers, reaction_levers
from fem.beam.modes.shape_functions import ShapeFunctions, simpson, touched
from fem.beam.modes.stress_moments import third_moments_along
from fem.beam.section import sections_properties
from fem.mode import SHAPE_STATIONS, Mode
from geometry.part import Buckling, Case, Part, StripLoad
from geometry.problem import RunError, SolveError

Array = NDArray[np.float64]
CONVERGED = 2e-4
"""Largest estimated error of a factor, relative."""
MOST_LENGTHS = 160
FIRST_LENGTHS = 20
STEPS = SHAPE_STATIONS - 1
EXTRAPOLATED = 10.0
"""How many times the error that is left the extrapolation may be: what it leaves is of the next order (judgement)."""
LARGEST_FACTOR = 1e6
"""Factors beyond are rounding, or stress so small that it is none."""
OTHER_SIGN = 100.0
"""The least factor of the other sign is given as well when it is up to so many times the least (judgement)."""


def beam_buckling(
    part: Part, mesh: BeamMesh | None = None, *, shear: bool = True,
    section_solver: SectionSolver = sections_properties,
) -> tuple[Mode, ...]:
    """The buckling factors that `part.buckling` asks for, one study after the other.

    Of each study the factors of least size, and the least of the other sign where all have one. Prescribed
    displacements grow with the varying loads. A study without factors (no stress, or fixed loads that buckle the part
    alone) has no modes here; `buckling_studies` says why.

    Parameters
    ----------
    mesh
        The part's own beam mesh, if there is one already; its sections are used again.
    shear
        False leaves shear flexibility and terms of the size of stress over E out.

    Raises
    ------
    RunError
        Stage ``beam``: a case or load that does not exist, or what the beam model cannot represent.
    SolveError
        The supports leave a motion free, or the factors do not converge.
    """
    return buckling_studies(part, mesh or BeamMesh.of(part, section_solver, shear))[0]


def buckling_studies(part: Part, mesh: BeamMesh) -> tuple[tuple[Mode, ...], tuple[str, ...]]:
    """Modes of all studies (see `beam_buckling`), and notes on those that have none."""
    modes: list[Mode] = []
    notes: list[str] = []
    for study in part.buckling:
        found, why = _study(part, mesh, study)
        modes += found
        if why:
            notes.append(f"buckling of case {study.case}: {why}")
    return tuple(modes), tuple(notes)


def _study(part: Part, mesh: BeamMesh, study: Buckling) -> tuple[list[Mode], str]:
    case = next((c for c in part.cases if c.name == study.case), None)
    if case is None:
        raise RunError("beam", f"buckling of case {study.case}: there is no such case")
    loads = tuple(v for v in part.loads if not isinstance(v, StripLoad) or v.name in case.factors)
    fixed = {name: f for name, f in case.factors.items() if name in study.fixed}
    cases = (Case("none", {}), Case("fixed", fixed), Case("all", case.factors))
    # three modes have waves of two thirds of the length
    lengths = FIRST_LENGTHS * max(1, int(np.ceil(study.modes / 4)))
    while True:
        stressed = _Stressed.of(mesh.finer(replace(part, loads=loads, cases=cases), STEPS, max(4 * lengths, 2 * STEPS)))
        coarse, fine = (stressed.factors(mesh.length / n) for n in (lengths, 2 * lengths))
        if isinstance(fine, str) or isinstance(coarse, str):
            return [], str(fine if isinstance(fine, str) else coarse)
        mu, number = _extrapolated(coarse.mu, fine.mu, study.modes)
        chosen = _chosen(mu, study.modes)
        if not len(chosen):
            return [], (f"the loads that grow make no stress that buckles the part (no factor below "
                        f"{LARGEST_FACTOR:g})")
        mu, number = mu[chosen], number[chosen]
        change = float(np.abs(fine.mu[number] / mu - 1.0).max())
        if change <= EXTRAPOLATED * CONVERGED:
            return fine.modes(number, -1.0 / mu, study.case), ""
        lengths *= 2
        if lengths > MOST_LENGTHS:
            raise SolveError(f"member {mesh.member.name}: the buckling factors of case {study.case} did not converge "
                             f"(extrapolated by {change:.1e}, allowed {EXTRAPOLATED * CONVERGED:.1e}); ask for fewer "
                             "modes")


@dataclass(frozen=True)
class _Found:
    """All mu = -1/factor (k,), rising, by one set of shape functions, their y and C (phi = C y), residuals (k,)."""

    shapes: ShapeFunctions
    mu: Array
    y: Array
    C: Array
    residual: Array

    def modes(self, number: NDArray[np.int64], values: Array, case: str) -> list[Mode]:
        mesh, vectors = self.shapes.mesh, self.C @ self.y[:, number]
        state = self.shapes.states(vectors)
        at = [mesh.node(k * mesh.length / STEPS) for k in range(SHAPE_STATIONS)]
        stations = np.concatenate([state[at[:-1], 0, :6], state[-1:, 2, :6]])
        return modes_of(mesh, stations, state, values, self.residual[number], case=case)


@dataclass(frozen=True)
class _Stressed:
    """The linear stress of the fixed and of the varying loads: section forces (2, m, 3, 6) and levers."""

    solved: Solved
    forces: Array
    third: Array
    levers: tuple[Levers, Levers]

    @classmethod
    def of(cls, mesh: BeamMesh) -> _Stressed:
        """`mesh` is that of a part with the cases none, fixed, all."""
        solved = solve_cases(mesh)
        s = solved.states
        f = np.stack([s.start, s.middle, s.end], axis=1)[:, :, 7:13]
        none, fixed, whole = np.moveaxis(f, -1, 0)
        factors = [mesh.part.cases[k].factors for k in (1, 2)]
        grown = {name: v for name, v in factors[1].items() if name not in factors[0]}
        reactions = s.reactions[:, 1] - s.reactions[:, 0], s.reactions[:, 2] - (s.reactions[:, 1] - s.reactions[:, 0])
        levers = tuple(_levers(solved, by, r) for by, r in zip((factors[0], grown), reactions, strict=True))
        return cls(solved, np.stack([fixed - none, whole - (fixed - none)]),
                   third_moments_along(mesh.sections, simpson(mesh)[0].ravel()), (levers[0], levers[1]))

    def factors(self, spacing: float) -> _Found | str:
        """All factors by shape functions of this spacing (mm), or why there are none."""
        mesh, actions = self.solved.mesh, self.solved.actions
        rows = [Row(r.vector, np.zeros(1), r.owner) for r in self.solved.rows]
        turns = [row for levers in self.levers for rows_, _ in levers.turns for row in rows_]
        shapes = ShapeFunctions.of(mesh, actions, touched([r.vector for r in rows] + turns, len(mesh.x)), spacing)
        F = shapes.flexibility(rows, f"member {mesh.member.name}")
        size = np.sqrt(np.maximum(np.diag(F), 1e-30 * np.diag(F).max()))  # mm and rad on one scale
        value, U = np.linalg.eigh(F / np.outer(size, size))
        there = value > 1e-14 * value[-1]
        C = size[:, None] * (U[:, there] * np.sqrt(value[there]))
        first, second = (C.T @ geometric_stiffness(shapes, f, self.third, levers) @ C
                         for f, levers in zip(self.forces, self.levers, strict=True))
        A = np.eye(len(first)) + first
        least = float(np.linalg.eigvalsh(A)[0]) if first.any() else 1.0
        if least <= 0.0:
            return "the fixed loads alone buckle the part"
        mu, y = eigh(0.5 * (second + second.T), 0.5 * (A + A.T))
        left = np.linalg.norm(second @ y - (A @ y) * mu, axis=0)
        residual = left / np.maximum(np.abs(mu) * np.linalg.norm(y, axis=0), 1e-300)
        return _Found(shapes, mu, y, C, residual)


def _levers(solved: Solved, factors: Mapping[str, float], reactions: Array) -> Levers:
    """Of all loads of a case, and of what holds the part."""
    total = reaction_levers(solved.actions, solved.rows, reactions)
    for load in solved.mesh.part.loads:
        factor = factors.get(load.name, 0.0)
        if factor:
            own = load_levers(solved.actions, load)
            total.along += factor * own.along
            total.turns += [(rows, factor * lever) for rows, lever in own.turns]
    return total


def _chosen(mu: Array, wanted: int) -> NDArray[np.int64]:
    """The factors of least size, in order, and the least of the other sign."""
    order = np.argsort(-np.abs(mu), kind="stable")
    order = order[np.abs(mu[order]) > 1.0 / LARGEST_FACTOR]
    chosen = order[:wanted]
    if len(chosen) and abs(np.sign(mu[chosen]).sum()) == len(chosen):
        other = [k for k in order[wanted:] if mu[k] * mu[chosen[0]] < 0.0]
        if other and abs(mu[other[0]]) * OTHER_SIGN >= abs(mu[chosen[0]]):
            chosen = np.append(chosen, other[0])
    return np.asarray(chosen, dtype=np.int64)


def _extrapolated(coarse: Array, fine: Array, wanted: int) -> tuple[Array, NDArray[np.int64]]:
    """mu at no spacing, and its number in `fine`: of each sign the `wanted` of greatest size.

    Halving the spacing takes the error of twist and shear to a quarter (that of bending, to a sixteenth, is much
    smaller): L. F. Richardson's extrapolation.
    """
    number = []
    value = []
    for sign in (1.0, -1.0):
        order = [np.argsort(-sign * mu, kind="stable")[:wanted] for mu in (coarse, fine)]
        a, b = coarse[order[0]], fine[order[1]]
        there = (sign * a[:len(b)] > 0.0) & (sign * b[:len(a)] > 0.0)
        number.append(order[1][:len(there)][there])
        value.append((b + (b - a) / 3.0)[there] if len(a) == len(b) else b[:len(there)][there])
    return np.concatenate(value), np.concatenate(number)
