"""A kept factor: used again for the very same equations only, and then with the very same result."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

import numpy as np
import pytest

from fem.solid import solve_solid
from fem.solid.kept import KeptSystem
from fem.solid.kernels.tiny import tiny_mesh, tiny_part
from fem.solid.result import SolidResult
from geometry.budget import Budget
from geometry.part import Part, RegionLoad, Support

MESH = tiny_mesh()


def _part(force: float = -50.0, held: float = 0.0) -> Part:
    part = tiny_part()
    push = RegionLoad("push", "bar.end", (-1000.0, 0.0, force))
    wall = Support("wall", "bar.start", {"x": held, "y": 0.0, "z": 0.0})
    return replace(part, loads=(push, *part.loads[1:]), supports=(wall,))


def _same(one: SolidResult, other: SolidResult) -> bool:
    values = [[figure.value for figure in result.figures] for result in (one, other)]
    modes = [[mode.value for mode in (*result.vibration, *result.buckling)] for result in (one, other)]
    return np.array_equal(one.u, other.u) and values[0] == values[1] and modes[0] == modes[1]


@pytest.mark.parametrize("solver", ["cholesky", "multigrid"])
def test_a_family_of_loads_shares_one_factor(solver: Literal["cholesky", "multigrid"]) -> None:
    still = replace(_part(), cases=tiny_part().cases[:2], buckling=())
    family = [_part(), _part(-70.0), _part(-70.0, held=0.01), still]
    kept = KeptSystem()
    shared = [solve_solid(part, MESH, Budget(1), solver=solver, kept=kept) for part in family]
    assert kept.reused == len(family) - 1
    kept.close()
    for part, one in zip(family, shared, strict=True):
        assert _same(one, solve_solid(part, MESH, Budget(1), solver=solver))
    assert not _same(shared[0], shared[1])


@pytest.mark.parametrize("changed", ["stiffness", "support", "mesh", "budget"])
def test_other_equations_have_a_factor_of_their_own(changed: str) -> None:
    kept, material = KeptSystem(), tiny_part().material
    solve_solid(_part(), MESH, Budget(1), kept=kept)
    part, mesh, budget = _part(), MESH, Budget(1)
    if changed == "stiffness":
        part = replace(part, material=replace(material, nu=0.31))
    elif changed == "support":
        held = dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0)
        part = replace(part, supports=(Support("wall", "bar.start", held, "average"),))  # type: ignore[arg-type]
    elif changed == "mesh":
        mesh = replace(MESH, nodes=1.001 * MESH.nodes)
    else:
        budget = Budget(1, memory=3000)
    found = solve_solid(part, mesh, budget, kept=kept)
    assert kept.reused == 0
    assert _same(found, solve_solid(part, mesh, budget))
    kept.close()
