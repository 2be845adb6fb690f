"""Natural frequencies: K phi = omega^2 M phi on the motions that the supports leave, or of the free part."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from fem.mode import Mode
from fem.solid.block_matrix import BlockMatrix
from fem.solid.cut import Cutter
from fem.solid.eigen.count import APART, LowRank, negative_count, separated, too_large
from fem.solid.eigen.describe import section_shapes, section_shares, shape_sections, vibration_kind
from fem.solid.eigen.eigenmodes import GUARD_ALLOWED, GUARDS, RESIDUAL_ALLOWED, Eigenmodes, NotSettled
from fem.solid.eigen.motions import Motions, free_motions, free_part_constraints, held_motions
from fem.solid.eigen.pairs import Pairs, Pencil, extreme_pairs, lost, second_search, space_room
from fem.solid.eigen.remote import remote_mass_rows
from fem.solid.eigen.rigid import orthonormal, rigid_motions
from fem.solid.eigen.sounding import COLUMNS, LEAST_OF_INVERSE, assumed, sound, told
from fem.solid.eigen.space import by_turns
from fem.solid.eigen.start import start_fields
from fem.solid.factor import TooLarge
from fem.solid.mass import mass_matrix
from fem.solid.model import SolidModel
from fem.solid.result import Check
from fem.solid.scalar_matrix import ScalarMatrix
from fem.solid.shape import Array
from fem.solid.solver import Choice
from fem.solid.solver.elimination import Elimination
from fem.solid.system import HeldSystem
from geometry.budget import Budget
from geometry.part import RemotePoint
from geometry.problem import SolveError

RIGID_ALLOWED = 1e-9
"""Energy of a rigid motion over the sum of its terms' sizes: rounding of coordinates and stiffness."""


@dataclass(frozen=True, slots=True)
class _Mass:
    """Consistent mass of the part and rows B (r, 3 n) of the remote masses, M + B^T B, t."""

    part: ScalarMatrix
    remote: sp.csr_matrix

    def __matmul__(self, u: Array) -> Array:
        out = self.part @ u
        if self.remote.shape[0]:
            out += self.remote.T @ (self.remote @ u)
        return out

    def rough(self, count: int, seed: int) -> Array:
        """(3 n, count) random vectors whose covariance is at least this matrix."""
        rng, n = np.random.default_rng(seed), self.part.shape[0] // 3
        out = np.sqrt(np.repeat(self.part.sizes(), 3))[:, None] * rng.standard_normal((3 * n, count))
        if self.remote.shape[0]:
            out += self.remote.T @ rng.standard_normal((self.remote.shape[0], count))
        return out


def solid_vibration(
    model: SolidModel,
    system: HeldSystem | None,
    budget: Budget,
    cutter: Cutter | None = None,
    choice: Choice = "auto",
    backend: str = "auto",
) -> Eigenmodes:
    """The lowest natural frequencies that `model.part.vibration` asks for.

    Parameters
    ----------
    system
        The held system of the static run; not used for a free part, which makes one of its own.
    cutter
        Of the mesh, if there is one already.
    choice, backend
        Solver of the system that a free part makes, as for `HeldSystem`.

    Raises
    ------
    SolveError
        When the modes do not converge, or one is missing.
    """
    wanted = model.part.vibration
    if wanted is None:
        raise SolveError("The part asks for no natural frequencies.")
    points = [p for p in model.part.loads if isinstance(p, RemotePoint) and (p.mass > 0 or any(p.inertia))]
    mass = _Mass(mass_matrix(model.groups, model.part.material.density, model.K), remote_mass_rows(model.mesh, points))
    checks: list[Check] = []
    if wanted.free:
        constraints = free_part_constraints(model)
        elimination = Elimination(constraints.T)
        R, cost = _rigid_unknowns(model, elimination, mass)
        checks.append(Check("free part: energy of its rigid motions", cost, RIGID_ALLOWED, cost <= RIGID_ALLOWED))
        motions = free_motions(model, constraints, elimination, mass.__matmul__, R, budget, choice, backend)
    elif system is None:
        raise SolveError("Natural frequencies of a held part need its held system.")
    else:
        motions = held_motions(system, model.mesh.nodes)
    try:
        pairs, counted = _solve(model, motions, mass, wanted.modes, 6 if wanted.free else 0, budget)
    finally:
        motions.close()
    checks.append(counted)
    return _modes(model, motions, mass, pairs, checks, cutter)


