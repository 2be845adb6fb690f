"""Linear buckling: (K + G_fixed + factor G_varying) phi = 0, with G the geometric stiffness of the linear stress.

Loads keep their direction and their place in the material: pressure does not turn with the surface, and a support's
moment arm does not shorten. A force at a remote point keeps its direction while its lever turns with the region that
carries it, and what keeps a region rigid turns with it.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.mode import OTHER_SIGN, Mode, none_of_other_sign
from fem.solid.block_matrix import BlockMatrix
from fem.solid.cut import Cutter
from fem.solid.eigen.count import LowRank, negative_count, separated, too_large
from fem.solid.eigen.describe import buckling_kind, section_shapes, section_shares, shape_sections
from fem.solid.eigen.eigenmodes import GUARD_ALLOWED, GUARDS, RESIDUAL_ALLOWED, Eigenmodes, NotSettled
from fem.solid.eigen.motions import Motions, Operator, held_motions
from fem.solid.eigen.pairs import Pairs, Pencil, extreme_pairs, lost, second_search, space_room
from fem.solid.eigen.sounding import COLUMNS, LEAST_OF_INVERSE, assumed, sound, told
from fem.solid.eigen.space import by_turns
from fem.solid.eigen.start import held_fields
from fem.solid.eigen.stress_stiffness import StressStiffness, stress_stiffnesses
from fem.solid.factor import TooLarge
from fem.solid.mass import mass_matrix
from fem.solid.model import SolidModel
from fem.solid.result import Check
from fem.solid.shape import Array
from fem.solid.system import HeldSystem
from geometry.budget import Budget
from geometry.part import Buckling
from geometry.problem import SolveError

OTHER_SIGN_ROUNDS = 40
NOTE = "loads keep their direction (pressure does not turn with the surface); walls may buckle by themselves"


def solid_buckling(
    model: SolidModel, system: HeldSystem, u: Array, budget: Budget, cutter: Cutter | None = None
) -> Eigenmodes:
    """The buckling factors that `model.part.buckling` asks for, one study after the other.

    Prescribed displacements of supports grow with the varying loads. Of one study: the factors of least size, and the
    least of the other sign where all have one sign and there is one up to OTHER_SIGN times the least.

    Parameters
    ----------
    system
        The held system of the static run.
    u
        (c, 3, n) displacements of the cases, mm.
    cutter
        Of the mesh, if there is one already.

    Raises
    ------
    SolveError
        When the factors do not converge, or one is missing.
    """
    motions = held_motions(system, model.mesh.nodes)
    modes: list[Mode] = []
    shapes: list[Array] = []
    checks: list[Check] = []
    describe = _Describer(model, cutter)
    for study in model.part.buckling:
        fixed, varying = stress_stiffnesses(model, system, u, study)
        found = _Study(model, motions, fixed, varying, study, budget)
        pairs = found.solve()
        checks += found.checks
        if pairs.mu.size:
            more, shape = describe.modes(pairs, study.case)
            modes += more
            shapes.append(shape)
    n = model.mesh.nodes.shape[1]
    return Eigenmodes(tuple(modes), np.concatenate(shapes) if shapes else np.zeros((0, 3, n)), tuple(checks))


def _of_sign(sign: float) -> Callable[[Array, int], NDArray[np.int64]]:
    def choose(mu: Array, count: int) -> NDArray[np.int64]:
        return np.argsort(-sign * mu, kind="stable")[:count]

    return choose


class _Study:
    """One buckling study: mu = -1 / factor of G_varying x = mu (K + G_fixed) x."""

    def __init__(
        self,
        model: SolidModel,
        motions: Motions,
        fixed: StressStiffness | None,
        varying: StressStiffness | None,
        study: Buckling,
        budget: Budget,
    ) -> None:
        self.model, self.motions, self.fixed, self.varying = model, motions, fixed, varying
        self.study, self.budget = study, budget
        self.largest = varying.largest if varying else 0.0
        self.allowed = RESIDUAL_ALLOWED[motions.direct]
        self.left = 1.0  # least part of the stiffness that the fixed loads leave
        self.checks: list[Check] = []

    def _check(self, what: str, value: float, allowed: float, note: str) -> None:
        self.checks.append(Check(f"buckling of {self.study.case}: {what}", value, allowed, value <= allowed, note))

    def _stiffness(self) -> Operator:
        if self.fixed is None:
            return self.motions.stiffness
        K, G = self.motions.stiffness, self.fixed
        return lambda u: K(u) + G @ u

    def _start(self, B: Operator, count: int, seed: int) -> Array:
        fields = held_fields(self.motions.elimination, self.model.mesh.nodes, count, seed)
        first = by_turns(lambda u: self.motions.precondition(B(u)), fields)
        return first if np.abs(first).max() > 0 else fields

    def solve(self) -> Pairs:
        """The pairs, the least factor first; none when nothing buckles."""
        none = Pairs(np.zeros(0), np.zeros((self.model.K.shape[0], 0)), np.zeros(0), 0)
        if self.fixed is not None and not self._fixed_loads_hold(self.fixed):
            return none
        if self.varying is None:
            self._check("stress of the loads that grow", 0.0, 0.0, "there is none, so there is no factor")
            return none
        B = self.varying.__matmul__
        pencil = Pencil(self._stiffness(), B, self.motions.precondition, self.motions.threads)
        pairs = self._least(pencil, B)
        sensible = np.abs(pairs.mu) > 1.0 / self.largest
        pairs = Pairs(pairs.mu[sensible], pairs.x[:, sensible], pairs.residual[sensible], pairs.rounds)
        if not pairs.mu.size:
            self._check("factors", 0.0, 0.0, f"none of a size below {self.largest:.3g}")
            return none
        pairs = self._with_other_sign(pencil, B, pairs)
        worst = float(pairs.residual.max())
        self._check(
            "largest residual", worst, self.allowed,
            f"of the sum of the three forces over K phi, in the norm of the inverse stiffness; {NOTE}",
        )  # fmt: skip
        return pairs

    def _fixed_loads_hold(self, fixed: StressStiffness) -> bool:
        """Whether K + G_fixed is positive definite: the least positive factor of the fixed loads is above one."""
        B = fixed.__matmul__
        pencil = Pencil(self.motions.stiffness, B, self.motions.precondition, self.motions.threads)
        start = self._start(B, 6, self.budget.seed)
        found = extreme_pairs(pencil, start, np.array([GUARD_ALLOWED]), choose=_of_sign(-1.0))
        factor = -1.0 / found.mu[0] if found.mu[0] < 0 else np.inf
        self.left = 1.0 - 1.0 / factor
        note = "the fixed loads alone buckle the part" if factor <= 1.0 else ""
        self._check("fixed loads over those that buckle the part alone", float(1.0 / factor), 1.0, note)
        return bool(factor > 1.0)

    def _least(self, pencil: Pencil, B: Operator) -> Pairs:
        """The factors of least size, counted."""
        modes, guards = min(self.study.modes, self.motions.free - self.motions.rows.shape[0]), GUARDS
        start, reason = np.zeros((self.model.K.shape[0], 0)), too_large(self.motions)
        room = space_room(self.motions.free, self.budget)
        for attempt in range(3):
            fresh = self._start(B, modes + guards + 4, self.budget.seed + attempt)
            tolerance = np.r_[np.full(modes, self.allowed), np.full(guards, GUARD_ALLOWED)]
            found = extreme_pairs(pencil, np.hstack([start, fresh]), tolerance, room)
            real = np.abs(found.mu) > 1.0 / self.largest
            if not (found.residual <= tolerance[: found.mu.size])[real].all():
                raise NotSettled(
                    f"The buckling factors of the case {self.study.case!r} do not converge: residual "
                    f"{found.residual[real].max():.1e} after {found.rounds} rounds, allowed {self.allowed:.0e}."
                )
            counts: list[tuple[int, str] | None] = []
            try:
                if not reason:
                    counts = [self._missing(found, modes, sign, attempt == 2) for sign in (1.0, -1.0)]
            except TooLarge as error:
                reason = f"not counted: {error}"
            sounded = self._sounded(pencil, found, modes, attempt, reason) if reason else None
            if sounded is not None:
                counts = [sounded]
            elif reason:
                fresh = self._start(B, 2 * GUARDS, self.budget.seed + 100 + attempt)
                again = second_search(pencil, found, tolerance, fresh, room)
                missed = lost(found, again, modes)
                word = "one" if missed else "none"
                counts = [(missed, f"{reason}; a second search from other vectors found {word} that was missed")]
            if all(c is not None and c[0] <= 0 for c in counts):
                break
            guards, start = guards + 4, (again if reason and sounded is None else found).x
        known = [c for c in counts if c is not None]
        missing = sum(abs(c[0]) for c in known)
        note = "; ".join(c[1] for c in known if c[1])
        self._check("factors missed", float(missing), 0.0, note)
        if missing:
            raise SolveError(
                f"Buckling factors of the case {self.study.case!r} are missing: {self.checks[-1].note}. Mesh the part "
                "again."
            )
        return Pairs(found.mu[:modes], found.x[:, :modes], found.residual[:modes], found.rounds)

    def _place(self, found: Pairs, modes: int, sign: float) -> tuple[int, tuple[int, float] | None]:
        """How many factors of one sign are among those reported, and where to count them (see `separated`)."""
        factors = -1.0 / np.where(found.mu != 0, found.mu, np.nan)
        mine = np.flatnonzero((factors * sign > 0) & (np.abs(factors) < self.largest))
        reported = int((mine < modes).sum())
        if not reported:
            return 0, None
        values = np.abs(factors[mine])
        # the next one of this sign is at least as far as the last one found of any
        farthest = float(np.abs(factors[-1]))
        if farthest > values[-1]:
            values = np.r_[values, farthest]
        return reported, separated(values, reported) or (reported, -float(values[reported - 1]))

    def _missing(self, found: Pairs, modes: int, sign: float, last: bool) -> tuple[int, str] | None:
        """How many factors of one sign are missing among those reported, and what was counted; None: not to be told
        because the next one is not known to stand apart."""
        _, split = self._place(found, modes, sign)
        if split is None:
            return 0, ""
        if split[1] < 0 and not last:
            return None
        above, shift = split[0], abs(split[1])
        try:
            count = self._count(sign * shift)
        except TooLarge:
            raise
        except SolveError as error:
            return 0, f"not counted: {error}"
        return count - above, f"{count} between 0 and {sign * shift:.5g} by the inertia of K + G"

    def _sounded(self, pencil: Pencil, found: Pairs, modes: int, attempt: int, reason: str) -> tuple[int, str] | None:
        """The same by random vectors, of both signs; None where they do not decide."""
        assert self.varying is not None
        missing, notes, least = 0, [], LEAST_OF_INVERSE[self.motions.direct] * self.left
        for sign in (1.0, -1.0):
            _, split = self._place(found, modes, sign)
            if split is None or found.space is None:
                continue
            if split[1] < 0:
                return None
            above, shift = split
            rough = self.varying.rough(COLUMNS, self.budget.seed + attempt)
            sounding = sound(pencil, found.space, sign * shift, rough, least)
            if not (sounding.clear or sounding.found):
                return None
            missing += sounding.known - above + int(sounding.found)
            notes.append(told(sounding, f"{above} between 0 and {sign * shift:.5g}"))
        if notes and not missing:
            notes.append(assumed(least))
        return missing, "; ".join([reason, *notes])

    def _count(self, shift: float) -> int:
        """Negative directions of K + G_fixed + shift G_varying."""
        assert self.varying is not None
        K, eliminate = self.model.K, self.motions.elimination
        blocks = K.blocks.copy()
        self.varying.part.add_to(blocks, shift)
        weights, levers = [shift * self.varying.weights], [self.varying.levers]
        if self.fixed is not None:
            self.fixed.part.add_to(blocks, 1.0)
            weights.append(self.fixed.weights)
            levers.append(self.fixed.levers)
        matrix = eliminate.square(BlockMatrix(K.indptr, K.indices, blocks, K.threads))
        rows = (sp.vstack(levers) @ eliminate.T).toarray()
        low = LowRank(rows, np.concatenate(weights))
        m = self.motions
        return negative_count(matrix, low, m.rows, self.budget, m.springs, m.direct)

    def _with_other_sign(self, pencil: Pencil, B: Operator, pairs: Pairs) -> Pairs:
        """The pairs and, where all have one sign, the first of the other one if it is found."""
        sign = float(np.sign(pairs.mu[0]))
        if not (pairs.mu * sign > 0).all():
            return pairs
        start = self._start(B, 6, self.budget.seed + 7)
        found = extreme_pairs(
            pencil, start, np.array([self.allowed]), choose=_of_sign(-sign), rounds=OTHER_SIGN_ROUNDS,
            enough=lambda mu, rounds: bool(rounds > 10 and -sign * mu[0] * OTHER_SIGN < abs(pairs.mu[0])),
        )  # fmt: skip
        mu = float(found.mu[0])
        if -sign * mu * OTHER_SIGN < abs(float(pairs.mu[0])):
            note = f"none was found up to {OTHER_SIGN:g} times the least"
            self.checks.append(Check(none_of_other_sign(self.study.case), 0.0, 0.0, True, note))
            return pairs
        if found.residual[0] > self.allowed:
            note = "it did not settle: whether there is one is open"
            self._check("search for factors of the other sign", 0.0, 0.0, note)
            return pairs
        order = np.argsort(-np.abs(np.r_[pairs.mu, mu]), kind="stable")
        return Pairs(
            np.r_[pairs.mu, mu][order],
            np.hstack([pairs.x, found.x])[:, order],
            np.r_[pairs.residual, found.residual][order],
            max(pairs.rounds, found.rounds),
        )


class _Describer:
    """Sections and volume of the part, made when the first shape comes."""

    def __init__(self, model: SolidModel, cutter: Cutter | None) -> None:
        self.model, self.cutter = model, cutter
        self.made: tuple = ()  # type: ignore[type-arg]

    def modes(self, pairs: Pairs, case: str) -> tuple[Sequence[Mode], Array]:
        """Modes and shapes (k, 3, n)."""
        if not self.made:
            self.made = shape_sections(self.model, self.cutter), mass_matrix(self.model.groups, 1.0, self.model.K)
        sections, volume = self.made
        n, count = self.model.mesh.nodes.shape[1], pairs.mu.size
        shapes = pairs.x.reshape(n, 3, count).transpose(2, 1, 0)
        shapes = np.ascontiguousarray(shapes / np.linalg.norm(shapes, axis=1).max(axis=1)[:, None, None])
        mean, turn = section_shapes(sections, self.model, shapes)
        explained = section_shares(sections, self.model, volume, shapes, mean, turn)
        modes = [
            Mode(
                value=float(-1.0 / pairs.mu[k]),
                displacement=mean[k],
                rotation=turn[k],
                kind=buckling_kind(sections, mean[k], turn[k], float(explained[k])),
                residual=float(pairs.residual[k]),
                section_share=float(explained[k]),
                case=case,
            )
            for k in range(count)
        ]
        return modes, shapes
