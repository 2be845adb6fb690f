"""The arithmetic of the spec: ``"reach / 2 - 3 mm"``.

Grammar, read left to right and never handed to Python::

    sum     = product { ("+" | "-") product }
    product = signed { ("*" | "/") signed }
    signed  = ["+" | "-"] signed | power
    power   = atom [ ("^" | "**") whole number from 0 to 4 ]
    atom    = number [unit] | parameter | "sqrt" | "min" | "max" | "abs" "(" sum {"," sum} ")" | "(" sum ")"

A unit may follow only a number, and is the longest spelling on the list that fits there; a unit is
written without spaces about its slash, so ``"10 N / m"`` divides by the parameter ``m`` while
``"10 N/m"`` is a unit. Length, nesting and exponents are bounded, so that no text takes long.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from functools import lru_cache

from geometry.spec.text.tokens import FUNCTIONS, NUMBER_TEXT, ExpressionError, Token, nearest, tokens_of, with_article
from geometry.spec.text.units import ANGLE, NUMBER, UNITS, Dimension, Kind, Quantity, name_of

DEEPEST = 24
GREATEST_POWER = 4


@lru_cache(maxsize=4096)
def names_in(text: str) -> tuple[str, ...]:
    """Names of the parameters that `text` uses."""
    return tuple(dict.fromkeys(t.text for t in tokens_of(text) if t.sort == "name" and t.text not in FUNCTIONS))


def evaluate(text: str, scope: Mapping[str, Quantity]) -> Quantity:
    """Value of `text`, with parameters taken from `scope`.

    Raises
    ------
    ExpressionError
        For anything that is not a quantity: unknown units and names, dimensions that do not fit, results
        that are not finite.
    """
    if _is_constant(text):
        return _constant(text)
    return scope.get(_only_name(text)) or _evaluated(text, scope)


@lru_cache(maxsize=4096)
def _only_name(text: str) -> str:
    """The name of which the text consists, or an empty text."""
    tokens = tokens_of(text)
    return tokens[0].text if len(tokens) == 2 and tokens[0].sort == "name" else ""


@lru_cache(maxsize=4096)
def _is_constant(text: str) -> bool:
    """Whether no parameter can matter: there is no name, and no unit with a slash (see `_Reader._not_ambiguous`)."""
    return not any(t.sort == "name" or "/" in t.unit for t in tokens_of(text))


@lru_cache(maxsize=4096)  # a study reads the same texts again and again
def _constant(text: str) -> Quantity:
    return _evaluated(text, {})


def _evaluated(text: str, scope: Mapping[str, Quantity]) -> Quantity:
    reader = _Reader(tokens_of(text), scope)
    value = reader.sum(0)
    if reader.now.sort != "end":
        raise reader.unexpected()
    if not math.isfinite(value.value):
        raise ExpressionError("a finite value", "The result is too large")
    return value


def evaluate_as(text: str, kind: Kind, scope: Mapping[str, Quantity]) -> float:
    """Value of `text` in the base unit of `kind`; raise `ExpressionError` when it is of another kind."""
    value = evaluate(text, scope)
    if value.dimension == kind.dimension:
        return value.value
    allowed = f'{with_article(kind.word)}, such as "{kind.example}"'
    if value.dimension == NUMBER:
        near = f"{text.strip()} {kind.example.split(' ', 1)[-1]}"
        fix = f'Add the unit: "{near}"' if NUMBER_TEXT.fullmatch(text.strip().lstrip("+-")) else "It has no unit"
        raise ExpressionError(allowed, fix)
    raise ExpressionError(allowed, f"It is {with_article(name_of(value.dimension))}")


class _Reader:
    """Reads tokens left to right and evaluates as it goes."""

    def __init__(self, tokens: tuple[Token, ...], scope: Mapping[str, Quantity]) -> None:
        self.tokens = tokens
        self.scope = scope
        self.at = 0

    @property
    def now(self) -> Token:
        return self.tokens[self.at]

    def take(self, *operators: str) -> str:
        """The operator that stands here, if it is one of these, else an empty text."""
        token = self.now
        if token.sort == "operator" and token.text in operators:
            self.at += 1
            return token.text
        return ""

    def unexpected(self) -> ExpressionError:
        return ExpressionError("numbers with units, parameters, + - * / ^ and parentheses",
                               f'"{self.now.text}" is not expected here')  # fmt: skip

    def sum(self, depth: int) -> Quantity:
        value = self.product(depth)
        while sign := self.take("+", "-"):
            other = self.product(depth)
            if other.dimension != value.dimension:
                raise _unlike("added to" if sign == "+" else "subtracted from", other.dimension, value.dimension)
            value = Quantity(value.value + other.value if sign == "+" else value.value - other.value, value.dimension)
        return value

    def product(self, depth: int) -> Quantity:
        value = self.signed(depth)
        while sign := self.take("*", "/"):
            other = self.signed(depth)
            if sign == "/" and other.value == 0.0:
                raise ExpressionError("a divisor other than 0", "It divides by zero")
            number = value.value * other.value if sign == "*" else value.value / other.value
            value = Quantity(number, value.dimension.times(other.dimension, 1 if sign == "*" else -1))
        return value

    def signed(self, depth: int) -> Quantity:
        negative = False
        while sign := self.take("+", "-"):
            negative ^= sign == "-"
        value = self.power(depth)
        return Quantity(-value.value, value.dimension) if negative else value

    def power(self, depth: int) -> Quantity:
        unit = self.now.unit
        value = self.atom(depth)
        if not self.take("^", "**"):
            return value
        if unit:
            raise ExpressionError("a power of a parameter or of something in parentheses", "Put it in parentheses")
        exponent = self.now
        whole = exponent.value.value if exponent.value is not None and not exponent.unit else math.nan
        if not (0 <= whole <= GREATEST_POWER and whole == int(whole)):
            raise ExpressionError(f"a power from 0 to {GREATEST_POWER}", "Write a small whole number behind ^")
        self.at += 1
        if self.now.text in ("^", "**"):
            raise ExpressionError("one power", "Put it in parentheses")
        try:
            return Quantity(value.value ** int(whole), value.dimension.power(int(whole)))
        except OverflowError:
            raise ExpressionError("a finite value", "The result is too large") from None

    def atom(self, depth: int) -> Quantity:
        if depth > DEEPEST:
            raise ExpressionError(f"at most {DEEPEST} nested parentheses", "Split it over several parameters")
        token = self.now
        if token.value is not None:
            self.at += 1
            self._not_ambiguous(token)
            return token.value
        if token.sort == "name":
            self.at += 1
            return self._function(token.text, depth) if token.text in FUNCTIONS else self._parameter(token.text)
        if self.take("("):
            value = self.sum(depth + 1)
            if not self.take(")"):
                raise ExpressionError("a closing parenthesis for every opening one")
            return value
        raise self.unexpected()

    def _not_ambiguous(self, token: Token) -> None:
        head, slash, tail = token.unit.partition("/")
        symbol = tail.partition("^")[0]
        if slash and symbol in self.scope:
            raise ExpressionError(
                "a unit that cannot be taken for a parameter",
                f'"{token.unit}" may be the unit, or {head} divided by the parameter {symbol}: rename the parameter '
                f'or write "{token.text} {head} / {symbol}"',
            )

    def _parameter(self, name: str) -> Quantity:
        if name in self.scope:
            return self.scope[name]
        near = nearest(name, self.scope)
        known = ", ".join(self.scope) or "none are declared"
        if name in UNITS:
            fix = f'A unit follows a number directly: "10 {name}"; a unit with a slash has no spaces: "2 N/mm"'
        elif near:
            fix = f"Did you mean {near}?"
        else:
            fix = f'Declare it: {name} = "..." under [parameters]'
        raise ExpressionError(f"a parameter ({known})", f'"{name}" is not declared. {fix}')

    def _function(self, name: str, depth: int) -> Quantity:
        if not self.take("("):
            raise ExpressionError(f"{name}(...)", f"{name} is a function, and no name for a parameter")
        values = [self.sum(depth + 1)]
        while self.take(","):
            values.append(self.sum(depth + 1))
        if not self.take(")"):
            raise ExpressionError("a closing parenthesis for every opening one")
        first = values[0]
        if name in ("sqrt", "abs") and len(values) != 1:
            raise ExpressionError(f"one value in {name}(...)")
        if name == "abs":
            return Quantity(abs(first.value), first.dimension)
        if name == "sqrt":
            return _square_root(first)
        for other in values[1:]:
            if other.dimension != first.dimension:
                raise _unlike("compared with", other.dimension, first.dimension)
        pick = min if name == "min" else max
        return Quantity(pick(v.value for v in values), first.dimension)


def _square_root(of: Quantity) -> Quantity:
    if of.value < 0.0:
        raise ExpressionError("the square root of something positive")
    if any(e % 2 for e in of.dimension):
        raise ExpressionError("the square root of a plain number, an area or a second moment",
                              f"It is {with_article(name_of(of.dimension))}")  # fmt: skip
    return Quantity(math.sqrt(of.value), Dimension(*(e // 2 for e in of.dimension)))


def _unlike(what: str, other: Dimension, first: Dimension) -> ExpressionError:
    one, two = name_of(other), name_of(first)
    fix = "Give both a unit" if NUMBER in (other, first) else ""
    if ANGLE in (other, first):
        fix = "An angle is a quantity of its own, in deg or rad"
    return ExpressionError(
        "quantities of one kind", f"{with_article(one).capitalize()} is {what} {with_article(two)}. {fix}".strip()
    )