def _rigid_unknowns(model: SolidModel, elimination: Elimination, mass: _Mass) -> tuple[Array, float]:
    """(3 n, 6) rigid motions of a free part, orthonormal in the mass, and the largest relative energy of one."""
    R = rigid_motions(model.mesh.nodes, model.centre_of_mass)
    size = np.asarray(elimination.T.power(2).sum(axis=0)).ravel()
    Y = elimination.gather(R) / size[:, None]
    held = elimination.expand(Y)
    gap = np.abs(held - R).max(axis=0) / np.abs(R).max(axis=0)
    if gap.max() > 1e-8:
        raise SolveError("The free part's unknowns do not hold its rigid motions.")
    energy = np.einsum("ik,ik->k", R, model.K @ R)
    terms = np.einsum("ik,i->k", R**2, model.K.diagonal())
    return orthonormal(held, mass @ held), float((np.abs(energy) / terms).max())


def _solve(
    model: SolidModel, motions: Motions, mass: _Mass, modes: int, below: int, budget: Budget
) -> tuple[Pairs, Check]:
    """The lowest `modes` pairs, counted; `below`: rigid motions that the count finds as well."""
    available = motions.free - motions.rows.shape[0] - below
    if modes > available:
        raise SolveError(f"{modes} natural frequencies are asked for and the mesh has {available} free motions.")
    pencil = Pencil(motions.stiffness, mass.__matmul__, motions.precondition, motions.threads)
    allowed = RESIDUAL_ALLOWED[motions.direct]
    reason = too_large(motions)
    guards, start, room = GUARDS, np.zeros((model.K.shape[0], 0)), space_room(motions.free, budget)
    note, missing = reason, 0
    for attempt in range(3):
        guards = min(guards, available - modes)
        fresh = _start(model, motions, mass, modes + guards + 2, budget.seed + attempt)
        tolerance = np.r_[np.full(modes, allowed), np.full(guards, GUARD_ALLOWED)]
        found = extreme_pairs(pencil, np.hstack([start, fresh]), tolerance, room)
        if not (found.residual.size == modes + guards and (found.residual <= tolerance).all()):
            worst = float(found.residual[:modes].max(initial=0.0))
            raise NotSettled(
                f"The natural frequencies do not converge: residual {worst:.1e} after {found.rounds} rounds, allowed "
                f"{allowed:.0e}."
            )
        squares = 1.0 / found.mu
        split = separated(squares, modes)
        if not reason and split is None and guards and attempt < 2:
            guards, start = guards + 4, found.x
            continue
        above, shift = split or (modes + guards, float(squares[-1]) * (1.0 + APART))
        try:
            if not reason:
                missing = _count(motions, model.K, mass, shift, budget) - below - above
                note = f"{above} at or below {np.sqrt(shift) / 2 / np.pi:.5g} Hz by the inertia of K - omega^2 M"
                if missing <= 0:
                    break
                guards, start = guards + missing + 2, found.x
                continue
        except TooLarge as error:
            reason = f"not counted: {error}"
        except SolveError as error:
            missing, note = 0, f"not counted: {error}"
            break
        if found.space is not None:
            rough = mass.rough(COLUMNS, budget.seed + attempt)
            least = LEAST_OF_INVERSE[motions.direct]
            sounding = sound(pencil, found.space, -shift, rough, least)
            missing = sounding.known - above + int(sounding.found)
            note = f"{reason}; {told(sounding, f'{above} at or below {np.sqrt(shift) / 2 / np.pi:.5g} Hz')}"
            if sounding.found or missing:
                guards, start = guards + 4, found.x
                continue
            if sounding.clear:
                note = f"{note}; {assumed(least)}"
                break
        fresh = _start(model, motions, mass, 2 * GUARDS, budget.seed + 100 + attempt)
        again = second_search(pencil, found, tolerance, fresh, room)
        missing = lost(found, again, modes)
        note = f"{reason}; a second search from other vectors found {'one' if missing else 'none'} that was missed"
        if not missing:
            break
        start = again.x
    name = "natural frequencies missed"
    check = Check(name, float(missing), 0.0, missing == 0, note)
    if missing:
        raise SolveError(
            f"{abs(missing)} natural frequencies too {'many' if missing < 0 else 'few'} were found ({note}). Mesh the "
            "part again."
        )
    return Pairs(found.mu[:modes], found.x[:, :modes], found.residual[:modes], found.rounds), check


