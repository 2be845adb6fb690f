"""A search in plain words."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

from studies.lightest.slopes import Slope
from studies.lightest.study import Lightest
from studies.report.tables import readable
from studies.vary.run.progress import several

if TYPE_CHECKING:
    from studies.vary.plan import Plan

NOTHING = 5e-4
"""Share of a limit below which a change is not told."""

EXACT = 0.005
"""Share of a change below which its error is not told."""


def told(plan: Plan, made: Lightest) -> Iterator[str]:
    """Line by line: the winner, how sure it is, and what each dimension does there."""
    found = made.found
    assert found is not None
    rest = len(found.solved) - found.first
    yield (f"{several(len(found.solved), 'variant')} solved ({found.first} spread evenly, {rest} chosen one after the "
           f"other), {made.evaluated} of them now; {found.why}")
    if made.best is None:
        yield from _none(made)
        return
    assert made.outcome is not None
    values = ", ".join(f"{name} = {value}" for name, value in made.best.values.items())
    figures = {name: kept.beam if kept.solid is None else kept.solid for name, kept in made.outcome.figures.items()}
    aim = plan.aim.value(figures, made.best.numbers)
    yield f"{plan.aim.sense} {plan.aim.text} that meets every limit: variant {made.best.number}: {values}"
    yield f"  {plan.aim.text}: {readable(aim, plan.aim.unit)}; judgement: {made.outcome.judgement}"
    for held in made.outcome.limits:
        share = found.best.used.get(held.name) if found.best is not None else None
        yield (f"  {held.name}: {readable(held.found, held.unit)}, limit {readable(held.given, held.unit)}"
               + (f", {100 * share:.3g} % used" if share is not None else ""))
    yield from _sure(made)
    yield "What a step does there:"
    for slope in made.slopes:
        yield f"  {sentence(plan, slope)}"
    yield from _errors(made)


def _sure(made: Lightest) -> Iterator[str]:
    found = made.found
    assert found is not None and found.best is not None
    if made.confirmed:
        yield f"Confirmed by a whole run with the same figures: {made.run_folder}"
    else:
        yield ("! NOT confirmed: the whole run of it " + (f"in {made.run_folder} differs from the record or does not "
               "meet every limit" if made.run_folder else "could not be made") + "; do not rely on it")
    if found.unchecked:
        yield (f"! {several(len(found.unchecked), 'neighbour')} of it may be better and was not solved: the budget was "
               "used up; give a larger --budget and the search goes on")
    else:
        yield "No neighbour of it, one value either way in each dimension, is better and meets the limits."
    yield "Variants between the solved ones are judged by surrogates: a better one further away cannot be excluded."


def _none(made: Lightest) -> Iterator[str]:
    yield "No variant meets every limit."
    if made.nearest is not None:
        variant, one = made.nearest
        values = ", ".join(f"{name} = {value}" for name, value in variant.values.items())
        worst = max(one.used, key=lambda name: one.used[name])
        yield (f"The nearest is variant {variant.number} ({values}): {100 * one.used[worst]:.4g} % of {worst} is used"
               + (f"; {one.why}" if one.why else ""))
    for why, count in sorted(made.unsound.items(), key=lambda item: -item[1])[:5]:
        yield f"  {count:4d}  {why}"


def _errors(made: Lightest) -> Iterator[str]:
    """How far the surrogates were off."""
    found = made.found
    assert found is not None
    parts = [f"{name} {100 * one.missed:.2g} %" for name, one in found.belief.limits.items()]
    if parts:
        yield ("Error of the surrogates, each solved variant predicted from the others (root mean square): "
               + ", ".join(parts))


def sentence(plan: Plan, slope: Slope) -> str:
    """``1 mm more web buys 4.1 % of the deflection limit, and costs 35 g (5 to 6 mm, solved)``."""
    varied = plan.varied[slope.name]
    if not varied.numeric:
        start, end = (_choice(varied.values[int(place)]) for place in (slope.start, slope.end))
        step, head = 1.0, f"{slope.name} {end} instead of {start}"
        source = "solved" if slope.solved else "by the surrogates"
    else:
        step = step_size(abs(slope.end - slope.start) / slope.per)
        head = f"{step:g} {slope.unit} more {slope.name}".replace("  ", " ")
        low, high = sorted((slope.start / slope.per, slope.end / slope.per))
        source = f"{low:.5g} to {high:.5g} {slope.unit}".rstrip() + (
            ", solved" if slope.solved else ", by the surrogates")
    buys: list[str] = []
    takes: list[str] = []
    for name, (change, error) in slope.limits.items():
        if abs(change * step) >= NOTHING:
            plus = "" if error is None or error < EXACT * abs(change) else f" ± {100 * error * step:.2g}"
            (buys if change < 0.0 else takes).append(f"{100 * abs(change) * step:.2g}{plus} % of the {name} limit")
    parts = ([f"buys {_listed(buys)}"] if buys else []) + ([f"takes {_listed(takes)}"] if takes else [])
    parts = parts or ["changes no limit"]
    return f"{head} {', '.join(parts)}, and {_aim(plan, slope, step)} ({source})"


def _choice(value: Any) -> str:
    return ", ".join(map(str, value)) if isinstance(value, list) else str(value)


def step_size(gap: float) -> float:
    """The step that is told, in written units: 1, unless neighbours are much nearer or further than that."""
    if gap <= 0.0 or 0.5 <= gap < 20.0:
        return 1.0
    return float(10.0 ** math.floor(math.log10(gap / 2.0 if gap >= 20.0 else gap)))


def _aim(plan: Plan, slope: Slope, step: float) -> str:
    change, error = slope.aim
    size, text = abs(change) * step, plan.aim.text
    if size == 0.0 or math.isnan(size):
        return f"does not change {text}"
    most = plan.aim.sense == "most"
    word = ("loses" if change > 0.0 else "gains") if most else ("costs" if change > 0.0 else "saves")
    plus = f" ± {_small(error * step, plan.aim.unit)}" if error and error > EXACT * abs(change) else ""
    of = "" if plan.aim.text == "mass" else f" of {text}"
    return f"{word} {_small(size, plan.aim.unit)}{plus}{of}"


def _small(value: float, unit: str) -> str:
    """Small masses in grams."""
    if unit == "t" and abs(value) < 1e-3:
        return f"{1e6 * value:.3g} g"
    return readable(value, unit)


def _listed(parts: list[str]) -> str:
    return " and ".join([", ".join(parts[:-1]), parts[-1]] if len(parts) > 1 else parts)
