"""What the best variant has least or most of: a kept figure, or arithmetic on figures and dimensions."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from geometry.spec.resolve.values import shown
from geometry.spec.text.expression import evaluate, names_in
from geometry.spec.text.tokens import ExpressionError, nearest
from geometry.spec.text.units import Quantity
from studies.vary.plan.kept import KeptFigure, is_figure, read_figure, usual_figures
from studies.vary.plan.reading import Reading, unit_of

_PLACED = re.compile(r"[A-Za-z_][A-Za-z0-9_]*@[A-Za-z0-9_.@-]*[A-Za-z0-9_](?: in [A-Za-z_][A-Za-z0-9_-]*)?"
                     r"|[A-Za-z_][A-Za-z0-9_]* in [A-Za-z_][A-Za-z0-9_-]*")
"""A figure's name that is no plain word, within arithmetic."""


@dataclass(frozen=True)
class Aim:
    """The aim of a plan.

    Attributes
    ----------
    text
        As written: ``mass``, ``2.1 * mass / (1 kg) + 0.4``.
    sense
        ``least`` or ``most``: which is best.
    figures
        The kept figures that it uses.
    unit
        Base unit of its value.
    """

    text: str
    sense: Literal["least", "most"]
    figures: tuple[KeptFigure, ...]
    unit: str
    _formula: str
    _stand_ins: Mapping[str, str]
    """Name in the formula -> name of the figure."""
    _scope: Mapping[str, Quantity]
    """Parameters of the part, and what is varied."""

    def value(self, figures: Mapping[str, float | None], numbers: Mapping[str, float]) -> float:
        """Its value in base units; NaN where a figure that it needs has no value, or the arithmetic has none.

        Parameters
        ----------
        figures
            Kept figures by name, base units.
        numbers
            What is varied, base units: `Variant.numbers`.
        """
        scope = dict(self._scope)
        scope.update((n, Quantity(v, scope[n].dimension)) for n, v in numbers.items() if n in scope)
        dimensions = {figure.name: figure.kind.dimension for figure in self.figures}
        for stand_in, name in self._stand_ins.items():
            found = figures.get(name)
            if found is None or not math.isfinite(found):
                return math.nan
            scope[stand_in] = Quantity(found, dimensions[name])
        try:
            return evaluate(self._formula, scope).value
        except ExpressionError:
            return math.nan

    def cost(self, figures: Mapping[str, float | None], numbers: Mapping[str, float]) -> float:
        """The same with its sign turned where more is better: less is always better."""
        value = self.value(figures, numbers)
        return -value if self.sense == "most" else value


def read_aim(reading: Reading, text: str, sense: Literal["least", "most"], scope: Mapping[str, Quantity]) -> Aim | None:
    """The aim, or None after keeping a problem. `scope`: base values of parameters and of what is varied."""
    where = f"aim.{sense}"
    stand_ins: dict[str, str] = {}
    formula = _PLACED.sub(lambda found: _stand_in(found.group(), stand_ins), text)
    try:
        names = names_in(formula)
    except ExpressionError as error:
        reading.problem(where, shown(text), error.allowed, error.fix)
        return None
    usual = {figure.name: figure for figure in usual_figures(reading.part)}
    plain = {name for name in names if name not in stand_ins and name not in scope and name not in usual}
    stand_ins.update((name, name) for name in plain if is_figure(name))
    clash = [name for name in names if name in usual and name in scope]
    if clash:
        reading.problem(where, shown(text), "names that are either figures or dimensions",
                        f"{clash[0]} is both: rename the parameter")  # fmt: skip
        return None
    stand_ins.update((name, name) for name in names if name in usual)
    unknown = [name for name in names if name not in stand_ins and name not in scope]
    if unknown:
        near = nearest(unknown[0], [*usual, *scope])
        known = f"figures ({', '.join(usual)}, or QUANTITY@PLACE), parameters and what is varied"
        reading.problem(where, shown(text), known, f'Did you mean "{near}"?' if near else f'"{unknown[0]}" is unknown')
        return None
    found = [read_figure(reading, where, name) for name in dict.fromkeys(stand_ins.values())]
    figures = tuple(figure for figure in found if figure)
    if len(figures) < len(found):
        return None
    return _checked(reading, where, text, sense, figures, formula, stand_ins, scope)


def _stand_in(name: str, stand_ins: dict[str, str]) -> str:
    known = {figure: word for word, figure in stand_ins.items()}
    word = known.get(name, f"placed_figure_{len(stand_ins) + 1}")
    stand_ins[word] = name
    return f" {word} "


def _checked(
    reading: Reading, where: str, text: str, sense: Literal["least", "most"], figures: tuple[KeptFigure, ...],
    formula: str, stand_ins: Mapping[str, str], scope: Mapping[str, Quantity],
) -> Aim | None:  # fmt: skip
    """The aim after trying its arithmetic once, with figures that are no round numbers."""
    kinds = {figure.name: figure.kind.dimension for figure in figures}
    trial = {word: Quantity(0.7310585 + 0.1 * k, kinds[name]) for k, (word, name) in enumerate(stand_ins.items())}
    try:
        value = evaluate(formula, {**scope, **trial})
    except ExpressionError as error:
        reading.problem(where, shown(text), error.allowed, _plainly(error.fix, stand_ins))
        return None
    if not figures and not set(names_in(formula)) & set(scope):
        reading.problem(where, shown(text), "something that differs between variants: a figure or a dimension")
        return None
    return Aim(text.strip(), sense, figures, unit_of(value.dimension), formula, dict(stand_ins), dict(scope))


def _plainly(text: str, stand_ins: Mapping[str, str]) -> str:
    for word, name in stand_ins.items():
        text = text.replace(word, name)
    return text