def _start(model: SolidModel, motions: Motions, mass: _Mass, count: int, seed: int) -> Array:
    return by_turns(lambda u: motions.precondition(mass @ u), start_fields(model.mesh.nodes, count, seed))


def _count(motions: Motions, K: BlockMatrix, mass: _Mass, shift: float, budget: Budget) -> int:
    T, blocks = motions.elimination.T, K.blocks.copy()
    mass.part.add_to(blocks, -shift)
    matrix = motions.elimination.square(BlockMatrix(K.indptr, K.indices, blocks, K.threads))
    rows = (mass.remote @ T).toarray()
    low = LowRank(rows, np.full(rows.shape[0], -shift))
    return negative_count(matrix, low, motions.rows, budget, motions.springs, motions.direct)


def _modes(
    model: SolidModel, motions: Motions, mass: _Mass, pairs: Pairs, checks: list[Check], cutter: Cutter | None
) -> Eigenmodes:
    n, count = model.mesh.nodes.shape[1], pairs.mu.size
    u = pairs.x / np.sqrt(pairs.mu)  # phi^T M phi = 1
    share = _mass_shares(model, mass, u)
    shapes = u.reshape(n, 3, count).transpose(2, 1, 0)
    shapes = np.ascontiguousarray(shapes / np.linalg.norm(shapes, axis=1).max(axis=1)[:, None, None])
    sections = shape_sections(model, cutter)
    mean, turn = section_shapes(sections, model, shapes)
    explained = section_shares(sections, model, mass.part, shapes, mean, turn)
    modes = tuple(
        Mode(
            value=float(1.0 / np.sqrt(pairs.mu[k]) / (2.0 * np.pi)),
            displacement=mean[k],
            rotation=turn[k],
            kind=vibration_kind(sections, mean[k], turn[k], float(explained[k])),
            residual=float(pairs.residual[k]),
            section_share=float(explained[k]),
            mass_share=share[k],
        )
        for k in range(count)
    )
    worst, allowed = float(pairs.residual.max()), RESIDUAL_ALLOWED[motions.direct]
    most = float(share.sum(axis=0).max())
    checks = [
        Check(
            "natural frequencies: largest residual",
            worst,
            allowed,
            worst <= allowed,
            f"of K phi - omega^2 M phi over K phi, in the norm of the inverse stiffness; {pairs.rounds} rounds with "
            f"the {motions.solver} solver",
        ),
        *checks,
        Check("natural frequencies: most of the mass carried along a direction", most, 1.0 + 1e-6, most <= 1.0 + 1e-6),
    ]
    return Eigenmodes(modes, shapes, tuple(checks))


def _mass_shares(model: SolidModel, mass: _Mass, u: Array) -> Array:
    """(modes, 6) effective mass and moment of inertia over those of the whole, about its centre; u^T M u = 1."""
    R = rigid_motions(model.mesh.nodes, np.zeros(3))
    heavy = mass @ R
    total = R.T @ heavy
    # of the first moments m (c x .): total[0:3, 3:6] holds -[m c] x
    centre = np.array([total[1, 5], total[2, 3], total[0, 4]]) / total[0, 0]
    R = rigid_motions(model.mesh.nodes, centre)
    heavy = mass @ R
    return np.asarray((u.T @ heavy) ** 2 / np.einsum("ik,ik->k", R, heavy))
