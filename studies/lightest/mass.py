"""The aim without a solve, where it depends on the mass and the dimensions alone.

The mass is that of plates, roots and cuts (`studies.vary.plan.material`): the same but for a few ten-thousandths where
roundings meet tapers or cuts. What is left of a difference is learned from the solved variants, with its error.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from geometry.problem import HaunchError
from studies.vary.plan.material import mass_of_tables
from studies.vary.plan.place import with_value
from studies.vary.plan.plan import resolved

if TYPE_CHECKING:
    from studies.vary.plan import Plan


@dataclass
class MassBefore:
    """Cost of the aim at any values of what is varied, by the mass of the tables."""

    plan: Plan
    _densities: dict[str, float] = field(default_factory=dict)

    @staticmethod
    def of(plan: Plan) -> MassBefore | None:
        """None where the aim needs figures that take a solve."""
        return MassBefore(plan) if all(f.name == "mass" for f in plan.aim.figures) else None

    def aim(self, values: Mapping[str, Any], numbers: Mapping[str, float], fullest: Mapping[str, Any] | None
            ) -> float | None:
        """The cost (less is better); None where the tables give no mass. `fullest`: tables at most material."""
        data: Mapping[str, Any]
        if fullest is not None:
            data = fullest
        else:
            data = self.plan.part_data
            for name, value in values.items():
                data = with_value(data, self.plan.varied[name].path, value)
        try:
            mass = mass_of_tables(data) * self._density(data)
        except (HaunchError, ValueError, ArithmeticError, LookupError):
            return None
        words = {name for name, one in self.plan.varied.items() if not one.numeric}
        found = {name: number for name, number in numbers.items() if name not in words}
        cost = self.plan.aim.cost({"mass": mass}, found)
        return cost if math.isfinite(cost) else None

    def _density(self, data: Mapping[str, Any]) -> float:
        """Density of a material from the table; 1 where the tables give their own, which is in the mass already."""
        name = data.get("material")
        if not isinstance(name, str):
            return 1.0
        if name not in self._densities:
            self._densities[name] = resolved({**self.plan.part_data, "material": name}).material.density
        return self._densities[name]
