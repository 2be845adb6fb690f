"""The variants as compact columns for the script of the page, which draws and lists them on demand."""

from __future__ import annotations

import math
import shlex
from collections.abc import Callable, Iterable
from typing import Any

from studies.report.study.data import StudyData
from studies.report.study.ranking import (
    Ranking,
    at_most,
    figure_of,
    finished,
    governing,
    is_suspicious,
    larger_is_better,
    levels,
    limits_word,
    meets_all,
)
from studies.report.study.words import factor_of, figure_words, plain_text
from studies.report.tables import MARKS, shown_unit
from studies.vary.outcome import Outcome

WORDS = ("agrees", "explained", "suspicious", "load check", "no beam value", "failed", "not run yet")
VERDICTS = ("met", "missed", "not established", "")


DIGITS = 7
"""Of the numbers that the page holds; it shows four."""


class Texts:
    """Each text once; columns hold its number."""

    def __init__(self) -> None:
        self.numbers: dict[str, int] = {}

    def number(self, text: str) -> int:
        return self.numbers.setdefault(text, len(self.numbers))

    def all(self, texts: Iterable[str]) -> list[int]:
        return [self.number(text) for text in texts]


def figure_units(data: StudyData) -> dict[str, str]:
    """Name of every kept figure -> its base unit: first the aim, then as the plan keeps them."""
    units: dict[str, str] = {}
    for row in finished(data.rows):
        if row.outcome is not None:
            for name, kept in row.outcome.figures.items():
                units.setdefault(name, kept.unit)
    if data.aim in units:
        units = {data.aim: units[data.aim], **units}
    return units


def default_pair(data: StudyData, ranking: Ranking) -> tuple[str, str]:
    """Figures that the trade-off shows first: the aim, and the figure of the limit that governs the best variant."""
    names = list(figure_units(data))
    aim = data.aim if data.aim in names else "aim"
    rows = [ranking.chosen] if ranking.chosen is not None else [*ranking.misses, *ranking.meeting]
    for row in rows:
        held = governing(row.outcome) if row is not None and row.outcome is not None else None
        if held is not None and figure_of(held) != aim:
            name = figure_of(held)
            return aim, name if name in names else f"left:{held.name}"
    others = [name for name in names if name != aim]
    return aim, others[0] if others else (data.axes[0].name if data.axes else aim)


def pack(data: StudyData, ranking: Ranking) -> dict[str, Any]:
    """Plain data, as the script reads them: one list a column, numbers in the units shown, `DIGITS` digits."""
    texts = Texts()
    units = figure_units(data)
    outcomes = [row.outcome for row in data.rows]
    places = {row.number: i for i, row in enumerate(data.rows)}
    first, second = default_pair(data, ranking)
    return {
        "again": f"haunch again {shlex.quote(data.record)}", "words": WORDS, "verdicts": VERDICTS, "marks": MARKS,
        "axes": [_axis(data, axis.name, texts) for axis in data.axes],
        "aim": {"figure": data.aim if data.aim in units else "", "words": "" if data.aim in units else data.aim,
                "unit": shown_unit(data.aim_unit), "most": data.most,
                "values": _aims(data)},
        "figures": [_figure(name, unit, outcomes) for name, unit in units.items()],
        "limits": _limits(outcomes, texts),
        "number": [row.number for row in data.rows],
        "word": [WORDS.index(_word(outcome)) for outcome in outcomes],
        "verdict": [VERDICTS.index(limits_word(o)) if o is not None and o.status == "finished" else -1
                    for o in outcomes],
        "meets": [int(o is not None and meets_all(o)) for o in outcomes],
        "suspicions": [texts.all(o.suspicions) if o is not None else [] for o in outcomes],
        "cautions": [texts.all(o.cautions) if o is not None else [] for o in outcomes],
        "stage": [texts.number(o.stage) if o is not None else -1 for o in outcomes],
        "reason": [texts.number(o.reason) if o is not None else -1 for o in outcomes],
        "safer": [texts.number(o.first_reason) if o is not None and o.safer_mesh else -1 for o in outcomes],
        "unknowns": [o.unknowns if o is not None else 0 for o in outcomes],
        "seconds": [_short(_seconds(o)) if o is not None else None for o in outcomes],
        "kept": {str(i): [row.run, list(row.pictures)] for i, row in enumerate(data.rows) if row.run},
        "ranking": [places[row.number] for row in ranking.meeting],
        "misses": [places[row.number] for row in ranking.misses],
        "chosen": places[ranking.chosen.number] if ranking.chosen is not None else -1,
        "first": first, "second": second,
        "texts": list(texts.numbers),
    }


