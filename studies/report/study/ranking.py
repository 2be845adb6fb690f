"""Which variants meet every limit, which is the best of them and why, and which miss by least."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from studies.report.study.data import Row, StudyData
from studies.vary.outcome import Held, Outcome

LARGER = ("yield_factor", "frequency", "buckling_factor")
"""Figures of which more is better; of every other one less is."""


def larger_is_better(figure: str) -> bool:
    """``frequency_2`` and ``yield_factor`` yes, ``mass`` and ``stress@cable`` no."""
    return figure.startswith(LARGER)


def finished(rows: Iterable[Row]) -> list[Row]:
    """Rows whose variant was evaluated."""
    return [row for row in rows if row.outcome is not None and row.outcome.status == "finished"]


def is_suspicious(outcome: Outcome) -> bool:
    """A pair of figures, or a check, that nothing explains."""
    return outcome.judgement == "suspicious" or bool(outcome.suspicions)


def meets_all(outcome: Outcome) -> bool:
    """Every limit is met; true where none was set."""
    return outcome.status == "finished" and all(held.verdict == "met" for held in outcome.limits)


def limits_word(outcome: Outcome) -> str:
    """The worst word of its limits: ``missed``, ``not established``, ``met``; empty where none was set."""
    words = {held.verdict for held in outcome.limits}
    return next((word for word in ("missed", "not established", "met") if word in words), "")


def governing(outcome: Outcome) -> Held | None:
    """The limit of which least is left, or that is missed by most; None where none has a margin."""
    known = [held for held in outcome.limits if held.margin is not None]
    return min(known, key=lambda held: held.margin if held.margin is not None else math.inf, default=None)


def figure_of(held: Held) -> str:
    """``stress`` of a limit on ``stress (established basis)``."""
    return held.quantity.partition(" (")[0]


def at_most(held: Held) -> bool:
    """True for a limit that the figure must not be above."""
    if held.found is None or held.margin is None or abs(held.found) == held.given:
        return not larger_is_better(figure_of(held))
    return (abs(held.found) < held.given) == (held.margin > 0)


def by_aim(rows: Iterable[Row], most: bool = False) -> list[Row]:
    """The best first: the least, or the greatest where `most`. Of those equal in five digits the one that has more left
    of its limits; those without a value last."""

    def order(row: Row) -> tuple[float, float, int]:
        held = governing(row.outcome) if row.outcome is not None else None
        left = held.margin if held is not None and held.margin is not None else 0.0
        value = math.inf if row.aim is None else float(f"{row.aim:.4e}") * (-1.0 if most else 1.0)
        return value, -left, row.number

    return sorted(rows, key=order)


@dataclass(frozen=True, slots=True)
class Ranking:
    """The outcome of a study.

    Attributes
    ----------
    meeting
        Variants that meet every limit, the best first; suspicious ones are among them.
    chosen
        The best of those without a suspicion; None when there is none.
    passed_over
        Suspicious ones that rank before `chosen`.
    misses
        All others that finished: the nearest miss first. One with a limit that is not established comes after all
        that are known to miss by no more than the whole limit.
    """

    meeting: tuple[Row, ...]
    chosen: Row | None
    passed_over: tuple[Row, ...]
    misses: tuple[Row, ...]


def rank(data: StudyData) -> Ranking:
    """Order the finished variants of a study."""
    done = [(row, row.outcome) for row in finished(data.rows) if row.outcome is not None]
    meeting = by_aim((row for row, outcome in done if meets_all(outcome)), data.most)
    chosen = next((row for row in meeting if row.aim is not None and row.outcome is not None
                   and not is_suspicious(row.outcome)), None)
    before = meeting[:meeting.index(chosen)] if chosen is not None else meeting
    misses = sorted((row for row, outcome in done if not meets_all(outcome)), key=_how_far)
    return Ranking(tuple(meeting), chosen, tuple(before), tuple(misses))


def _how_far(row: Row) -> tuple[float, float, int]:
    outcome = row.outcome
    margins = [held.margin for held in outcome.limits if held.margin is not None] if outcome is not None else []
    unknown = outcome is None or any(held.verdict == "not established" for held in outcome.limits)
    short = max(0.0, -min(margins, default=1.0))
    if unknown:
        short = max(short, 1.0)
    return short, math.inf if row.aim is None else row.aim, row.number


def level(row: Row, name: str) -> str:
    """One value of one row, such that equal values give equal texts."""
    return f"{row.numbers[name]:.12g}" if name in row.numbers else str(row.values.get(name))


def levels(data: StudyData, name: str) -> list[str]:
    """The values that one varied thing takes: in order of size, or as they come where it has none."""
    numbers: dict[str, float] = {}
    for row in data.rows:
        numbers.setdefault(level(row, name), row.numbers.get(name, math.nan))
    if any(math.isnan(value) for value in numbers.values()):
        return list(numbers)
    return sorted(numbers, key=lambda text: numbers[text])


def neighbours(data: StudyData, row: Row) -> list[tuple[str, Row]]:
    """Variants one step away in one varied value, with its name. None for sampled plans, which have no steps."""
    if data.sampling not in ("grid", "one at a time"):
        return []
    names = [axis.name for axis in data.axes]
    places = {tuple(level(other, name) for name in names): other for other in data.rows}
    here = tuple(level(row, name) for name in names)
    found = []
    for i, axis in enumerate(data.axes):
        steps = levels(data, axis.name)
        at = steps.index(here[i])
        near = [at - 1, at + 1] if axis.numeric else [k for k in range(len(steps)) if k != at]
        for k in near:
            if 0 <= k < len(steps):
                other = places.get((*here[:i], steps[k], *here[i + 1:]))
                if other is not None:
                    found.append((axis.name, other))
    return found


def at_the_edge(data: StudyData, row: Row) -> list[tuple[str, str]]:
    """Numeric values of a row that are the ``least`` or the ``largest`` tried: better ones may lie outside."""
    found = []
    for axis in data.axes:
        tried = [other.numbers[axis.name] for other in data.rows if axis.name in other.numbers]
        if axis.numeric and axis.name in row.numbers and min(tried) < max(tried):
            here = row.numbers[axis.name]
            if here in (min(tried), max(tried)):
                found.append((axis.name, "least" if here == min(tried) else "largest"))
    return found


def best_front(points: Sequence[tuple[float, float]], better: tuple[Callable[[float], float], Callable[[float], float]]
               ) -> list[int]:
    """Indices of the points that no other point beats in both senses, along the front.

    `better` turns each coordinate into one of which less is better.
    """
    turned = [(better[0](x), better[1](y)) for x, y in points]
    front: list[int] = []
    for i in sorted(range(len(turned)), key=lambda i: turned[i]):
        if not front or turned[i][1] < turned[front[-1]][1]:
            front.append(i)
    return front
