"""A load that travels along a face: one strip load and one case for each of its positions."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from geometry.part import Case, StripLoad, Travel, Vector
from geometry.spec.model import LoadSpec
from geometry.spec.resolve.member import Table, mark_of
from geometry.spec.resolve.values import Values, shown


@dataclass(frozen=True, slots=True)
class Travelling:
    """A travelling load in numbers: N and mm.

    `start` and `end` are the first and last position of the first axle, from the member's start; `axles` the distance
    of each axle from the first.
    """

    name: str
    on: str
    force: Vector
    start: float
    end: float
    steps: int
    contact: float
    axles: tuple[float, ...]

    @property
    def positions(self) -> tuple[float, ...]:
        """Of the first axle, ``steps + 1`` of them, equally apart."""
        return tuple(self.start + (self.end - self.start) * k / self.steps for k in range(self.steps + 1))

    @property
    def strips(self) -> tuple[StripLoad, ...]:
        """One a position."""
        return tuple(
            StripLoad(at(self.name, x), self.on, tuple(x + axle for axle in self.axles), self.contact, self.force)
            for x in self.positions
        )


def at(name: str, position: float) -> str:
    """Name of a load or case at one position: ``crossing@350``."""
    return f"{name}@{position:.6g}"


def resolve_travelling(values: Values, name: str, spec: LoadSpec) -> Travelling:
    """The travelling load in numbers; its words are known to fit."""
    path = f"loads.{name}"
    assert spec.travels is not None
    if spec.force is None:
        values.problem(f"{path}.force", "nothing", "the force of each axle, such as [\"0 N\", \"0 N\", \"-2 kN\"]",
                       "Give force")  # fmt: skip
    table = Table(values, f"{path}.travels", spec.travels)
    axles = spec.travels.axles
    return Travelling(
        name, spec.on or "",
        values.vector(f"{path}.force", spec.force, mark_of(LoadSpec, "force")) if spec.force else (math.nan,) * 3,
        table.number("start"), table.number("end"), table.whole("steps"), table.number("contact"),
        tuple(values.number(f"{table.at('axles')}[{k}]", text, "length") for k, text in enumerate(axles, 1)),
    )  # fmt: skip


def cases_at_positions(
    values: Values, name: str, factors: Mapping[str, float], travelling: Mapping[str, Travelling], declared: bool
) -> tuple[Case, ...]:
    """A case as it is, or one a position of the travelling load in it (`declared`: it stands in the spec)."""
    moving = [load for load, factor in factors.items() if load in travelling and factor != 0.0]
    still = {load: factor for load, factor in factors.items() if load not in travelling}
    if not moving:
        return (Case(name, still),)
    if len(moving) > 1:
        fix = "Make a case for each" if declared else "Give [cases.NAME], a case for each"
        values.problem(f"cases.{name}" if declared else "cases", shown(", ".join(moving)).strip('"'),
                       "one travelling load in a case", f"{fix}: which positions would go together is not known; "
                       "axles that travel together are one load")  # fmt: skip
    load = travelling[moving[0]]
    return tuple(
        Case(at(name, x), {**still, at(load.name, x): factors[load.name]}, Travel(name, load.name, x))
        for x in load.positions
    )
