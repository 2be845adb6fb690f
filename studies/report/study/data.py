"""All that the page of a study is made from, apart from where it was kept."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

from studies.vary.outcome import Outcome

Sampling = Literal["grid", "one at a time", "latin hypercube", "sobol", "as made", "searched"]


@dataclass(frozen=True, slots=True)
class Axis:
    """One thing that was varied.

    Attributes
    ----------
    name
        As the plan writes it: a parameter, or the path of a field of the spec.
    unit
        Unit that its numbers are shown in; empty where it has none.
    factor
        From base units (N, mm, MPa, t, s, rad, K) to `unit`.
    numeric
        False for words and lists, whose values have no order of their own.
    """

    name: str
    unit: str = ""
    factor: float = 1.0
    numeric: bool = True


@dataclass(frozen=True, slots=True)
class Row:
    """One point of the plan, with what became of it.

    Attributes
    ----------
    values
        What is varied -> its value as written.
    numbers
        The same in base units, where it is a quantity.
    outcome
        None: it has not run yet.
    aim
        Value of what is to be made least or greatest; None when it failed or has no such figure.
    run
        Link from the page to the folder of its checked run; empty when none was kept.
    pictures
        Links from the page to the pictures of that run.
    """

    number: int
    values: Mapping[str, Any]
    numbers: Mapping[str, float]
    outcome: Outcome | None = None
    aim: float | None = None
    run: str = ""
    pictures: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class LeftOut:
    """Points of the plan that are no variants, all for the same reason."""

    reason: str
    count: int
    numbers: tuple[int, ...] = ()
    """The first few of them."""


@dataclass(frozen=True, slots=True)
class StudyData:
    """A study as its page shows it.

    Attributes
    ----------
    aim
        What is made least, or with `most` greatest, as the plan writes it: a kept figure, or a formula.
    sampling
        How the points were laid out; ``searched``: a search chose some of them, where it was promising.
    aim_unit
        Base unit of `Row.aim`; ``1`` for a formula.
    rows
        In the order of the plan; `left_out` are not among them.
    tolerances
        What has a tolerance -> the tolerance in words.
    pictures
        Name -> PNG of the chosen variant, to be kept inside the page.
    """

    title: str
    plan: str
    record: str
    sampling: Sampling
    axes: tuple[Axis, ...]
    rows: tuple[Row, ...]
    aim: str = "mass"
    aim_unit: str = "t"
    most: bool = False
    left_out: tuple[LeftOut, ...] = ()
    tolerances: Mapping[str, str] = field(default_factory=dict)
    started: str = ""
    written: str = ""
    seconds: float = 0.0
    """Time on the clock of all variants, added up over the workers."""
    versions: Mapping[str, str] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    """What happened to the study as a whole: interruptions, variants run again."""
