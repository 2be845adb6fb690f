"""What ran, what failed, what was left out, and what was suspicious: counts with their commonest reasons."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass

from studies.report.study.data import Row, StudyData
from studies.report.study.ranking import finished, governing, is_suspicious, limits_word


@dataclass(frozen=True, slots=True)
class Reason:
    """One reason, with how many variants have it and the first few of them."""

    text: str
    count: int
    numbers: tuple[int, ...]
    stage: str = ""


@dataclass(frozen=True, slots=True)
class LimitCount:
    """How one limit came out over all finished variants."""

    name: str
    met: int
    missed: int
    unknown: int
    governs: int
    """Variants of which it has the least margin."""


@dataclass(frozen=True, slots=True)
class Counts:
    """A study in numbers. `points` are the rows; several may be one and the same variant."""

    points: int
    waiting: int
    finished: int
    failed: int
    judgements: dict[str, int]
    limits: dict[str, int]
    repeated: int
    safer: int
    failures: tuple[Reason, ...]
    suspicions: tuple[Reason, ...]
    by_limit: tuple[LimitCount, ...]


def count(data: StudyData) -> Counts:
    """Count a study."""
    outcomes = [(row, row.outcome) for row in data.rows if row.outcome is not None]
    failed = [(row, outcome) for row, outcome in outcomes if outcome.status == "failed"]
    done = [(row, outcome) for row, outcome in outcomes if outcome.status == "finished"]
    judgements = Counter("suspicious" if is_suspicious(outcome) else outcome.judgement for _, outcome in done)
    limits = Counter(limits_word(outcome) for _, outcome in done)
    return Counts(
        points=len(data.rows), waiting=len(data.rows) - len(outcomes), finished=len(done), failed=len(failed),
        judgements={word: judgements[word] for word in ("agrees", "explained", "suspicious")},
        limits={word: limits[word] for word in ("met", "missed", "not established", "") if limits[word]},
        repeated=len(outcomes) - len({outcome.key for _, outcome in outcomes}),
        safer=sum(outcome.safer_mesh for _, outcome in outcomes),
        failures=reasons((row, outcome.stage, outcome.reason) for row, outcome in failed),
        suspicions=reasons((row, "", what) for row, outcome in done
                           for what in dict.fromkeys(text.partition(": ")[0] for text in outcome.suspicions)),
        by_limit=_limits(data),
    )


def reasons(found: Iterable[tuple[Row, str, str]]) -> tuple[Reason, ...]:
    """Group texts that differ in their numbers only; the commonest first, each in the words of its first."""
    groups: dict[tuple[str, str], tuple[str, list[int]]] = {}
    for row, stage, text in found:
        groups.setdefault((stage, alike(text)), (text, []))[1].append(row.number)
    rows = [Reason(text, len(set(numbers)), tuple(dict.fromkeys(numbers))[:5], stage)
            for (stage, _), (text, numbers) in groups.items()]
    return tuple(sorted(rows, key=lambda reason: -reason.count))


def alike(text: str) -> str:
    """The same for texts that differ in their numbers only; places (``arm@18``) are no such numbers."""
    return re.sub(r"(?<![\w.@])[-+]?\d[\d.,]*(?:e[-+]?\d+)?", "#", text)


def _limits(data: StudyData) -> tuple[LimitCount, ...]:
    words: dict[str, Counter[str]] = {}
    first: Counter[str] = Counter()
    for row in finished(data.rows):
        if row.outcome is not None:
            for held in row.outcome.limits:
                words.setdefault(held.name, Counter())[held.verdict] += 1
            nearest = governing(row.outcome)
            if nearest is not None:
                first[nearest.name] += 1
    return tuple(LimitCount(name, found["met"], found["missed"], found["not established"], first[name])
                 for name, found in words.items())