def _axis(data: StudyData, name: str, texts: Texts) -> dict[str, Any]:
    axis = next(axis for axis in data.axes if axis.name == name)
    if axis.numeric:
        return {"name": name, "unit": axis.unit, "numeric": True, "factor": axis.factor,
                "values": [_short(axis.factor * row.numbers[name]) if name in row.numbers else None
                           for row in data.rows]}
    steps = levels(data, name)
    order = {text: i for i, text in enumerate(steps)}
    shown = {order[str(row.values.get(name))]: plain_text(row.values.get(name)) for row in data.rows
             if str(row.values.get(name)) in order}
    return {"name": name, "unit": "", "numeric": False, "levels": [shown.get(i, text) for i, text in enumerate(steps)],
            "values": [order.get(str(row.values.get(name))) for row in data.rows]}


def _aims(data: StudyData) -> list[float | None]:
    return [_short(factor_of(data.aim_unit) * row.aim) if row.aim is not None else None for row in data.rows]


def _figure(name: str, unit: str, outcomes: list[Outcome | None]) -> dict[str, Any]:
    kept = [o.figures.get(name) if o is not None else None for o in outcomes]
    factor = factor_of(unit)
    return {"name": name, "words": figure_words(name), "unit": shown_unit(unit),
            "better": "larger" if larger_is_better(name) else "smaller",
            "solid": [_short(factor * k.solid) if k is not None and k.solid is not None else None for k in kept],
            "beam": [_short(factor * k.beam) if k is not None and k.beam is not None else None for k in kept],
            "word": [WORDS.index(k.judgement) if k is not None else -1 for k in kept]}


def _limits(outcomes: list[Outcome | None], texts: Texts) -> list[dict[str, Any]]:
    names: dict[str, Any] = {}
    for outcome in outcomes:
        for held in outcome.limits if outcome is not None else ():
            if held.name not in names or names[held.name].found is None:
                names[held.name] = held
    return [_limit(name, example, outcomes, texts) for name, example in names.items()]


def _limit(name: str, example: Any, outcomes: list[Outcome | None], texts: Texts) -> dict[str, Any]:
    held = [next((h for h in o.limits if h.name == name), None) if o is not None else None for o in outcomes]
    factor = factor_of(example.unit)
    given = [_short(factor * h.given) if h is not None else None for h in held]
    one = set(given) - {None}

    def column(read: Callable[[Any], Any]) -> list[Any]:
        return [read(h) if h is not None else None for h in held]

    return {"name": name, "figure": figure_of(example), "words": example.quantity.replace("_", " "),
            "unit": shown_unit(example.unit), "most": at_most(example),
            "given": next(iter(one)) if len(one) == 1 else given,
            "found": column(lambda h: _short(factor * h.found) if h.found is not None else None),
            "left": column(lambda h: _short(100.0 * h.margin) if h.margin is not None else None),
            "verdict": column(lambda h: VERDICTS.index(h.verdict)),
            "reason": column(lambda h: texts.number(h.reason) if h.reason else -1)}


def _word(outcome: Outcome | None) -> str:
    if outcome is None:
        return "not run yet"
    if outcome.status == "failed":
        return "failed"
    return "suspicious" if is_suspicious(outcome) else outcome.judgement or "agrees"


def _seconds(outcome: Outcome) -> float:
    return float(outcome.seconds.get("wall", sum(outcome.seconds.values())))


def _short(value: float) -> float | int | None:
    """Few digits; None for what JSON has no number for."""
    if not math.isfinite(value):
        return None
    short = float(f"{value:.{DIGITS}g}")
    return int(short) if short == int(short) and abs(short) < 1e15 else short


