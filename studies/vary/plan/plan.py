"""The plan: which variants of a part there are."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from pydantic import ValidationError

from geometry.part import Part
from geometry.problem import Problem, SpecError
from geometry.spec.model import PartSpec
from geometry.spec.read import part_from_data
from geometry.spec.resolve.values import Values, shown
from geometry.spec.text.tokens import ExpressionError
from geometry.spec.text.units import Quantity
from studies.vary.plan import sampling as points_of
from studies.vary.plan.aim import Aim
from studies.vary.plan.constraints import Constraint
from studies.vary.plan.kept import Keep
from studies.vary.plan.key import keys_of
from studies.vary.plan.place import with_value
from studies.vary.plan.sampling import Point, Sampling
from studies.vary.plan.shop import Shop
from studies.vary.plan.tolerances import Tolerance, extremes
from studies.vary.plan.varied import Varied
from studies.vary.variant import Variant


@dataclass(frozen=True)
class LeftOut:
    """A point of the plan that is no variant: its place in the plan, its values, and why.

    `rule` is where it failed, without the numbers: ``constraints.slope``, ``shop.least_wall``, the path in the part.
    """

    number: int
    values: Mapping[str, Any]
    rule: str
    reason: str


@dataclass(frozen=True)
class Run:
    """Bounds of one variant: seconds it may take, MiB a worker may take, and whether a failed one is tried again."""

    seconds: float = 300.0
    memory: int = 2048
    safer_mesh: bool = True


@dataclass(frozen=True)
class Plan:
    """The plan of one study, read against its part.

    Attributes
    ----------
    title, name
        Of the study, and of the plan's file.
    text
        The plan as it was written; empty when it came from Python.
    part_name, part_text
        The part's file and its text.
    part_data
        Tables of the part with the plan's `base` and `limits` in them: what every variant starts from.
    part
        The same, resolved.
    varied
        What is varied, in the order of the plan.
    notes
        What the user should be told, though nothing is wrong.
    key
        Content that makes the study what it is: part, what is varied and how. Not the aim, what is kept, and the
        bounds of a run: those may be changed and the study goes on.
    """

    title: str
    name: str
    text: str
    part_name: str
    part_text: str
    part_data: Mapping[str, Any]
    part: Part
    varied: Mapping[str, Varied]
    sampling: Sampling
    constraints: tuple[Constraint, ...]
    shop: Shop
    tolerances: tuple[Tolerance, ...]
    aim: Aim
    keep: Keep
    run: Run
    notes: tuple[str, ...]
    key: str

    def count(self) -> int:
        """How many points the plan has, without making them. Some may be left out later."""
        return points_of.count(self.varied, self.sampling)

    def points(self) -> Iterator[Variant | LeftOut]:
        """Every point in its fixed order, as a variant or left out with the reason. Made one by one."""
        for number, point in enumerate(points_of.points(self.varied, self.sampling), 1):
            yield self._at(number, point)

    def variants(self) -> Iterator[Variant]:
        """The variants in their fixed order, made one by one."""
        return (point for point in self.points() if isinstance(point, Variant))

    def left_out(self) -> list[LeftOut]:
        """The points that are no variants. Goes through the whole plan."""
        return [point for point in self.points() if isinstance(point, LeftOut)]

    def variant(self, values: Mapping[str, Any], number: int = 0) -> Variant:
        """The variant at any values within the ranges, written (``"62.5 mm"``) or in base units (62.5).

        What is not named keeps the part's value.

        Raises
        ------
        SpecError
            A name that is not varied, a value outside its range or list, a constraint or shop rule that is broken,
            a part that cannot be.
        """
        problems = [Problem(name, shown(name), f"what the plan varies: {', '.join(self.varied)}")
                    for name in values if name not in self.varied]  # fmt: skip
        point: Point = {name: one.base for name, one in self.varied.items()}
        for name, value in values.items():
            if name in self.varied:
                try:
                    point[name] = self.varied[name].accepted(value)
                except ValueError as error:
                    problems.append(Problem(name, shown(value), str(error)))
        if problems:
            raise SpecError(problems)
        made = self._at(number, point)
        if isinstance(made, LeftOut):
            given = ", ".join(f"{name} = {value}" for name, value in point.items())
            raise SpecError([Problem(made.rule, given, f"what the plan leaves in. {made.reason}")])
        return made

    def _at(self, number: int, point: Point) -> Variant | LeftOut:
        data = self.part_data
        for name, one in self.varied.items():
            if point[name] is not None:
                data = with_value(data, one.path, point[name])
        quantities = self._quantities(point)
        if broken := self._broken_constraint(data, quantities):
            return LeftOut(number, point, *broken)
        try:
            part = resolved(data)
            if broken := self.shop.broken(part):
                return LeftOut(number, point, *broken)
            data, part, most, fullest = self._toleranced(data, part)
        except SpecError as error:
            return LeftOut(number, point, error.problems[0].path, str(error.problems[0]))
        numbers = {name: quantity.value for name, quantity in quantities.items()}
        return Variant(number, point, numbers, data, *keys_of(part, fullest, self.keep.extra), most)

    def _toleranced(
        self, data: Mapping[str, Any], part: Part
    ) -> tuple[Mapping[str, Any], Part, Mapping[str, Any] | None, Part | None]:
        """Tables and part at least material, and both at most material, where there are tolerances."""
        if not self.tolerances or self.sampling.method == "as made":
            return data, part, None, None
        sides = extremes(data, Values(data.get("parameters", {})).scope, self.tolerances)
        return sides.least, resolved(sides.least), sides.most, resolved(sides.most)

    def _broken_constraint(self, data: Mapping[str, Any], quantities: Mapping[str, Quantity]) -> tuple[str, str] | None:
        """Rule and reason of the first constraint that does not hold, or None."""
        if not self.constraints:
            return None
        scope = {**quantities, **Values(data.get("parameters", {})).scope}
        for constraint in self.constraints:
            try:
                reason = constraint.broken(scope)
            except ExpressionError as error:
                reason = f"{constraint.text}: {error}"
            if reason:
                return f"constraints.{constraint.name}", reason
        return None

    def _quantities(self, point: Point) -> dict[str, Quantity]:
        found = {name: one.quantity(point[name], self._scope) for name, one in self.varied.items() if one.numeric}
        return {name: quantity for name, quantity in found.items() if quantity is not None}

    @cached_property
    def _scope(self) -> dict[str, Quantity]:
        return Values(self.part_data.get("parameters", {})).scope


def resolved(data: Mapping[str, Any]) -> Part:
    """The part of these tables, as `part_from_data` gives it, without its look at their depth: they are those of a part
    that was read, with values of the plan in them."""
    try:
        spec = PartSpec.model_validate(data)
    except ValidationError:
        return part_from_data(data)
    return spec.resolve()
