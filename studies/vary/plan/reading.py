"""What the parts of a plan are read against: the part, its parameters, and the problems found so far."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from typing import Any

from geometry.part import Part
from geometry.problem import Problem
from geometry.spec.model import PartSpec
from geometry.spec.resolve.values import Values, listed, shown
from geometry.spec.text.expression import names_in
from geometry.spec.text.tokens import ExpressionError, nearest, with_article
from geometry.spec.text.units import KINDS, NUMBER, UNITS, Dimension, Quantity, name_of
from geometry.spec.words.fields import OfKind
from geometry.spec.words.structure import Path, at_path, mark_in
from studies.vary.plan.place import NoPlaceError, place_of


@dataclass
class Reading:
    """The part of a plan, and what is wrong with the plan.

    Attributes
    ----------
    data
        Tables of the part, with the plan's `base` and `limits` in them.
    part
        The same, resolved.
    scope
        Its parameters.
    """

    data: Mapping[str, Any]
    part: Part
    scope: Mapping[str, Quantity]
    problems: list[Problem] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)

    def problem(self, path: str, given: str, allowed: str, fix: str = "") -> None:
        """Keep one mistake."""
        found = Problem(path, given, allowed, fix)
        if found not in self.problems:
            self.problems.append(found)

    def unknown(self, path: str, given: str, known: Collection[str], what: str) -> None:
        """Keep the mistake of a name that does not exist."""
        near = nearest(given, list(known))
        self.problem(path, shown(given), f"{what}: {listed(known)}", f'Did you mean "{near}"?' if near else "")

    def place(self, where: str, name: str) -> Path | None:
        """Path of a parameter or field of the part, or None after keeping a problem at `where`."""
        try:
            return place_of(name, self.data)
        except NoPlaceError as error:
            self.problem(where, shown(name), error.allowed, error.fix)
            return None

    def mark(self, path: Path) -> OfKind | None:
        """The quantity that stands at a place, or None for words, lists and tables."""
        if path[0] == "parameters" and len(path) == 2:
            quantity = self.scope.get(str(path[1]))
            return mark_of_dimension(quantity.dimension) if quantity else None
        return mark_in(at_path(PartSpec, self.data, path))

    def number(self, where: str, text: Any, mark: OfKind) -> float | None:
        """A plain quantity in base units, or None after keeping a problem at `where`."""
        try:
            names = names_in(text) if isinstance(text, str) else ()
        except ExpressionError:
            names = ()  # told below
        if names:
            self.problem(where, shown(text), f'{with_article(mark.word)} without names, such as "{mark.kind.example}"',
                         "Arithmetic on parameters belongs in the part")  # fmt: skip
            return None
        values = Values({})
        value = values.number(where, text, mark)
        self.problems += [p for p in values.problems if p not in self.problems]
        return None if values.problems else value


def mark_of_dimension(dimension: Dimension) -> OfKind | None:
    """The kind of quantity that has a dimension; None where no kind has it."""
    kinds = [kind.word for kind in KINDS.values() if kind.dimension == dimension]
    return OfKind(kinds[0]) if kinds else None


def unit_of(dimension: Dimension) -> str:
    """Base unit of a dimension."""
    if dimension == NUMBER:
        return ""
    return next((kind.unit for kind in KINDS.values() if kind.dimension == dimension), name_of(dimension))


def usual_unit(kind: str) -> str:
    """Unit in which a quantity of a kind is written when nothing else is said: a spelling of the list."""
    unit = KINDS[kind].unit
    return unit if unit in UNITS else ""
