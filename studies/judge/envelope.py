"""The envelope over load cases: greatest and least of each figure, and the case that governs."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from fem.figure import Figure, FigureKey

ENVELOPED = ("displacement", "rotation", "reaction_force", "reaction_moment", "section_force", "section_moment",
             "nominal_stress", "notch_stress")


@dataclass(frozen=True, slots=True)
class Extreme:
    """The greatest or least value of one component over all cases and places.

    `value` is the solid model's, `beam` the beam's at the same case and place (None: it has none); `case` and
    `place` are where it governs.
    """

    quantity: str
    component: str
    which: str
    value: float
    beam: float | None
    unit: str
    case: str
    place: str


def envelope(solid: Iterable[Figure], beam: Iterable[Figure]) -> tuple[Extreme, ...]:
    """Greatest and least of every component of `ENVELOPED`, components that are nothing beside their kind left out.

    A reaction is enveloped support by support, everything else over all its places.
    """
    others = {figure.key: figure.value for figure in beam}
    groups: dict[tuple[str, str, str], list[Figure]] = {}
    largest: dict[str, float] = {}
    for figure in solid:
        key = figure.key
        if key.quantity in ENVELOPED:
            support = key.place if key.quantity.startswith("reaction") else ""
            groups.setdefault((key.quantity, support, key.component), []).append(figure)
            largest[key.quantity] = max(largest.get(key.quantity, 0.0), abs(figure.value))
    rows = []
    for (quantity, _, component), figures in groups.items():
        if max(abs(f.value) for f in figures) <= 5e-3 * largest[quantity]:
            continue
        for which, pick in (("greatest", max), ("least", min)):
            found = pick(figures, key=_to_four_digits)
            rows.append(_row(quantity, component, which, found, others))
    return tuple(rows)


def _to_four_digits(figure: Figure) -> float:
    """So that rounding does not choose among equal places: the first one governs."""
    return float(f"{figure.value:.3e}")


def _row(quantity: str, component: str, which: str, found: Figure, others: Mapping[FigureKey, float]) -> Extreme:
    return Extreme(quantity, component, which, found.value, others.get(found.key), found.unit, found.key.case,
                   found.key.place)
