"""The count of eigenvalues: its memory, and that it counts the same matrix."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from eigen_help import BUDGET, MEAN_WALL, WALL, buckling, slender
from solid_help import box_mesh

from fem.solid.eigen import Eigenmodes, solid_buckling, solid_vibration, sounding
from fem.solid.eigen import count as module
from fem.solid.factor import SymmetricFactor, TooLarge
from fem.solid.model import build_model
from fem.solid.system import HeldSystem
from geometry.budget import Budget
from geometry.part import Buckling, RegionLoad, Vibration

PUSH = RegionLoad("push", "arm.end", (-1000.0, 0.0, 0.0))


@pytest.mark.parametrize("decided", [True, False])
def test_a_count_that_does_not_fit_beside_the_solver_gives_way_to_random_vectors(
    monkeypatch: pytest.MonkeyPatch, decided: bool
) -> None:
    """The second factor may take half of the memory: the solver's own, of the same pattern, holds the other half."""
    asked: list[float] = []

    def none_fits(matrix: Any, budget: Budget, **more: Any) -> SymmetricFactor:
        asked.append(budget.memory)
        raise TooLarge("too large")

    monkeypatch.setattr(module, "SymmetricFactor", none_fits)
    if not decided:
        monkeypatch.setattr(sounding, "STEPS", 1)
    part = replace(slender([WALL], [PUSH])[0], vibration=Vibration(2), buckling=(Buckling("all", modes=2),))
    mesh = box_mesh(1000.0, 20.0, 30.0, (15, 1, 1))
    model = build_model(part, mesh)
    system = HeldSystem(model.K, model.constraints, mesh, BUDGET)
    u = system.solve(model.forces()).u.T.reshape(1, -1, 3).transpose(0, 2, 1)
    results = [solid_vibration(model, system, BUDGET), solid_buckling(model, system, np.ascontiguousarray(u), BUDGET)]
    for result in results:
        note = _missed(result)
        assert "do not fit the budget" in note
        assert ("steps from random vectors leave a chance below 1e-06" in note) == decided
        assert ("this takes for granted that" in note) == decided
        assert ("a second search from other vectors found none" in note) != decided
    assert asked and set(asked) == {BUDGET.memory // 2}


def _missed(result: Eigenmodes) -> str:
    (note,) = [c.note for c in result.checks if "missed" in c.name]
    return note


@pytest.mark.parametrize("stay", [-0.6, 3.0])
def test_the_count_holds_the_fixed_loads(stay: float) -> None:
    """A pull that stays, or a push short of what buckles, moves every factor: the count below the shifted one agrees
    only if it has the stress of the fixed loads as well. Without it none lies below
    0.4 times the least, or two below four times."""
    alone = buckling(*slender([MEAN_WALL], [PUSH]), Buckling("all", modes=1)).modes[0].value
    dead = RegionLoad("dead", "arm.end", (stay * 1000.0 * alone, 0.0, 0.0))
    result = buckling(*slender([MEAN_WALL], [PUSH, dead]), Buckling("all", ("dead",), 1))
    assert result.modes[0].value == pytest.approx(alone * (1.0 + stay), rel=1e-6)
    assert _missed(result).startswith("1 between 0 and")
