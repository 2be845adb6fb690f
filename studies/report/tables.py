"""The rows of the summary and of the terminal: which pairs to show, and how to write a number."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from fem.figure import FigureKey
from studies.check.result import CheckResult, LimitVerdict, Pair
from studies.check.words import JudgementWord

MARKS: dict[str, str] = {
    "agrees": "=", "explained": "~", "suspicious": "!", "load check": "o", "no beam value": "-",
    "met": "=", "missed": "!", "not established": "?",
}
"""A mark beside each word, for those who skim."""

READABLE = {"N mm": (1e-3, "N m"), "t": (1e3, "kg"), "rad": (1e3, "mrad"), "1": (1.0, "")}
"""Units of the result -> factor and the unit a person reads."""

ORDER: tuple[JudgementWord, ...] = ("suspicious", "explained", "agrees", "load check", "no beam value")
"""From the word that a row of several takes first to the last."""

SECTION_KINDS = ("section_force", "section_moment", "nominal_stress")
"""Quantities that both models give at stations only: shown by their largest value."""


MODE_KINDS = ("natural_frequency", "buckling_factor")
"""Quantities that have tables of their own."""


def digits(value: float) -> str:
    """Four significant digits; whole numbers below ten million without a power of ten: ``15000``, not ``1.5e+04``."""
    text = f"{value:.4g}"
    return f"{float(text):.0f}" if "e+" in text and abs(value) < 1e7 else text


def readable(value: float | None, unit: str) -> str:
    """``12.35 N m`` from 12345 N mm; a dash for no value."""
    if value is None:
        return "-"
    factor, shown = READABLE.get(unit, (1.0, unit))
    return f"{digits(factor * value)} {shown}".rstrip()


def number(value: float | None, unit: str) -> str:
    """As `readable`, without the unit."""
    return "-" if value is None else digits(READABLE.get(unit, (1.0, ""))[0] * value)


def shown_unit(unit: str) -> str:
    """The unit that `number` is in."""
    return READABLE.get(unit, (1.0, unit))[1]


def marked(word: str) -> str:
    """``! suspicious``."""
    return f"{MARKS[word]} {word}"


def name_of(key: FigureKey) -> str:
    """``displacement z at arm.end``."""
    quantity = key.quantity.replace("_", " ")
    place = f" at {key.place}" if key.place else ""
    return f"{quantity}{' ' + key.component if key.component else ''}{place}"


@dataclass(frozen=True, slots=True)
class Tally:
    """All pairs of one quantity in one case: the worst of them against its band."""

    quantity: str
    count: int
    words: dict[str, int]
    worst: Pair | None
    """The pair whose remainder is the largest part of its band; None when none could be compared."""

    @property
    def word(self) -> JudgementWord:
        return next(word for word in ORDER if self.words.get(word))


def remainder(pair: Pair) -> float | None:
    """Difference less what its causes predict, in the unit of the pair."""
    if pair.difference is None:
        return None
    return pair.difference - sum(cause.predicted for cause in pair.causes)


def tallies(result: CheckResult, case: str) -> list[Tally]:
    """One row for each quantity of a case."""
    groups: dict[str, list[Pair]] = {}
    for pair in result.pairs:
        if pair.key.case == case and pair.key.quantity not in MODE_KINDS:
            groups.setdefault(pair.key.quantity, []).append(pair)
    rows = []
    for quantity, pairs in groups.items():
        ranked = [(abs(rest) / pair.band, i) for i, pair in enumerate(pairs)
                  if pair.judgement in ("agrees", "explained", "suspicious")
                  and (rest := remainder(pair)) is not None and pair.band > 0]
        worst = pairs[max(ranked)[1]] if ranked else None
        rows.append(Tally(quantity, len(pairs), dict(Counter(pair.judgement for pair in pairs)), worst))
    return rows


def headlines(result: CheckResult, case: str) -> list[Pair]:
    """The pairs a person asks for first.

    Ends, named places, supports, cuts and whole-part figures that are not next to nothing, then the station
    with the largest value of each section force, moment and stress.
    """
    ours = [pair for pair in result.pairs if pair.key.case == case and pair.key.quantity not in MODE_KINDS]
    largest: dict[str, float] = {}
    for pair in ours:
        largest[pair.key.quantity] = max(largest.get(pair.key.quantity, 0.0), _size(pair))
    rows = [pair for pair in ours if "@" not in pair.key.place or pair.key.quantity == "notch_stress"]
    for quantity in SECTION_KINDS:
        rows += _largest([pair for pair in ours if pair.key.quantity == quantity])
    return [pair for pair in rows if pair.judgement in ("suspicious", "explained")
            or _size(pair) > 1e-3 * largest[pair.key.quantity]]


def _largest(pairs: Sequence[Pair]) -> list[Pair]:
    """The largest pair of each component, of those that the judge could compare when there are any.

    Sizes count to four digits, so that rounding does not choose among equal stations: the first one is taken.
    """
    best: dict[str, Pair] = {}
    for pair in sorted(pairs, key=lambda pair: (pair.judgement == "no beam value", -float(f"{_size(pair):.3e}"))):
        best.setdefault(pair.key.component, pair)
    return list(best.values())


def _size(pair: Pair) -> float:
    return max(abs(value) for value in (pair.solid, pair.beam, 0.0) if value is not None)


def suspicious(result: CheckResult) -> list[Pair]:
    """The suspicious pairs, the worst first."""
    found = [pair for pair in result.pairs if pair.judgement == "suspicious"]
    return sorted(found, key=lambda pair: -abs(remainder(pair) or 0.0) / pair.band if pair.band > 0 else 0.0)


def counts(result: CheckResult) -> Counter[str]:
    """How many figures were given each word; of a travelling load those of every position."""
    positions = tuple(f"{travel.case}@" for travel in result.travels)
    words: Counter[str] = Counter(p.judgement for p in result.pairs if not p.key.case.startswith(positions or ("\0",)))
    for row in result.envelopes:
        words.update(row.words)
    return words


def verdict(result: CheckResult) -> str:
    """The run in one sentence or two."""
    words = counts(result)
    compared = words["agrees"] + words["explained"] + words["suspicious"]
    limits: Counter[str] = Counter(limit.verdict for limit in result.limits)
    failed = [check.name for check in result.checks if not check.ok]
    text = f"{marked(result.judgement)}: of {compared} compared figures {words['agrees']} agree, " \
           f"{words['explained']} are explained, {words['suspicious']} are suspicious"
    text += f"; failed checks: {', '.join(failed)}" if failed else ""
    text += "; " + _limits_in_words(result.limits, limits) if result.limits else "; no limits were set"
    return text + "."


def _limits_in_words(rows: Sequence[LimitVerdict], counts: Counter[str]) -> str:
    if counts["met"] == len(rows):
        return f"all {len(rows)} limits are met" if len(rows) > 1 else "the limit is met"
    told = [f"{limit.name} {limit.verdict}" for limit in rows if limit.verdict != "met"]
    return "limits: " + ", ".join(told) + f"; {counts['met']} of {len(rows)} met"
