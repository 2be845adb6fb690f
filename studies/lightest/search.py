"""The search for the least aim under the limits."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import islice

import numpy as np
from threadpoolctl import threadpool_limits

from studies.lightest.belief import AimBefore, Belief, believe
from studies.lightest.evaluator import Evaluator, Solved
from studies.lightest.space import Point, Space

ENOUGH = 1e-3
"""Expected improvement, as a share of the best aim, below which no further solve pays."""

HOPELESS = 1e-3
"""Probability of meeting the limits below which, for every point, the search gives up while it has none that does."""

ALL, MANY, MOST_ASKED = 5000, 3000, 400
"""Points up to which a space is looked through whole; how many are looked at elsewhere; how many of those that promise
most are asked whether they are allowed."""

EXACTLY = 30
"""Of the most promising points the aim is looked up rather than smoothed."""

REACHES = (0.1, 0.03, 0.01, 0.003)
TOGETHER = 2
"""Points solved in a round. It does not depend on how many are solved at a time, so that neither does the result."""


@dataclass(frozen=True)
class Found:
    """What a search has found.

    Attributes
    ----------
    best
        The least that meets every limit; None when none was found.
    solved
        Every solved point in the order in which it was chosen.
    belief
        What is believed after the last of them.
    unchecked
        Neighbours of the best whose aim is, or may be, less and that were not solved.
    why
        Why the search ended.
    """

    best: Solved | None
    solved: tuple[Solved, ...]
    belief: Belief
    unchecked: tuple[Point, ...]
    why: str
    first: int
    """Points of the even start."""


@dataclass(frozen=True)
class Step:
    """What a listener hears after each round."""

    solved: int
    best: Solved | None
    gain: float
    """Expected improvement as a share of the best aim; NaN in the even start and among neighbours."""
    doing: str


def first_count(space: Space, budget: int) -> int:
    """How many points the even start has."""
    columns = space.seen([space.at([0.0] * len(space.dimensions))]).shape[1]
    return max(2, min(space.size, budget // 2, 4 + 2 * columns))


def search(space: Space, evaluator: Evaluator, budget: int = 60, seed: int = 1, together: int = TOGETHER,
           tell: Callable[[Step], None] = lambda step: None) -> Found:
    """Search for the least aim among the points that meet every limit.

    Parameters
    ----------
    budget
        Points that may be solved.
    seed
        Of everything that is left to chance; the same seed gives the same search.
    together
        Points chosen at a time after the even start.
    tell
        Hears each `Step`.
    """
    with threadpool_limits(1):  # the sums of one thread: the choice must not depend on how many there are
        return _Search(space, evaluator, budget, seed, together, tell).run()


class _Search:
    def __init__(self, space: Space, evaluator: Evaluator, budget: int, seed: int, together: int,
                 tell: Callable[[Step], None]) -> None:
        self.space, self.evaluator, self.budget, self.together, self.tell = space, evaluator, budget, together, tell
        self.seed, self.rng = seed, np.random.default_rng(seed)
        self.solved: dict[Point, Solved] = {}
        self.allowed: dict[Point, bool] = {}
        self.every = list(space.all()) if space.size <= ALL else None
        self.before = self._aim_before()
        self.belief: Belief | None = None

    def _aim_before(self) -> AimBefore | None:
        spread = islice(self.space.spread(self.seed), MANY)
        point = next((p for p in spread if self._is_allowed(p)), None)
        if point is None or self.evaluator.aim_before(point) is None:
            return None
        return AimBefore(self.evaluator.aim_before, self.space, self.seed)

    def run(self) -> Found:
        first = self._start()
        self._solve(first, math.nan, "even start")
        why = "the budget is used up"
        while self.budget > len(self.solved):
            self._learn()
            beside = self._beside()
            left = self.budget - len(self.solved)
            chosen, gain, chance = self._promising(min(self.together, left))
            best = self.best
            if not chosen:
                why = "every variant that the plan leaves in was solved"
                if not beside:
                    break
            elif best is None and chance < HOPELESS:
                why = "no variant is expected to meet every limit"
                break
            if best is not None and beside and (gain < ENOUGH or left <= len(beside)):
                self._solve(beside[:left], math.nan, "neighbours of the best")
            elif best is not None and gain < ENOUGH:
                why = f"no further variant is expected to gain {100 * ENOUGH:g} %"
                break
            else:
                self._solve(chosen, gain, "where it pays")
        self._learn()
        assert self.belief is not None
        return Found(self.best, tuple(self.solved.values()), self.belief, tuple(self._beside()), why, len(first))

    @property
    def best(self) -> Solved | None:
        """The least so far that meets every limit."""
        meeting = [one for one in self.solved.values() if one.meets and math.isfinite(one.aim)]
        return min(meeting, key=lambda one: one.aim, default=None)

    def _start(self) -> list[Point]:
        wanted = first_count(self.space, self.budget)
        chosen: dict[Point, None] = {}
        for point in islice(self.space.spread(self.seed), MANY):
            if len(chosen) == wanted:
                break
            if point not in chosen and self._is_allowed(point):
                chosen[point] = None
        return list(chosen)

    def _is_allowed(self, point: Point) -> bool:
        if point not in self.allowed:
            self.allowed[point] = self.evaluator.allowed(point)
        return self.allowed[point]

    def _solve(self, points: Sequence[Point], gain: float, doing: str) -> None:
        for one in self.evaluator.solve(points):
            self.solved[one.point] = one
        self.tell(Step(len(self.solved), self.best, gain, doing))

    def _learn(self) -> None:
        self.belief = believe(self.space, list(self.solved.values()), self.before, self.belief)

    def _beside(self) -> list[Point]:
        """Unsolved neighbours of the best whose aim is or may be less."""
        best = self.best
        if best is None:
            return []
        points = [p for _, p in self.space.beside(best.point) if p not in self.solved and self._is_allowed(p)]
        if not points or self.before is None:
            return points
        assert self.belief is not None
        aims, errors = self.belief.aims(points, self.space.seen(points), exactly=True)
        return [p for p, aim, error in zip(points, aims, errors, strict=True)
                if aim - 4.0 * error < best.aim - 1e-9 * abs(best.aim)]

    def _promising(self, count: int) -> tuple[list[Point], float, float]:
        """The points to be solved next, the gain expected of the first as a share of the best aim, and its probability
        of meeting the limits."""
        assert self.belief is not None
        best = self.best
        belief, least = self.belief, math.inf if best is None else best.aim
        candidates = self._candidates(belief, least)
        chosen: list[Point] = []
        first_gain, first_chance = 0.0, 0.0
        for _ in range(count):
            found = self._first_allowed(belief, candidates, least, chosen)
            if found is None:
                break
            point, gain, chance = found
            if not chosen:
                first_gain, first_chance = gain / max(abs(least), 1e-300) if best else math.inf, chance
            chosen.append(point)
            belief = self.belief.supposing(chosen)
        return chosen, first_gain, first_chance

    def _first_allowed(self, belief: Belief, candidates: list[Point], least: float, but: Sequence[Point]
                       ) -> tuple[Point, float, float] | None:
        if not candidates:
            return None
        rough, chances = belief.gain(candidates, least)
        order = np.lexsort((-chances, -rough))
        asked = 0
        likely: list[Point] = []
        for k in order:
            point = candidates[k]
            if point in but:
                continue
            asked += point not in self.allowed
            if self._is_allowed(point):
                likely.append(point)
            if len(likely) == EXACTLY or asked == MOST_ASKED:
                break
        if not likely:
            return None
        gains, chances = belief.gain(likely, least, exactly=True)
        k = int(np.lexsort((-chances, -gains))[0])
        return likely[k], float(gains[k]), float(chances[k])

    def _candidates(self, belief: Belief, least: float) -> list[Point]:
        """Unsolved points that are not known to be left out."""
        if self.every is not None:
            found = self.every
        else:
            found = list(islice(self.space.spread(int(self.rng.integers(2**31))), MANY))
            best = sorted((one for one in self.solved.values() if one.meets), key=lambda one: one.aim)[:3]
            for one in best:
                for reach in REACHES:
                    found += self.space.near(one.point, reach, 50, self.rng)
                found += [p for _, p in self.space.beside(one.point)]
            for reach in REACHES:
                found = [p for p in dict.fromkeys(found) if self._open(p)]
                if not found:
                    break
                gains, chances = belief.gain(found, least)
                top = [found[k] for k in np.lexsort((-chances, -gains))[:6]]
                for point in top:
                    found += self.space.near(point, reach, 40, self.rng)
        return [p for p in dict.fromkeys(found) if self._open(p)]

    def _open(self, point: Point) -> bool:
        return point not in self.solved and self.allowed.get(point, True)
