"""What a plan varies: a place in the part, and the values it may take."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from geometry.spec.text.expression import evaluate
from geometry.spec.text.tokens import ExpressionError, tokens_of, with_article
from geometry.spec.text.units import KINDS, NUMBER, UNITS, Quantity
from geometry.spec.words.structure import Path

SAME = 1e-9
"""Relative difference of values that are one and the same but for rounding."""
IDENTIFIER = re.compile(r"[A-Za-z_][A-Za-z0-9_]*")


@dataclass(frozen=True)
class Varied:
    """One thing that a plan varies.

    Attributes
    ----------
    name
        As the plan calls it: a parameter, a path, or a name of the plan's own for a path. The column of the table.
    path
        Where it stands in the tables of the part.
    kind
        What it is (``length``, ``force`` ...), or ``word`` for what is no quantity.
    unit
        Base unit of its numbers (``mm``); empty for words and plain numbers.
    written_in
        Unit in which its values are written.
    values
        The values it may take, as written, in order; empty where it may take any value of a range.
    numbers
        The same in base units; empty for words.
    low, high
        Least and greatest number; None for words.
    base, base_number
        Its value in the part, as written there and in base units; None where the part leaves it out.
    listed
        Only its `values` may be taken; otherwise any number from `low` to `high`, of which `values` are the steps.
    whole
        It is a count: values are whole numbers.
    deviation
        Of a dimension as made: the place within its tolerance, 0 to 1, below which a share of the parts lies.
    """

    name: str
    path: Path
    kind: str
    unit: str
    written_in: str
    values: tuple[Any, ...]
    numbers: tuple[float, ...]
    low: float | None
    high: float | None
    base: Any
    base_number: float | None
    listed: bool
    whole: bool = False
    deviation: Callable[[float], float] | None = None

    @property
    def numeric(self) -> bool:
        """Whether its values are quantities."""
        return self.low is not None

    @property
    def label(self) -> str:
        """What it is called in tables and pictures, its unit beside it: of a path without a name the last two words."""
        return self.name if self.path[0] == "parameters" else ".".join(self.name.split(".")[-2:])

    def written(self, number: float) -> Any:
        """A number in base units as it is written in the spec: ``"62.5 mm"``; a plain number without a unit."""
        size = UNITS[self.written_in].value if self.written_in else 1.0
        short = float(f"{number / size:.12g}")
        if not self.written_in:
            return round(short) if self.whole else short
        return f"{short:.12g} {self.written_in}"

    def quantity(self, value: Any, scope: Mapping[str, Quantity]) -> Quantity | None:
        """A written value of it with its dimension; None when that is no quantity. Of listed values looked up."""
        try:
            return self._known[value]
        except (KeyError, TypeError):
            return quantity_of(value, scope)

    @cached_property
    def _known(self) -> dict[Any, Quantity]:
        dimension = KINDS[self.kind].dimension if self.numeric else NUMBER
        return {value: Quantity(n, dimension) for value, n in zip(self.values, self.numbers, strict=False)}

    def accepted(self, value: Any) -> Any:
        """A value (written, or a number in base units) as written; raise `ValueError` with what may stand there.

        The part's own value may always stand there.
        """
        if value == self.base and not isinstance(value, bool):
            return value
        if not self.numeric:
            if value not in self.values:
                raise ValueError("one of " + ", ".join(map(str, self.values)))
            return value
        assert self.low is not None and self.high is not None
        given = Quantity(float(value), KINDS[self.kind].dimension) if isinstance(value, int | float) else None
        quantity = given or quantity_of(value, {})
        if quantity is None or quantity.dimension != KINDS[self.kind].dimension:
            raise ValueError(with_article(self.kind))
        number = quantity.value
        near = next((v for v, n in zip(self.values, self.numbers, strict=True) if math.isclose(n, number)), None)
        if near is not None:
            return near
        if self.base_number is not None and math.isclose(number, self.base_number, rel_tol=SAME):
            return self.base
        if self.listed:
            raise ValueError("one of " + ", ".join(map(str, self.values)))
        if not self.low * (1 - SAME) <= number <= self.high * (1 + SAME):
            raise ValueError(f"from {self.written(self.low)} to {self.written(self.high)}")
        return self.written(number) if given else value

    def at(self, share: float) -> Any:
        """The value at a share of the range, 0 <= share < 1: of listed values one, of a range one of about a hundred
        thousand evenly spaced numbers, so that it is short to write."""
        if self.values:
            return self.values[min(int(share * len(self.values)), len(self.values) - 1)]
        assert self.low is not None and self.high is not None
        share = self.deviation(share) if self.deviation else share
        size = UNITS[self.written_in].value if self.written_in else 1.0
        low, high = self.low / size, self.high / size
        digits = 5 - math.floor(math.log10(high - low))
        return self.written(min(max(round(low + share * (high - low), digits), low), high) * size)


def quantity_of(value: Any, scope: Mapping[str, Quantity]) -> Quantity | None:
    """A written value with its dimension, or None when it is no quantity."""
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        return None
    if not isinstance(value, str):
        return Quantity(float(value))
    try:
        return evaluate(value, scope)
    except ExpressionError:
        return None


def unit_in(text: Any, default: str) -> str:
    """The unit that a text ends in, or the default one where it is arithmetic or has none."""
    try:
        tokens = tokens_of(text) if isinstance(text, str) else ()
    except ExpressionError:
        return default
    found = [t.unit for t in tokens if t.unit]
    return found[0] if len(found) == 1 and len(tokens) <= 3 else default  # a sign, the number, the end
