"""Products of inertia of a carried mass: both models read them as the entries xy, yz, zx of the tensor."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence

import numpy as np
import pytest
from solid_help import box_mesh, box_part

from fem.beam import solve_beam
from fem.solid import solve_solid
from geometry.budget import Budget
from geometry.part import Case, RegionLoad, RemotePoint, Support, Vibration

LENGTH, WIDTH, DEPTH = 300.0, 10.0, 20.0
WALL = Support("wall", "arm.start", dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0), "average")
TIP = RegionLoad("tip", "arm.end", force=(0.0, 0.0, -1.0))
MASS = 2e-3
OFFSET = np.array([40.0, 55.0, 70.0])
"""All three products count, and differ."""


def frequencies(carried: Sequence[RemotePoint]) -> list[np.ndarray]:
    """Hz of the solid and of the beam."""
    cases = (Case("all", {"tip": 1.0}),)
    part = dataclasses.replace(box_part(LENGTH, WIDTH, DEPTH, [WALL], [TIP, *carried], cases), vibration=Vibration(6))
    solid = solve_solid(part, box_mesh(LENGTH, WIDTH, DEPTH, (12, 1, 1)), Budget(threads=1))
    return [np.array([v.value for v in modes]) for modes in (solid.vibration, solve_beam(part).vibration)]


def carried(name: str, at: np.ndarray, mass: float, inertia: Sequence[float] = (0.0,) * 6) -> RemotePoint:
    point = tuple(np.array([LENGTH, 0.0, 0.0]) + at)
    return RemotePoint(name, "arm.end", point, "average", mass=mass, inertia=tuple(inertia))  # type: ignore[arg-type]


def test_products_of_inertia() -> None:
    """Exact, in each model: two point masses on either side of the end are a mass in the middle with the tensor of
    their inertia, int (r.r 1 - r r) dm, whose entry xy is -m x y."""
    x, y, z = OFFSET
    tensor = MASS * np.array([y * y + z * z, z * z + x * x, x * x + y * y, -x * y, -y * z, -z * x])
    pair = frequencies([carried("one", OFFSET, MASS / 2), carried("other", -OFFSET, MASS / 2)])
    for found, exact in zip(frequencies([carried("both", np.zeros(3), MASS, tensor)]), pair, strict=True):
        assert found == pytest.approx(exact, rel=1e-5)
    # with another place or sign the frequencies would be others
    for wrong in (tensor[[0, 1, 2, 3, 5, 4]], tensor * [1, 1, 1, -1, 1, 1]):
        for found, exact in zip(frequencies([carried("both", np.zeros(3), MASS, wrong)]), pair, strict=True):
            assert np.abs(found / exact - 1.0).max() > 1e-2
