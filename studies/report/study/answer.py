"""Which variant to choose, and why: the sentences at the top of the page."""

from __future__ import annotations

import shlex
from dataclasses import dataclass, field

from studies.report.study.counts import Counts
from studies.report.study.data import Row, StudyData
from studies.report.study.ranking import (
    Ranking,
    at_most,
    at_the_edge,
    figure_of,
    governing,
    is_suspicious,
    limits_word,
    meets_all,
    neighbours,
)
from studies.report.study.words import (
    capital,
    counted,
    figure_words,
    held_text,
    listed,
    margin_text,
    percent,
    value_text,
)
from studies.report.tables import marked, readable
from studies.vary.outcome import Outcome


@dataclass(frozen=True, slots=True)
class Step:
    """A neighbour of the chosen variant."""

    number: int
    change: str
    aim: str
    difference: str
    limit: str
    word: str


@dataclass(frozen=True, slots=True)
class Answer:
    """The top of the page: a headline, the row it speaks of, and the reasons, one sentence each."""

    headline: str
    row: Row | None = None
    reasons: tuple[str, ...] = ()
    steps: tuple[Step, ...] = ()
    steps_text: str = ""
    command: str = ""
    title: str = "Variant"
    warnings: tuple[str, ...] = field(default=())


def answer(data: StudyData, ranking: Ranking, counts: Counts) -> Answer:
    """What a person should read first."""
    warnings = _warnings(counts)
    if not counts.finished:
        return Answer(_nothing(counts), warnings=warnings)
    if data.sampling == "as made":
        return _as_made(data, ranking, counts, warnings)
    if ranking.chosen is not None:
        return _chosen(data, ranking, ranking.chosen, warnings)
    if ranking.meeting:
        first = ranking.meeting[0]
        return Answer(
            f"Only suspicious variants meet every limit ({_numbers(ranking.meeting)}): none can be chosen as it is.",
            first, (f"Variant {first.number} would be {_best(data)}: {aim_text(data, first)}.",
                    "See why it is suspicious, below, and check it alone:"),
            command=again_command(data, first.number), warnings=warnings)
    return _none_meets(data, ranking, counts, warnings)


def _nothing(counts: Counts) -> str:
    if not counts.failed:
        return "Nothing has run yet."
    rest = f"; {counts.waiting} have not run yet" if counts.waiting else ""
    which = "The only variant" if counts.failed == 1 and not rest else f"All {counts.failed} variants that ran"
    return f"{which} failed: there is nothing to choose from{rest}. The reasons are below."


def _warnings(counts: Counts) -> tuple[str, ...]:
    found = []
    if counts.waiting and counts.finished + counts.failed:
        verb = "has" if counts.waiting == 1 else "have"
        found.append(f"{counts.waiting} of {counts.points} points {verb} not run yet. What is said here may change.")
    if counts.failed and counts.finished and counts.failed > 0.1 * counts.points:
        found.append(f"{counts.failed} of {counts.points} variants failed, and a better one may be among them.")
    return tuple(found)


def _best(data: StudyData) -> str:
    if data.aim == "mass" and not data.most:
        return "the lightest"
    return f"the one with the {'greatest' if data.most else 'least'} {_aim_noun(data)}"


def aim_text(data: StudyData, row: Row) -> str:
    """``0.612 kg``."""
    return readable(row.aim, data.aim_unit)


def governs_text(outcome: Outcome) -> str:
    """``Deflection governs: 0.487 mm, at most 0.5 mm allowed, 2.6 % left.``; empty without a limit."""
    held = governing(outcome)
    if held is None:
        return ""
    named = figure_words(figure_of(held))
    own = "" if held.name in (figure_of(held), named) else f" ({held.name})"
    verb = "governs" if held.verdict == "met" else "is missed" if held.verdict == "missed" else "is not established"
    return f"{capital(named)}{own} {verb}: {held_text(held, at_most(held))}, {margin_text(held)}."


