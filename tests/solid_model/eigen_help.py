"""Bars for the checks of natural frequencies and buckling."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray
from skfem import MeshTet2
from solid_help import box_mesh, box_part, box_regions, named_mesh, structured_box

from fem.solid.eigen import Eigenmodes, solid_buckling, solid_vibration
from fem.solid.model import build_model
from fem.solid.system import HeldSystem
from geometry.budget import Budget
from geometry.part import Buckling, Part, Support, Vibration
from mesher.named_mesh import NamedMesh

BUDGET = Budget(threads=1)
ALL = {"x": 0.0, "y": 0.0, "z": 0.0}
SIX = {**ALL, "rx": 0.0, "ry": 0.0, "rz": 0.0}
WALL = Support("wall", "arm.start", ALL)
MEAN_WALL = Support("wall", "arm.start", SIX, "average")
PINS = (
    Support("first", "arm.start", {**ALL, "rx": 0.0}, "average"),
    Support("second", "arm.end", {"y": 0.0, "z": 0.0}, "average"),
)
E, NU, RHO = 210000.0, 0.3, 7.85e-9
G = E / (2 * (1 + NU))


def tapered_mesh(length: float, width: float, depth: float, ratio: float, cells: tuple[int, int, int]) -> NamedMesh:
    """A bar whose depth falls to `ratio` of its first value, about its middle."""
    box = structured_box(length, width, depth, cells)
    x, y, z = box.doflocs
    mesh = MeshTet2(np.array([x, y, z * (1 - (1 - ratio) * x / length)]), box.t)
    regions = box_regions(length, width, depth)
    return named_mesh(mesh, {name: regions[name] for name in ("arm.start", "arm.end")})


def tube_mesh(length: float, inner: float, outer: float, cells: tuple[int, int, int]) -> NamedMesh:
    """A quarter tube x in (0, length) in the first quadrant of y and z: arm.left is y = 0, arm.bottom is z = 0."""
    box = structured_box(length, 1.0, 1.0, cells)
    x, s, t = box.doflocs
    r, angle = inner + (outer - inner) * (s + 0.5), (t + 0.5) * np.pi / 2
    mesh = MeshTet2(np.array([x, r * np.cos(angle), r * np.sin(angle)]), box.t)
    tol = 1e-6 * length

    def flat(p: NDArray[np.float64], i: int) -> NDArray[np.bool_]:
        return np.asarray(np.abs(p[i]) < tol)

    return named_mesh(
        mesh,
        {
            "arm.start": lambda p: p[0] < tol,
            "arm.end": lambda p: p[0] > length - tol,
            "arm.left": lambda p: flat(p, 1),
            "arm.bottom": lambda p: flat(p, 2),
        },
    )


def vibration(part: Part, mesh: NamedMesh, modes: int = 6, free: bool = False) -> Eigenmodes:
    """Natural frequencies of the part on the mesh; every check must hold."""
    model = build_model(replace(part, vibration=Vibration(modes, free)), mesh)
    system = None if free else HeldSystem(model.K, model.constraints, mesh, BUDGET)
    result = solid_vibration(model, system, BUDGET)
    assert [c for c in result.checks if not c.ok] == []
    assert not [c for c in result.checks if "not counted" in c.note]
    return result


def buckling(part: Part, mesh: NamedMesh, *studies: Buckling) -> Eigenmodes:
    """Buckling factors of the part on the mesh."""
    model = build_model(replace(part, buckling=studies), mesh)
    n, cases = mesh.nodes.shape[1], len(part.cases)
    system = HeldSystem(model.K, model.constraints, mesh, BUDGET)
    solution = system.solve(model.forces())
    u = np.ascontiguousarray(solution.u.T.reshape(cases, n, 3).transpose(0, 2, 1))
    result = solid_buckling(model, system, u, BUDGET)
    assert not [c for c in result.checks if "not counted" in c.note]
    return result


def frequencies(result: Eigenmodes, kind: str = "") -> list[float]:
    """Hz, of one kind or all."""
    return [m.value for m in result.modes if kind in m.kind]


def slender(supports: Sequence[Support], loads: Sequence[object] = ()) -> tuple[Part, NamedMesh]:
    """Steel 20 x 30 x 1000 (REFERENCES E2)."""
    return box_part(1000.0, 20.0, 30.0, supports, loads), box_mesh(1000.0, 20.0, 30.0, (30, 2, 2))
