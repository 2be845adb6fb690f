"""What each dimension does at the winner: how much of each limit a step buys or takes, and what it costs."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from geometry.spec.text.units import UNITS
from studies.lightest.search import Found
from studies.lightest.space import Dimension, Point, Space


class VariedLike(Protocol):
    """What is read of one varied thing."""

    @property
    def written_in(self) -> str: ...
    @property
    def values(self) -> tuple[object, ...]: ...


@dataclass(frozen=True)
class Slope:
    """A step of one dimension at the winner.

    Attributes
    ----------
    name
        Of the dimension.
    start, end
        Numbers between which the difference was taken (base units), the winner's first; of words their places.
    unit, per
        Unit of one step of size 1 (``mm``), and that unit in base units. Of words: "" and 1.
    aim
        Change of the aim for one more of `unit` (of words: for the change), and its error (None: solved, or exact).
    limits
        Limit -> (change of the share used for one more of `unit`, error; None where both ends were solved).
    solved
        The neighbour was solved; otherwise the surrogates tell.
    """

    name: str
    start: float
    end: float
    unit: str
    per: float
    aim: tuple[float, float | None]
    limits: Mapping[str, tuple[float, float | None]]
    solved: bool


def slopes(space: Space, found: Found, varied: Mapping[str, VariedLike]) -> Iterator[Slope]:
    """For each dimension one slope, towards a neighbour that was solved if there is one; of words one for each other
    choice."""
    best = found.best
    if best is None:
        return
    solved = {one.point: one for one in found.solved if one.used}
    for k, one in enumerate(space.dimensions):
        beside = [point for at, point in space.beside(best.point) if at == k]
        usable = [point for point in beside if point in solved]
        if one.words:
            chosen = beside
        else:
            chosen = (usable or sorted(beside, reverse=True))[:1]
        for point in chosen:
            yield _slope(space, found, one, k, point, point in solved, varied[one.name])


def _slope(space: Space, found: Found, one: Dimension, k: int, point: Point, solved: bool, varied: VariedLike) -> Slope:
    assert found.best is not None
    unit = "" if one.words else varied.written_in
    per = UNITS[unit].value if unit else 1.0
    start, end = one.number(found.best.point[k]), one.number(point[k])
    steps = 1.0 if one.words else (end - start) / per
    changes: dict[str, tuple[float, float | None]] = {}
    for name, share in found.best.used.items():
        there = next((s.used.get(name) for s in found.solved if s.point == point), None) if solved else None
        if there is not None:
            changes[name] = ((there - share) / steps, None)
        elif name in found.belief.limits:
            mean, error = found.belief.limits[name].difference(space.seen([found.best.point, point]))
            changes[name] = (share * math.expm1(mean) / steps, abs(share * math.exp(mean) * error / steps))
    return Slope(one.name, start, end, unit, per, _aim(space, found, point, steps), changes, solved)


def _aim(space: Space, found: Found, point: Point, steps: float) -> tuple[float, float | None]:
    assert found.best is not None
    for one in found.solved:
        if one.point == point and math.isfinite(one.aim):
            return (one.aim - found.best.aim) / steps, None
    mean, error = found.belief.aims([point], space.seen([point]), exactly=True)
    exact = found.belief.before is not None and found.belief.aim is None
    return float((mean[0] - found.best.aim) / steps), None if exact else float(np.abs(error[0] / steps))