def _chosen(data: StudyData, ranking: Ranking, row: Row, warnings: tuple[str, ...]) -> Answer:
    outcome = row.outcome
    assert outcome is not None
    sound = sum(r.outcome is not None and r.outcome.judgement != "suspicious" for r in ranking.meeting)
    if outcome.limits:
        only = sound == 1
        of = "the only one that meets every limit" if only else \
            f"{_best(data)} of the {counted(sound, 'variant')} that meet every limit"
        reasons = [governs_text(outcome)]
    else:
        of = f"{_best(data)} of {counted(sound, 'variant')}; no limits were set"
        reasons = ["No limits were set, so nothing says whether it is strong or stiff enough."]
    reasons += [_edge_text(data, row), _over_text(data, ranking), _next_text(data, ranking, row)]
    reasons.append(f"Judgement of its two models: {marked(outcome.judgement or 'agrees')}. Before it is made, check it "
                   "alone and read its run folder:")
    steps = _steps(data, row)
    return Answer(f"Variant {row.number} is {of}: {aim_text(data, row)}.", row, tuple(filter(None, reasons)), steps,
                  _steps_text(data, row), again_command(data, row.number), warnings=warnings)


def again_command(data: StudyData, number: int) -> str:
    """What checks one variant alone."""
    return f"haunch again {shlex.quote(data.record)} {number}"


def _edge_text(data: StudyData, row: Row) -> str:
    """A best value at the end of its range says that the range may have been too small."""
    edges = at_the_edge(data, row)
    if not edges:
        return ""
    axes = {axis.name: axis for axis in data.axes}
    parts = [f"{name} {value_text(axes[name], row)} the {word}" for name, word in edges]
    return f"At the edge of what was tried: {listed(parts)}. Better ones may lie beyond, where nothing was looked at."


def _over_text(data: StudyData, ranking: Ranking) -> str:
    over = [row for row in ranking.passed_over if row.aim is not None]
    if not over:
        return ""
    verb, be = ("meets", "is") if len(over) == 1 else ("meet", "are")
    return f"Passed over: {_numbers(over)} {verb} every limit with {'more' if data.most else 'less'} " \
           f"{_aim_noun(data)}, but {be} suspicious."


def _next_text(data: StudyData, ranking: Ranking, row: Row) -> str:
    """The next in the ranking, where there are no steps to speak of."""
    after = next((other for other in ranking.meeting[ranking.meeting.index(row) + 1:] if other.aim is not None
                  and other.outcome is not None and not is_suspicious(other.outcome)), None)
    if neighbours(data, row) or after is None or after.outcome is None:
        return ""
    text = f"Next comes variant {after.number}: {aim_text(data, after)}{_difference(row, after)}"
    held = governing(after.outcome)
    return f"{text}, {margin_text(held)} of {figure_words(figure_of(held))}." if held is not None else f"{text}."


def _difference(row: Row, other: Row) -> str:
    """`` (+2.7 %)``; empty where there is nothing to compare with."""
    if other.aim is None or not row.aim:
        return ""
    return f" ({'+' if other.aim >= row.aim else '−'}{percent(abs(other.aim / row.aim - 1.0))})"


def _aim_noun(data: StudyData) -> str:
    return figure_words(data.aim) if "*" not in data.aim and " " not in data.aim else f"aim ({data.aim})"


def _numbers(rows: tuple[Row, ...] | list[Row]) -> str:
    shown = [str(row.number) for row in rows[:5]]
    more = f" and {len(rows) - 5} more" if len(rows) > 5 else ""
    return f"variant{'s' if len(rows) > 1 else ''} {', '.join(shown) if more else listed(shown)}{more}"


def _steps(data: StudyData, row: Row) -> tuple[Step, ...]:
    axes = {axis.name: axis for axis in data.axes}
    found = []
    for name, other in neighbours(data, row):
        change = f"{name} {value_text(axes[name], row)} → {value_text(axes[name], other)}"
        outcome = other.outcome
        if outcome is None or outcome.status == "failed":
            word = "not run yet" if outcome is None else "failed"
            found.append(Step(other.number, change, "-", "-", "-", word))
            continue
        difference = _difference(row, other).strip(" ()") or "-"
        held = governing(outcome)
        limit = f"{figure_words(figure_of(held))} {margin_text(held)}" if held is not None else "-"
        word = "! suspicious" if outcome.judgement == "suspicious" else \
            marked(limits_word(outcome)) if outcome.limits else "no limits"
        found.append(Step(other.number, change, aim_text(data, other), difference, limit, word))
    return tuple(found)


