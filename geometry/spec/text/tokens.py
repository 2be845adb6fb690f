"""The words of an expression: numbers with their units, names, operators.

A unit is the longest spelling on the list that fits behind a number. Anything else behind a number, and a
decimal comma, is a mistake here already.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Iterable, Mapping
from functools import lru_cache
from typing import NamedTuple

from geometry.spec.text.units import UNITS, Quantity

LONGEST = 300
COMMON_UNITS = (
    "mm",
    "cm",
    "m",
    "in",
    "N",
    "kN",
    "N m",
    "kN m",
    "MPa",
    "GPa",
    "N/mm",
    "deg",
    "kg",
    "kg/m^3",
    "m/s^2",
    "K",
)
FUNCTIONS = ("sqrt", "min", "max", "abs")
NAME = re.compile(r"[A-Za-z_][A-Za-z0-9_]*")

NUMBER_TEXT = re.compile(r"(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_COMMA = re.compile(r"[0-9],[0-9]")
_OPERATOR = re.compile(r"\*\*|[-+*/^(),]")
# Longest first, and not within a longer word: "Mm" is not "M" followed by something.
_UNIT = re.compile(
    "(?:" + "|".join(re.escape(u) for u in sorted(UNITS, key=len, reverse=True)) + r")(?![A-Za-z0-9_^%°µ])"
)
_UNIT_LIKE = re.compile(r"[A-Za-zµ°%][A-Za-z0-9µ°%^/]*")
_LOOK_ALIKES = str.maketrans({
    "\u2212": "-", "\u00a0": " ", "\u202f": " ", "\u03bc": "µ", "\u00d7": "*", "\u00b7": " ",
})  # fmt: skip
_RAISED = {"\u00b2": "^2", "\u00b3": "^3", "\u2074": "^4"}


class ExpressionError(ValueError):
    """A text is not a quantity. Carries the parts of a `Problem` apart from the path."""

    def __init__(self, allowed: str, fix: str = "") -> None:
        self.allowed = allowed
        self.fix = fix
        super().__init__(f"{allowed}. {fix}" if fix else allowed)


class Token(NamedTuple):
    """One word of an expression: ``number``, ``name``, ``operator`` or ``end``."""

    sort: str
    text: str
    value: Quantity | None = None
    unit: str = ""


def with_article(word: str) -> str:
    """ "a length", "an angle"."""
    return ("an " if word[:1] in "aeiou" else "a ") + word


def nearest(word: str, known: Mapping[str, object] | tuple[str, ...] | list[str]) -> str:
    """The known word nearest to `word`, or an empty text."""
    names = list(known)
    exact = [n for n in names if n.lower() == word.lower()] or [n for n in names if word in n.split()]
    found = exact or difflib.get_close_matches(word, names, n=1, cutoff=0.5)
    return found[0] if found else ""


@lru_cache(maxsize=4096)  # a study reads the same texts again and again
def tokens_of(text: str) -> tuple[Token, ...]:
    """Split `text` into tokens; raise `ExpressionError` where that cannot be done."""
    if len(text) > LONGEST:
        raise ExpressionError(f"at most {LONGEST} characters", "Split it over several parameters")
    text = text.translate(_LOOK_ALIKES)
    for raised, plain in _RAISED.items():
        text = text.replace(raised, plain)
    if found := _COMMA.search(text):
        fixed = text.replace(",", ".")
        also = " (between two values of min or max put a space after the comma)" if "(" in text else ""
        raise ExpressionError("a decimal point, no decimal comma", f'Write "{fixed}" for "{text}"{also}')
    tokens: list[Token] = []
    at = 0
    while at < len(text):
        if text[at].isspace():
            at += 1
        elif found := NUMBER_TEXT.match(text, at):
            token, at = _number(text, found)
            tokens.append(token)
        elif found := NAME.match(text, at):
            tokens.append(Token("name", found.group()))
            at = found.end()
        elif found := _OPERATOR.match(text, at):
            tokens.append(Token("operator", found.group()))
            at = found.end()
        else:
            raise ExpressionError(
                "numbers with units, parameters, + - * / ^ and parentheses", f"Remove the character {text[at]!r}"
            )
    return (*tokens, Token("end", "the end"))


def _number(text: str, found: re.Match[str]) -> tuple[Token, int]:
    """A number and the unit behind it."""
    value = float(found.group())
    if not math.isfinite(value):
        raise ExpressionError("a finite number", f"{found.group()} is too large")
    at = found.end()
    behind = at + len(text[at:]) - len(text[at:].lstrip(" "))
    if unit := _UNIT.match(text, behind):
        size = UNITS[unit.group()]
        return Token("number", found.group(), Quantity(value * size.value, size.dimension), unit.group()), unit.end()
    if word := _UNIT_LIKE.match(text, behind):
        raise _unknown_unit(found.group(), word.group())
    if NUMBER_TEXT.match(text, behind):
        raise ExpressionError("one number before a unit", "Write digits without gaps: 1000 mm, not 1 000 mm")
    return Token("number", found.group(), Quantity(value)), at


class UnknownUnitError(ExpressionError):
    """A word behind a number is no unit of the list."""

    def __init__(self, number: str, word: str, known: Iterable[str]) -> None:
        near = nearest(word, list(known)) or nearest(word, UNITS)
        self.number, self.word = number, word
        fix = f'"{word}" is no known unit' + (f'; did you mean "{number} {near}"?' if near else "")
        super().__init__("a known unit: " + ", ".join(known), fix)


def _unknown_unit(number: str, word: str) -> ExpressionError:
    if word in ("degC", "°C", "C", "degF", "°F"):
        return ExpressionError(
            "a temperature difference in K", f'Write "{number} K" when {number} is a difference in K'
        )
    return UnknownUnitError(number, word, COMMON_UNITS)
