"""Limits as a study keeps them: how much of each is left, and the mass at most material."""

from __future__ import annotations

from collections.abc import Iterable

from studies.check.result import LimitVerdict
from studies.check.words import LimitWord
from studies.vary.outcome import Held

AT_LEAST = ("yield_factor", "frequency", "buckling_factor")
"""Quantities that must not be less than their limit."""


def held(verdicts: Iterable[LimitVerdict], fullest_mass: float | None = None) -> tuple[Held, ...]:
    """Every limit with its margin.

    `fullest_mass`: mass (t) at most material, against which limits on the mass are held instead of what the judge
    found at least material.
    """
    return tuple(_held(v, fullest_mass) for v in verdicts)


def _held(verdict: LimitVerdict, fullest_mass: float | None) -> Held:
    found = verdict.found
    word: LimitWord = verdict.verdict
    if fullest_mass is not None and verdict.quantity == "mass":
        found = fullest_mass
        # A doubt about the mass (the models disagree) stays; one that is missed is missed whatever the doubt.
        word = "missed" if found > verdict.given else "met" if verdict.verdict == "missed" else verdict.verdict
    return Held(verdict.name, verdict.quantity, verdict.given, found, verdict.unit, word,
                margin(verdict.quantity, verdict.given, found), verdict.reason)


def margin(quantity: str, given: float, found: float | None) -> float | None:
    """What is left of a limit, as a share of it: 0.2 where 80 % of what is allowed is used, or where a factor is 20 %
    above the least; negative where it is missed. None where nothing was found or the limit is zero."""
    if found is None or given == 0.0:
        return None
    if quantity.partition(" ")[0] in AT_LEAST:
        return found / given - 1.0
    return 1.0 - abs(found) / abs(given)
