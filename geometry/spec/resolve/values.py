"""Texts of the spec turned into numbers, with every mistake collected on the way.

A text that cannot be read gives NaN and one `Problem`. Checks are written as "if it *is* wrong", so a NaN
never sets off a second message about the same mistake.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from geometry.part import Vector
from geometry.problem import Problem
from geometry.spec.text.expression import evaluate, evaluate_as, names_in
from geometry.spec.text.tokens import (
    COMMON_UNITS,
    FUNCTIONS,
    NAME,
    ExpressionError,
    UnknownUnitError,
    nearest,
    tokens_of,
    with_article,
)
from geometry.spec.text.units import Quantity
from geometry.spec.words.fields import OfKind

LONGEST_GIVEN = 80
MOST_PARAMETERS = 500
GREATEST = {"length": 1e6, "angle": 1e3}
"""Greatest size in base units (a kilometre); of all other kinds 1e30, which no arithmetic here overflows."""
UNREADABLE = "\0unreadable"
"""Stands for a quantity whose mistake has been reported already; reads as NaN in a lenient pass only."""


def shown(value: Any) -> str:
    """A value as it is quoted in a message, never longer than a line."""
    text = f'"{value}"' if isinstance(value, str) else str(value)
    text = text.lower() if isinstance(value, bool) else text
    return text if len(text) <= LONGEST_GIVEN else text[: LONGEST_GIVEN - 3] + "..."


def listed(names: Iterable[str]) -> str:
    """Names in a message."""
    return ", ".join(names) or "none"


class Values:
    """Reads quantities in the scope of the parameters and keeps the problems found.

    Attributes
    ----------
    problems
        Every mistake so far.
    scope
        The parameters that could be evaluated.
    """

    def __init__(self, parameters: Mapping[str, Any], lenient: bool = False) -> None:
        self.lenient = lenient
        self.problems: list[Problem] = []
        self.scope: dict[str, Quantity] = {}
        self._broken: set[str] = set()
        self._read_parameters(parameters)

    def problem(self, path: str, given: str, allowed: str, fix: str = "") -> None:
        """Keep one mistake (once). `given` is in words; quote what was written with `shown`."""
        found = Problem(path, given, allowed, fix)
        if found not in self.problems:
            self.problems.append(found)

    def unknown(self, path: str, given: str, known: Sequence[str] | Mapping[str, object], what: str) -> None:
        """Keep the mistake of a name that does not exist."""
        near = nearest(given, list(known))
        self.problem(path, shown(given), f"{what}: {listed(known)}", f'Did you mean "{near}"?' if near else "")

    def number(self, path: str, text: Any, mark: OfKind | str) -> float:
        """Value of `text` in the base unit of its kind, or NaN after keeping a problem."""
        mark = OfKind(mark) if isinstance(mark, str) else mark
        if self.lenient and text == UNREADABLE:
            return math.nan
        if isinstance(text, bool) or not isinstance(text, (str, float, int)):
            self.problem(path, shown(text), f'{with_article(mark.word)}, such as "{mark.kind.example}"')
            return math.nan
        if isinstance(text, str):
            value = self._evaluate(path, text, mark)
        elif mark.word == "number":
            value = _as_float(text)
            if not math.isfinite(value):
                self.problem(path, shown(text), "a finite number")
                return math.nan
        else:
            unit = mark.kind.unit
            self.problem(path, shown(text), f'{with_article(mark.word)} with its unit, as text: "{mark.kind.example}"',
                         f'Add the unit: "{text} {unit}"')  # fmt: skip
            return math.nan
        outside = (
            (mark.above is not None and value <= mark.above)
            or (mark.least is not None and value < mark.least)
            or (mark.most is not None and value > mark.most)
        )
        if outside:
            percent = mark.word == "number" and mark.most is not None and mark.most < 1.0 <= value <= 100.0 * mark.most
            self.problem(path, _with_value(text, value, mark.kind.unit), f"{with_article(mark.word)} {mark.range}",
                         f'Did you mean "{value:g} %"?' if percent else "")  # fmt: skip
            return math.nan
        if 0.0 < abs(value) < mark.finest:
            self.problem(
                path,
                _with_value(text, value, mark.kind.unit),
                f"at least {mark.finest:g} {mark.kind.unit}",
                "Look at the unit",
            )
            return math.nan
        if abs(value) > GREATEST.get(mark.word, 1e30):
            self.problem(
                path,
                _with_value(text, value, mark.kind.unit),
                f"at most {GREATEST.get(mark.word, 1e30):g} {mark.kind.unit}".rstrip(),
                "Look at the unit",
            )
            return math.nan
        return value if math.isfinite(value) else math.nan

    def vector(self, path: str, texts: Sequence[Any], mark: OfKind | str) -> Vector:
        """Three values."""
        x, y, z = (self.number(f"{path}[{i}]", text, mark) for i, text in enumerate(texts, 1))
        return (x, y, z)

    def whole(self, path: str, text: Any, mark: OfKind) -> int:
        """A whole number, or 1 after keeping a problem."""
        value = self.number(path, text, mark)
        if math.isnan(value):
            return 1
        if value != round(value):
            self.problem(path, _with_value(text, value, ""), "a whole number")
            return 1
        return round(value)

    def _evaluate(self, path: str, text: str, mark: OfKind) -> float:
        try:
            if self._broken.intersection(names_in(text)):
                return math.nan  # the parameter's own problem has been kept already
            return evaluate_as(text, mark.kind, self.scope)
        except UnknownUnitError as error:
            error = UnknownUnitError(error.number, error.word, mark.kind.units or COMMON_UNITS)
            self.problem(path, shown(text), error.allowed, error.fix)
        except ExpressionError as error:
            self.problem(path, shown(text), error.allowed, error.fix)
        return math.nan

    def _read_parameters(self, parameters: Mapping[str, Any]) -> None:
        if len(parameters) > MOST_PARAMETERS:
            self.problem("parameters", f"{len(parameters)} parameters", f"at most {MOST_PARAMETERS}")
            return
        needs: dict[str, tuple[str, ...]] = {}
        for name, text in parameters.items():
            path = f"parameters.{name}"
            if self.lenient and text == UNREADABLE:
                self._broken.add(name)
                continue
            if not NAME.fullmatch(name) or name in FUNCTIONS:
                self.problem(path, shown(name), "a name of letters, digits and _, not starting with a digit",
                             f"{name} is a function" if name in FUNCTIONS else "")  # fmt: skip
                self._broken.add(name)
            try:
                needs[name] = names_in(text) if isinstance(text, str) else ()
            except ExpressionError as error:
                self.problem(path, shown(text), error.allowed, error.fix)
                self._broken.add(name)
        for name in needs:
            self._read_parameter(name, parameters, needs)

    def _read_parameter(self, name: str, texts: Mapping[str, Any], needs: Mapping[str, tuple[str, ...]]) -> None:
        """Evaluate a parameter after those that it needs; an explicit stack, for chains may be long."""
        stack = [name]
        while stack:
            top = stack[-1]
            if top in self.scope or top in self._broken:
                stack.pop()
                continue
            waiting = [n for n in needs[top] if n in needs and n not in self.scope and n not in self._broken]
            again = [n for n in waiting if n in stack]
            if again:
                ring = stack[stack.index(again[0]) :]
                self.problem(f"parameters.{top}", shown(texts[top]), "parameters that do not depend on themselves",
                             "They go round: " + " -> ".join([*ring, again[0]]))  # fmt: skip
                self._broken.update(ring)
            elif waiting:
                stack.append(waiting[0])
            elif self._broken.intersection(needs[top]):
                self._broken.add(top)
            else:
                self._set_parameter(top, texts[top], set(texts))
                stack.pop()

    def _set_parameter(self, name: str, text: Any, known: set[str]) -> None:
        path = f"parameters.{name}"
        if not isinstance(text, str):
            value = _as_float(text)
            if math.isfinite(value) and not isinstance(text, bool):
                self.scope[name] = Quantity(value)
                return
            self.problem(path, shown(text), 'a finite number, or a quantity as text: "12 mm"')
        else:
            try:
                self.scope[name] = evaluate(text, self.scope)
                return
            except ExpressionError as error:
                unknown = [n for n in names_in(text) if n not in known]
                near = nearest(unknown[0], [n for n in known if n != name]) if unknown else ""
                self.problem(path, shown(text), error.allowed, f"Did you mean {near}?" if near else error.fix)
        self._broken.add(name)


def _as_float(value: float | int) -> float:
    try:
        return float(value)
    except OverflowError:
        return math.inf


def _with_value(text: Any, value: float, unit: str) -> str:
    """What was given, and what it comes to when that is arithmetic."""
    if isinstance(text, str) and any(t.sort == "name" for t in tokens_of(text)):
        return f"{shown(text)}, which is {value:.6g} {unit}".rstrip()
    return shown(text)
