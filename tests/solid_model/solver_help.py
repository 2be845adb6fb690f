"""Parts, meshes and solutions that the tests of the solvers share."""

from __future__ import annotations

import numpy as np
from skfem import MeshTet2
from solid_help import box_mesh, named_mesh, structured_box

from fem.solid.model import SolidModel
from fem.solid.solver import Choice
from fem.solid.system import HeldSystem, Solution
from geometry.budget import Budget
from geometry.part import RegionLoad, Support
from mesher.named_mesh import NamedMesh

BUDGET = Budget(threads=1)
L, B, H = 100.0, 30.0, 40.0
ALL = {"x": 0.0, "y": 0.0, "z": 0.0}
SIX = {**ALL, "rx": 0.0, "ry": 0.0, "rz": 0.0}
WALL = Support("wall", "arm.start", ALL)
TIP = RegionLoad("tip", "arm.end", (1000.0, 2000.0, -3000.0))


def straight_mesh(cells: tuple[int, int, int] = (6, 2, 3)) -> NamedMesh:
    return box_mesh(L, B, H, cells)


def bent_mesh(cells: tuple[int, int, int] = (6, 2, 3)) -> NamedMesh:
    """The box with curved elements: its sides bulge, the middle nodes go with the map."""
    box = structured_box(L, B, H, cells)
    x, y, z = box.doflocs
    wave = 1 + 0.15 * np.sin(np.pi * x / L)
    return named_mesh(
        MeshTet2(np.array([x, y * wave, z * wave]), box.t),
        {"arm.start": lambda p: p[0] < 1e-6, "arm.end": lambda p: p[0] > L - 1e-6,
         "arm.left": lambda p: p[1] < -B / 2 + 1e-3, "arm.bottom": lambda p: p[2] < -H / 2 + 1e-3},
    )  # fmt: skip


def right_hand_sides(model: SolidModel) -> np.ndarray:
    return model.forces()


def solution(model: SolidModel, choice: Choice, backend: str = "auto", budget: Budget = BUDGET) -> Solution:
    system = HeldSystem(model.K, model.constraints, model.mesh, budget, choice, backend)
    try:
        result = system.solve(right_hand_sides(model))
        assert result.backend.startswith(choice)  # no silent change of the solver
        return result
    finally:
        system.close()


def gap(a: np.ndarray, b: np.ndarray) -> float:
    return float(np.abs(a - b).max() / np.abs(b).max())
