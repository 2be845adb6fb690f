"""Tolerances: strength and stiffness are judged at least material, mass at most.

Which side of a tolerance leaves less material is found, for each variant, by comparing the part with that dimension
at either side and the others as drawn. ``as made`` draws parts at random within the tolerances instead.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from geometry.spec.resolve.values import shown
from geometry.spec.text.units import UNITS, Quantity
from geometry.spec.words.structure import Path, written
from studies.vary.plan.material import longer, mass_of_tables
from studies.vary.plan.place import value_at, with_value
from studies.vary.plan.reading import Reading, usual_unit
from studies.vary.plan.varied import Varied, quantity_of, unit_in
from studies.vary.plan.words import Distribution, ToleranceSpec

SAME_MASS = 1e-12
THREE = 3.0
"""Standard deviations from the middle to either side of a normal distribution; it is cut off there."""


@dataclass(frozen=True)
class Tolerance:
    """How far one dimension may be off: from `minus` below (a size) to `plus` above, base units."""

    name: str
    path: Path
    kind: str
    unit: str
    written_in: str
    minus: float
    plus: float
    distribution: Distribution

    def off(self, nominal: float, deviation: float) -> str | float:
        """The value as made, written."""
        size = UNITS[self.written_in].value if self.written_in else 1.0
        number = float(f"{(nominal + deviation) / size:.12g}")
        return f"{number:.12g} {self.written_in}" if self.written_in else number

    def share(self, share: float) -> float:
        """Share of the tolerance (0 to 1, from its lower to its upper side) below which a share of the parts lies."""
        return (self.deviation(share) + self.minus) / (self.minus + self.plus)

    def deviation(self, share: float) -> float:
        """Deviation (base units) below which a share (0 to 1) of the parts lies."""
        low, high = -self.minus, self.plus
        if self.distribution == "uniform" or high == low:
            return low + share * (high - low)
        if self.distribution == "triangular":
            peak = self.minus / (self.minus + self.plus)
            if share < peak:
                return low + math.sqrt(share * (high - low) * self.minus)
            return high - math.sqrt((1.0 - share) * (high - low) * self.plus)
        return (low + high) / 2.0 + (high - low) / 2.0 / THREE * _normal(share)


def _normal(share: float) -> float:
    """Quantile of the standard normal distribution cut off at three."""
    from statistics import NormalDist

    normal = NormalDist()
    low, high = normal.cdf(-THREE), normal.cdf(THREE)
    return min(max(normal.inv_cdf(low + share * (high - low)), -THREE), THREE)


def read_tolerance(
    reading: Reading, name: str, spec: str | ToleranceSpec, varied: Mapping[str, Varied]
) -> Tolerance | None:
    """One entry of ``[tolerances]``, or None after keeping problems."""
    where = f"tolerances.{name}"
    one = varied.get(name)
    path = one.path if one else reading.place(where, name)
    if path is None:
        return None
    mark = reading.mark(path)
    now = value_at(reading.data, path)
    if mark is None or now is None or (quantity_of(now, reading.scope) is None):
        given = shown(now) if now is not None else "nothing in the part"
        reading.problem(where, given, "a dimension or other quantity that the part gives")
        return None
    parts = {"minus": spec, "plus": spec} if isinstance(spec, str) else {"minus": spec.minus, "plus": spec.plus}
    sizes: dict[str, float] = {}
    for side, text in parts.items():
        path_of = where if isinstance(spec, str) else f"{where}.{side}"
        size = 0.0 if text is None else reading.number(path_of, text, type(mark)(mark.word))
        if size is None:
            return None
        if size < 0.0:
            reading.problem(path_of, shown(text), "a size: 0 or more", "minus says the direction already")
            return None
        sizes[side] = size
    if not sizes["minus"] and not sizes["plus"]:
        reading.problem(where, "nothing" if not isinstance(spec, str) else shown(spec), 'a size: "0.3 mm"')
        return None
    distribution: Distribution = "uniform" if isinstance(spec, str) else spec.distribution
    text = next(t for t in parts.values() if t is not None)
    unit = unit_in(now, "") or unit_in(text, "") or usual_unit(mark.word)
    return Tolerance(name, path, mark.word, mark.kind.unit, unit, sizes["minus"], sizes["plus"], distribution)


@dataclass(frozen=True)
class Extremes:
    """Tables of a part at least and at most material; `idle`: tolerances that change no material, left as drawn;
    `reaching`: those that change the length of a member. A shorter arm has less material and is the stiffer one, so
    for strength they stay as drawn."""

    least: Mapping[str, Any]
    most: Mapping[str, Any]
    idle: tuple[str, ...]
    reaching: tuple[str, ...]


def extremes(
    data: Mapping[str, Any], scope: Mapping[str, Quantity], tolerances: Sequence[Tolerance]
) -> Extremes:
    """The part at least and at most material; whether both can be is seen when they are resolved."""
    least, most, idle, reaching = data, data, [], []
    for tolerance, nominal in nominals(data, scope, tolerances):
        sides = [tolerance.off(nominal, deviation) for deviation in (-tolerance.minus, tolerance.plus)]
        made = [with_value(data, tolerance.path, side) for side in sides]
        masses = [mass_of_tables(one) for one in made]
        if math.isclose(*masses, rel_tol=SAME_MASS):
            idle.append(tolerance.name)
            continue
        light = 0 if masses[0] < masses[1] else 1
        if longer(*made):
            reaching.append(tolerance.name)
        else:
            least = with_value(least, tolerance.path, sides[light])
        most = with_value(most, tolerance.path, sides[1 - light])
    return Extremes(least, most, tuple(idle), tuple(reaching))


def nominals(
    data: Mapping[str, Any], scope: Mapping[str, Quantity], tolerances: Sequence[Tolerance]
) -> Iterator[tuple[Tolerance, float]]:
    """Each tolerance with its dimension as drawn, base units."""
    for tolerance in tolerances:
        quantity = quantity_of(value_at(data, tolerance.path), scope)
        assert quantity is not None, written(tolerance.path)
        yield tolerance, quantity.value


def spread(
    data: Mapping[str, Any], scope: Mapping[str, Quantity], tolerances: Sequence[Tolerance]
) -> dict[str, Varied]:
    """What varies when parts are taken as made: each dimension within its tolerance."""
    return {
        t.name: Varied(t.name, t.path, t.kind, t.unit, t.written_in, (), (), nominal - t.minus, nominal + t.plus,
                       value_at(data, t.path), nominal, listed=False, deviation=t.share)
        for t, nominal in nominals(data, scope, tolerances)
    }  # fmt: skip
