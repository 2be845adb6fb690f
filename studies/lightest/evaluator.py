"""What a search asks about points, and what it is told."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Protocol

from studies.lightest.space import Point


@dataclass(frozen=True)
class Solved:
    """What became of one point.

    Attributes
    ----------
    aim
        What is to be least; NaN when it could not be found.
    used
        Limit -> share of it that is used: up to 1 it is met. Of a limit that is a least value, the least value over
        what was found. Only of limits for which a figure was found.
    sound
        Nothing failed, nothing is suspicious, every limit is established. Otherwise it does not count as meeting the
        limits, whatever `used` says, and `why` says why.
    """

    point: Point
    aim: float
    used: Mapping[str, float]
    sound: bool = True
    why: str = ""
    number: int = field(default=0, compare=False)

    @property
    def meets(self) -> bool:
        """Every limit is met, and nothing speaks against it."""
        return self.sound and all(share <= 1.0 for share in self.used.values())


class Evaluator(Protocol):
    """What a search works on."""

    def allowed(self, point: Point) -> bool:
        """Whether there is such a variant at all. Needs no solve."""

    def aim_before(self, point: Point) -> float | None:
        """The aim without a solve, exactly or nearly; None where it takes one. The same kind of answer everywhere."""

    def solve(self, points: Sequence[Point]) -> Sequence[Solved]:
        """Evaluate points; in their order."""
