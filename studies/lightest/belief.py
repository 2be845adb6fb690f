"""What the solved points make believe of the others: the aim, each limit, and whether a point is sound at all."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from scipy.special import ndtr

from studies.lightest.evaluator import Solved
from studies.lightest.space import Point, Space
from studies.lightest.surrogate import Surrogate, fit, with_more

LEAST_USED = 1e-4
"""Share of a limit below which it makes no difference how little is used: its logarithm is cut off there."""

SMOOTH = 100
"""Points at which an aim that needs no solve is looked up to see its course."""

MOST_LOOKED_UP = 250
EXACT = 1e-7
"""Relative difference between the aim before and after a solve that is rounding."""

REACH, TRUST = 0.2, 0.95
"""How near (in what is seen) an unsound point makes others doubtful, and how sound one is believed without any."""


@dataclass
class AimBefore:
    """An aim that needs no solve: looked up where it matters, and smoothed between."""

    look_up: Callable[[Point], float | None]
    space: Space
    seed: int
    known: dict[Point, float] = field(default_factory=dict)
    _course: Surrogate | None = None
    _seen_of: int = 0

    def exactly(self, points: Sequence[Point]) -> np.ndarray:
        """(points,) the aim; infinite where there is none."""
        for point in points:
            if point not in self.known:
                value = self.look_up(point)
                self.known[point] = math.inf if value is None or math.isnan(value) else value
        return np.array([self.known[point] for point in points])

    def about(self, points: Sequence[Point], seen: np.ndarray) -> np.ndarray:
        """(points,) the aim from its course; exactly where it was looked up before."""
        if self._course is None:
            spread = self.space.spread(self.seed)
            self.exactly([next(spread) for _ in range(SMOOTH)])
        if self._course is None or len(self.known) > self._seen_of:
            last = [(p, v) for p, v in self.known.items() if math.isfinite(v)]
            last = last[:SMOOTH] + last[SMOOTH:][-(MOST_LOOKED_UP - SMOOTH):]
            at, values = self.space.seen([p for p, _ in last]), np.array([v for _, v in last])
            self._course = fit(at, values) if self._course is None else with_more(self._course, at, values)
            self._seen_of = len(self.known)
        mean, _ = self._course.predict(seen)
        return np.array([self.known.get(p, m) for p, m in zip(points, mean, strict=True)])


@dataclass
class Belief:
    """Everything believed after some solves.

    Attributes
    ----------
    limits
        Limit -> surrogate of the logarithm of the share used: 0 is the limit itself.
    aim
        Surrogate of the aim; where there is one before a solve, of the logarithm of their ratio.
    logs
        `aim` is that of a logarithm.
    """

    space: Space
    solved: Sequence[Solved]
    limits: dict[str, Surrogate]
    aim: Surrogate | None
    logs: bool
    before: AimBefore | None
    factor: float
    """Aim after a solve over that before it, where that is the same everywhere."""

    def meeting(self, seen: np.ndarray) -> np.ndarray:
        """(points,) probability of being sound and meeting every limit, taken as independent of one another."""
        chance = self._sound(seen)
        for surrogate in self.limits.values():
            mean, error = surrogate.predict(seen)
            chance = chance * ndtr(-mean / np.maximum(error, 1e-9))
        return chance

    def _sound(self, seen: np.ndarray) -> np.ndarray:
        """(points,) probability that nothing fails or is suspicious: the share among solved points near by, with the
        trust in any point as one more."""
        at = self.space.seen([one.point for one in self.solved])
        far = ((seen[:, None, :] - at[None, :, :]) ** 2).sum(axis=2)
        weight = np.exp(-far / (2.0 * REACH**2))
        sound = np.array([one.sound for one in self.solved], dtype=float)
        return (TRUST + weight @ sound) / (1.0 + weight.sum(axis=1))

    def aims(self, points: Sequence[Point], seen: np.ndarray, exactly: bool = False) -> tuple[np.ndarray, np.ndarray]:
        """Mean and standard deviation of the aim, each (points,)."""
        base = np.full(len(points), self.factor)
        if self.before is not None:
            base = base * (self.before.exactly(points) if exactly else self.before.about(points, seen))
        if self.aim is None:
            return base, np.zeros(len(points))
        mean, error = self.aim.predict(seen)
        if not self.logs:
            return mean, error
        value = base * np.exp(mean)
        return value, np.abs(value) * error

    def gain(self, points: Sequence[Point], best: float, exactly: bool = False) -> tuple[np.ndarray, np.ndarray]:
        """Expected constrained improvement on `best`, and probability of meeting the limits, each (points,)
        (M. Schonlau, W. J. Welch, D. R. Jones, "Global versus local search in constrained optimization of computer
        models", Inst. Math. Stat. LNMS 34 (1998) 11-25). Without a `best` (infinite) the aim counts against the
        greatest of the points."""
        seen = self.space.seen(points)
        mean, error = self.aims(points, seen, exactly)
        chance = self.meeting(seen)
        if not math.isfinite(best):
            best = float(np.max(mean[np.isfinite(mean)], initial=0.0))
            best += 0.05 * abs(best)
        return _improvement(best, mean, error) * chance, chance

    def supposing(self, points: Sequence[Point]) -> Belief:
        """The belief if these turned out as they are expected to: for the choice of the next ones beside them."""
        seen = self.space.seen(points)
        limits = {}
        for name, surrogate in self.limits.items():
            of = [one for one in self.solved if name in one.used]
            at = np.vstack([self.space.seen([one.point for one in of]), seen])
            values = np.concatenate([_logs([one.used[name] for one in of]), surrogate.predict(seen)[0]])
            limits[name] = with_more(surrogate, at, values)
        return Belief(self.space, self.solved, limits, self.aim, self.logs, self.before, self.factor)


def _improvement(best: float, mean: np.ndarray, error: np.ndarray) -> np.ndarray:
    gain = best - np.where(np.isfinite(mean), mean, best)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        z = np.where(error > 0.0, gain / np.maximum(error, 1e-300), 0.0)
        spread = gain * ndtr(z) + error * np.exp(-np.clip(z, -38.0, 38.0) ** 2 / 2.0) / math.sqrt(2.0 * math.pi)
    return np.maximum(np.where(error > 0.0, spread, gain), 0.0)


def _logs(shares: Sequence[float]) -> np.ndarray:
    return np.log(np.maximum(np.asarray(shares, dtype=float), LEAST_USED))


def believe(space: Space, solved: Sequence[Solved], before: AimBefore | None, last: Belief | None = None) -> Belief:
    """What the solved points make believe. `last`: the belief before, from whose surrogates the new ones start."""
    names = dict.fromkeys(name for one in solved for name in one.used)
    limits = {}
    for name in names:
        of = [one for one in solved if name in one.used]
        if len(of) < 2:
            continue
        theta = last.limits[name].model.kernel_.theta if last is not None and name in last.limits else None
        limits[name] = fit(space.seen([one.point for one in of]), _logs([one.used[name] for one in of]), theta)
    aim, logs, factor = _aim(space, [one for one in solved if math.isfinite(one.aim)], before, last)
    return Belief(space, solved, limits, aim, logs, before, factor)


def _aim(space: Space, of: Sequence[Solved], before: AimBefore | None, last: Belief | None
         ) -> tuple[Surrogate | None, bool, float]:
    """Surrogate of the aim, whether it is one of a logarithm, and the factor on the aim before."""
    values = np.array([one.aim for one in of])
    if before is not None and len(of):
        ratios = values / before.exactly([one.point for one in of])
        usual = float(np.median(ratios)) if np.all(np.isfinite(ratios)) else 1.0
        if np.ptp(ratios) <= EXACT * abs(usual) or not np.all(ratios > 0.0):
            return None, False, usual
        values = ratios
    elif before is not None:
        return None, False, 1.0
    if len(of) < 2:
        return None, False, math.nan
    logs = bool(np.all(values > 0.0))
    theta = last.aim.model.kernel_.theta if last is not None and last.aim is not None and last.logs == logs else None
    return fit(space.seen([one.point for one in of]), np.log(values) if logs else values, theta), logs, 1.0