def _steps_text(data: StudyData, row: Row) -> str:
    """Why none of the better neighbours was taken."""
    sign = -1.0 if data.most else 1.0
    outcomes = [other.outcome for _, other in neighbours(data, row)
                if other.aim is not None and row.aim is not None and sign * other.aim < sign * row.aim]
    better = [outcome for outcome in outcomes if outcome is not None]
    if not better:
        return ""
    missed = sorted({figure_words(figure_of(held)) for outcome in better for held in outcome.limits
                     if held.verdict != "met"})
    word = "lighter" if data.aim == "mass" and not data.most else "better"
    if missed and not any(meets_all(outcome) for outcome in better):
        every = f"Every {word} neighbour fails" if len(better) > 1 else f"The one {word} neighbour fails"
        return f"{every} a limit: {listed(missed)}."
    return ""


def _none_meets(data: StudyData, ranking: Ranking, counts: Counts, warnings: tuple[str, ...]) -> Answer:
    nearest = next((row for row in ranking.misses if row.outcome is not None
                    and row.outcome.judgement != "suspicious"), ranking.misses[0])
    outcome = nearest.outcome
    assert outcome is not None
    ran = "The one variant that ran does not meet" if counts.finished == 1 else \
        f"None of the {counted(counts.finished, 'variant')} that ran meets"
    unknown = [held for held in outcome.limits if held.verdict == "not established"]
    reasons = [f"Nearest is variant {nearest.number} ({aim_text(data, nearest)}). {governs_text(outcome)}".rstrip()]
    reasons += [f"Its limit {held.name} is not established: {held.reason}." for held in unknown]
    worst = max(counts.by_limit, key=lambda limit: limit.missed + limit.unknown)
    reasons.append(f"Most often in the way: {worst.name}, missed by {worst.missed} and not established for "
                   f"{worst.unknown} of {counts.finished}.")
    reasons.append(_edge_text(data, nearest).replace("Better ones", "Variants that meet every limit"))
    return Answer(f"{ran} every limit.", nearest, tuple(filter(None, reasons)), warnings=warnings,
                  title="The nearest: variant")


def _as_made(data: StudyData, ranking: Ranking, counts: Counts, warnings: tuple[str, ...]) -> Answer:
    """Parts scattered by their tolerances: which share of them is good."""
    good, total = len(ranking.meeting), counts.finished
    low, high = _interval(good, total)
    if not any(row.outcome is not None and row.outcome.limits for row in ranking.meeting + ranking.misses):
        return Answer(f"{counted(total, 'part')} as made ran; no limits were set.", warnings=warnings)
    reasons = [f"That is {percent(good / total)}; with 95 % confidence between {percent(low)} and {percent(high)} of "
               "all parts made so (Clopper and Pearson's interval)."]
    reasons += [f"{capital(limit.name)} is missed by {counted(limit.missed, 'part')}." for limit in counts.by_limit
                if limit.missed]
    worst = min((row for row in ranking.meeting + ranking.misses), key=_least_margin)
    outcome = worst.outcome
    assert outcome is not None
    reasons.append(f"The worst is variant {worst.number}. {governs_text(outcome)}".rstrip())
    return Answer(f"{good} of {counted(total, 'part')} as made meet every limit.", worst, tuple(reasons),
                  warnings=warnings, title="The worst: variant")


def _least_margin(row: Row) -> float:
    held = governing(row.outcome) if row.outcome is not None else None
    return held.margin if held is not None and held.margin is not None else 1e300


def _interval(good: int, total: int) -> tuple[float, float]:
    """Exact binomial 95 % interval: C. J. Clopper, E. S. Pearson, Biometrika 26 (1934) 404-413."""
    from scipy.stats import beta

    low = 0.0 if good == 0 else float(beta.ppf(0.025, good, total - good + 1))
    high = 1.0 if good == total else float(beta.ppf(0.975, good + 1, total - good))
    return low, high
