"""What a study has found: the best that meet every limit, what is suspicious and why, what failed and why."""

from __future__ import annotations

import math
import re
from collections import Counter
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Protocol

from studies.record import Point
from studies.vary.outcome import Kept, Outcome

MOST_SHOWN = 5


@dataclass(frozen=True, slots=True)
class Ranked:
    """One finished variant and what it is ranked by.

    Attributes
    ----------
    aim
        Value of the plan's aim in base units; NaN where a figure that it needs has no value.
    cost
        What it is ranked by, least first: the aim, or its negative where more is better; infinite without a value.
    margin
        Least of the margins of its limits, as a share of the limit (negative: missed); None without limits.
    """

    number: int
    key: str
    values: Mapping[str, Any]
    numbers: Mapping[str, float]
    aim: float
    cost: float
    margin: float | None
    judgement: str
    fine: bool
    figures: Mapping[str, Kept]


@dataclass(frozen=True, slots=True)
class Failure:
    """One point whose variant failed: where and why."""

    number: int
    stage: str
    reason: str


@dataclass(frozen=True)
class Summary:
    """What became of a study.

    Attributes
    ----------
    points
        Points that the plan makes, those left out not counted.
    counts
        Judgement, or ``failed`` -> number of points that are done.
    fine
        Points with nothing suspicious and every limit met.
    left_out
        Why points of the plan are no variants -> how many.
    reused
        Points whose outcome was in the record before, or is that of another point.
    evaluated
        Variants that this call evaluated.
    interrupted
        Signal or reason that stopped it before its end; empty when every point is done.
    best
        The best of the fine ones, at most five.
    nearest
        Of those that are not fine the one that is nearest to meeting its limits.
    suspicions
        Reasons why variants are suspicious -> how many of them, the commonest first.
    kept
        Run folders that this call wrote.
    """

    record: Path
    points: int
    counts: Mapping[str, int]
    fine: int
    left_out: Mapping[str, int]
    reused: int
    evaluated: int
    seconds: float
    interrupted: str = ""
    best: tuple[Ranked, ...] = ()
    nearest: Ranked | None = None
    suspicions: Mapping[str, int] = field(default_factory=dict)
    failures: tuple[Failure, ...] = ()
    safer: int = 0
    kept: tuple[Path, ...] = ()

    @property
    def done(self) -> int:
        return sum(self.counts.values())

    @property
    def failed(self) -> int:
        return self.counts.get("failed", 0)


class AimLike(Protocol):
    """What the ranking needs of a plan's aim."""

    def value(self, figures: Mapping[str, float | None], numbers: Mapping[str, float]) -> float: ...
    def cost(self, figures: Mapping[str, float | None], numbers: Mapping[str, float]) -> float: ...


def ranked(point: Point, outcome: Outcome, aim: AimLike) -> Ranked:
    """Rank one finished outcome: by the solid model's figures, where it has them."""
    figures = {name: kept.beam if kept.solid is None else kept.solid for name, kept in outcome.figures.items()}
    cost = aim.cost(figures, point.numbers)
    margins = [held.margin for held in outcome.limits if held.margin is not None]
    return Ranked(point.number, point.key, point.values, point.numbers, aim.value(figures, point.numbers),
                  math.inf if math.isnan(cost) else cost, min(margins, default=None), outcome.judgement, outcome.fine,
                  outcome.figures)


class Findings:
    """Collects from outcomes one by one what a summary tells; what is not among the first is let go."""

    def __init__(self, aim: AimLike, best: int = 0, worst: int = 0, suspicious: int = 0) -> None:
        self._aim = aim
        self._best, self._worst, self._suspicious = max(best, MOST_SHOWN), worst, suspicious
        self.best: list[Ranked] = []
        self.worst: list[Ranked] = []
        self.suspicious: list[Ranked] = []
        self.suspicions: Counter[str] = Counter()
        self.failures: list[Failure] = []
        self.nearest: Ranked | None = None
        self.fine = self.safer = 0

    def add(self, point: Point, outcome: Outcome) -> None:
        """One point that is done."""
        self.safer += outcome.safer_mesh
        if outcome.status == "failed":
            self.failures.append(Failure(point.number, outcome.stage, outcome.reason))
            return
        row = ranked(point, outcome, self._aim)
        self.worst = _first([*self.worst, row], self._worst, _worst_first)
        if outcome.fine:
            self.fine += 1
            self.best = _first([*self.best, row], self._best, _best_first)
        else:
            rows = [row] if self.nearest is None else [self.nearest, row]
            self.nearest = max(rows, key=lambda row: -math.inf if row.margin is None else row.margin)
        if outcome.judgement == "suspicious":
            self.suspicious = _first([*self.suspicious, row], self._suspicious, _best_first)
            self.suspicions.update({reason(text) for text in outcome.suspicions if not text.startswith("and ")})


def reason(text: str) -> str:
    """A suspicion without what differs from variant to variant: values, and the station of a member."""
    return re.sub(r"@\d[\d.e+-]*", "@…", text.partition(": ")[0])


def _best_first(row: Ranked) -> tuple[float, int]:
    return row.cost, row.number


def _worst_first(row: Ranked) -> tuple[float, float, int]:
    """Furthest from meeting its limits; without limits the one that is worst by the aim."""
    return (math.inf if row.margin is None else row.margin, -row.cost, row.number)


def _first(rows: list[Ranked], most: int, order: Callable[[Ranked], Any]) -> list[Ranked]:
    return sorted(rows, key=order)[:most]


def to_keep(findings: Findings, best: int) -> list[Ranked]:
    """The variants whose whole run is kept, each once."""
    rows = {row.number: row for row in (*findings.best[:best], *findings.worst, *findings.suspicious)}
    return list(rows.values())
