"""Constraints between dimensions: comparisons in the spec's own arithmetic, ``"tip_depth <= root_depth - 10 mm"``.

Two comparisons may stand in a row: ``"6 mm <= web < flange"``. Sides that are equal but for rounding count as equal.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

from geometry.spec.resolve.values import shown
from geometry.spec.text.expression import evaluate
from geometry.spec.text.tokens import ExpressionError, with_article
from geometry.spec.text.units import Quantity, name_of
from studies.vary.plan.reading import Reading, unit_of
from studies.vary.plan.varied import SAME

_SIGN = re.compile(r"<=|>=|==|!=|=<|=>|<|>|=|\u2264|\u2265")
_MEANT = {"\u2264": "<=", "\u2265": ">="}
SIGNS = ("<=", "<", ">=", ">", "==")
MOST_SIGNS = 2


@dataclass(frozen=True)
class Constraint:
    """One constraint: `sides` (arithmetic) with `signs` between them."""

    name: str
    text: str
    sides: tuple[str, ...]
    signs: tuple[str, ...]

    def broken(self, scope: Mapping[str, Quantity]) -> str:
        """Why it does not hold, with the numbers; empty when it holds. Raises `ExpressionError`."""
        values = [evaluate(side, scope) for side in self.sides]
        for left, sign, right in zip(values, self.signs, values[1:], strict=False):
            if left.dimension != right.dimension:
                fix = f"{_kind(left)} is compared with {_kind(right)}".capitalize()
                raise ExpressionError("quantities of one kind on both sides", fix)
            if not _holds(left.value, sign, right.value):
                unit = unit_of(left.dimension)
                return f"{self.text}: {left.value:.6g} {unit} is not {sign} {right.value:.6g} {unit}".replace("  ", " ")
        return ""


def _kind(quantity: Quantity) -> str:
    return with_article(name_of(quantity.dimension))


def _holds(left: float, sign: str, right: float) -> bool:
    same = abs(left - right) <= SAME * max(abs(left), abs(right))
    if sign == "==":
        return same
    if sign in ("<", ">"):
        return not same and (left < right if sign == "<" else left > right)
    return same or (left < right if sign == "<=" else left > right)


def read_constraint(reading: Reading, name: str, text: str, scope: Mapping[str, Quantity]) -> Constraint | None:
    """One entry of ``[constraints]``, or None after keeping a problem. `scope`: the base values of all it may use."""
    where = f"constraints.{name}"
    signs = tuple(_MEANT.get(sign, sign) for sign in _SIGN.findall(text))
    sides = tuple(side.strip() for side in _SIGN.split(text))
    wrong = next((sign for sign in signs if sign not in SIGNS), None)
    if wrong or not 1 <= len(signs) <= MOST_SIGNS or not all(sides):
        near = {"=": "==", "=<": "<=", "=>": ">="}.get(wrong or "", "")
        reading.problem(where, shown(text), f'a comparison with {", ".join(SIGNS)}: "tip_depth <= root_depth - 10 mm"',
                        f'Write "{near}" for "{wrong}"' if near else "")  # fmt: skip
        return None
    constraint = Constraint(name, text, sides, signs)
    try:
        constraint.broken(scope)
    except ExpressionError as error:
        reading.problem(where, shown(text), error.allowed, error.fix)
        return None
    return constraint
