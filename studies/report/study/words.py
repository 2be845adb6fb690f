"""How a study's numbers and names are written."""

from __future__ import annotations

import re
from collections.abc import Sequence

from studies.report.study.data import Axis, Row
from studies.report.tables import READABLE, digits, readable
from studies.vary.outcome import Held


def figure_words(name: str) -> str:
    """``displacement z at arm.end`` for ``displacement_z@arm.end``; ``yield factor`` for ``yield_factor``."""
    at = re.fullmatch(r"(.+?)(?:_([xyz]))?@(.+)", name)
    if at:
        component = f" {at[2]}" if at[2] else ""
        return f"{at[1].replace('_', ' ')}{component} at {at[3]}"
    return name.replace("_", " ")


def percent(share: float) -> str:
    """Two digits: ``62 %``, ``2.6 %``, ``0.31 %``; never a power of ten."""
    value = 100.0 * share
    if abs(value) >= 9.95:
        return f"{value:.0f} %"
    if abs(value) < 0.005:
        return "0 %"
    return f"{float(f'{value:.2g}'):g} %" if abs(value) >= 0.095 else f"{value:.2f} %"


def factor_of(unit: str) -> float:
    """From a base unit to the one a person reads."""
    return READABLE.get(unit, (1.0, unit))[0]


def value_text(axis: Axis, row: Row) -> str:
    """A varied value with its unit, as its column shows it: ``54 mm``, ``all``, ``x, y``."""
    if axis.numeric and axis.name in row.numbers:
        return f"{digits(axis.factor * row.numbers[axis.name])} {axis.unit}".rstrip()
    return plain_text(row.values.get(axis.name))


def plain_text(value: object) -> str:
    """``x, y`` for a list of words."""
    if isinstance(value, list | tuple):
        return ", ".join(map(plain_text, value))
    return "-" if value is None else str(value)


def margin_text(held: Held) -> str:
    """``2.6 % left`` or ``missed by 3.1 %``."""
    if held.margin is None:
        return "margin not known"
    return f"{percent(held.margin)} left" if held.margin >= 0 else f"missed by {percent(-held.margin)}"


def held_text(held: Held, most: bool) -> str:
    """``0.487 mm, at most 0.5 mm allowed``."""
    bound = "at most" if most else "at least"
    verb = "allowed" if most else "asked"
    return f"{readable(held.found, held.unit)}, {bound} {readable(held.given, held.unit)} {verb}"


def counted(count: int, word: str, plural: str = "") -> str:
    """``1 variant``, ``12 variants``; large counts in groups of three."""
    return f"{count:,} {word if count == 1 else plural or word + 's'}".replace(",", " ")


def listed(words: Sequence[str]) -> str:
    """``a``, ``a and b``, ``a, b and c``."""
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}" if words else ""


def capital(text: str) -> str:
    """First letter large; the rest stays (``displacement z at Arm.end``)."""
    return text[:1].upper() + text[1:]


def clock(seconds: float) -> str:
    """``48 s``, ``12 min``, ``7 h 40 min``."""
    if seconds < 90:
        return f"{seconds:.0f} s"
    minutes = round(seconds / 60)
    return f"{minutes} min" if minutes < 90 else f"{minutes // 60} h {minutes % 60} min"
