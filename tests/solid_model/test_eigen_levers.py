"""Buckling under dead forces at remote points, whose lever turns with the region that carries it."""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

import numpy as np
import pytest
from eigen_help import BUDGET, MEAN_WALL, E, G, buckling
from numpy.typing import NDArray
from scipy.integrate import solve_ivp
from scipy.optimize import brentq
from skfem import MeshTet2
from solid_help import box_mesh, box_part, box_regions, named_mesh, structured_box

from fem.solid.eigen import Eigenmodes
from fem.solid.eigen.rigid import rigid_motions
from fem.solid.eigen.stress_stiffness import stress_stiffnesses
from fem.solid.model import build_model
from fem.solid.system import HeldSystem
from geometry.part import Buckling, RegionLoad, RemotePoint, Support
from mesher.named_mesh import NamedMesh

Array = NDArray[np.float64]
L, WIDTH, DEPTH = 400.0, 5.0, 40.0
CELLS = (40, 1, 4)
IZ = DEPTH * WIDTH**3 / 12
J = DEPTH * WIDTH**3 / 3 * (1 - 0.63 * WIDTH / DEPTH)
"""Torsion constant of the thin rectangle, mm^4 (Roark)."""


def blade(load: RemotePoint | RegionLoad) -> float:
    """Least positive factor of the blade held at its start."""
    part = box_part(L, WIDTH, DEPTH, [MEAN_WALL], [load])
    return least(buckling(part, box_mesh(L, WIDTH, DEPTH, CELLS), Buckling("all", modes=1)))


def least(found: Eigenmodes) -> float:
    return min(m.value for m in found.modes if m.value > 0)


@lru_cache(maxsize=1)
def stiffness_of_mesh() -> float:
    """Factor of the blade with the force at its end over Prandtl's: 1.009 on this mesh, 0.9987 on one twice as fine."""
    ratio = blade(RegionLoad("down", "arm.end", (0.0, 0.0, -1.0))) / prandtl(0.0)
    assert ratio == pytest.approx(1.0, abs=0.01)
    return ratio


def far(x: float, y: float = 0.0, z: float = 0.0, coupling: str = "average", **more: object) -> RemotePoint:
    given = {"force": (0.0, 0.0, -1.0), **more}
    return RemotePoint("far", "arm.end", (x, y, z), coupling, **given)  # type: ignore[arg-type]


def prandtl(beyond: float, above: float = 0.0) -> float:
    """Least force down, N, at the end of a stiff piece of length `beyond`, `above` the line: Prandtl's equation
    G J phi'' + P^2 s^2 phi / (E Iz) = 0 with s the distance from the force, G J phi' = P above phi at the end of
    the blade, for the moment about its tangent there is P times the offset of the force, and the stiff piece is
    straight."""

    def torque(P: float) -> float:
        end = solve_ivp(lambda x, f: [f[1], -((P * (L + beyond - x)) ** 2) / (E * IZ * G * J) * f[0]], (0.0, L),
                        [0.0, 1.0], rtol=1e-9, atol=1e-12).y[:, -1]  # fmt: skip
        return float(end[1] - P * above / (G * J) * end[0])

    start = 4.013 * np.sqrt(E * IZ * G * J) / (L + beyond) ** 2
    return float(brentq(torque, 0.2 * start, 1.25 * start))


def stiff_block(beyond: float, regions: dict[str, object] | None = None) -> NamedMesh:
    """The blade with a block as wide as it is deep beyond its end, five hundred times as stiff."""
    nx = round(CELLS[0] * (L + beyond) / L)
    box = structured_box(L + beyond, WIDTH, DEPTH, (nx, 1, 4))
    x, y, z = box.doflocs
    mesh = MeshTet2(np.array([x, y * (1 + (DEPTH / WIDTH - 1) * np.clip((x - L) / 10.0, 0.0, 1.0)), z]), box.t)
    named = box_regions(L + beyond, WIDTH, DEPTH)
    return named_mesh(mesh, {"arm.start": named["arm.start"], "arm.end": named["arm.end"], **(regions or {})})  # type: ignore[dict-item]


@pytest.mark.parametrize("coupling", ["average", "rigid"])
def test_force_beyond_the_end_of_a_blade(coupling: str) -> None:
    found = blade(far(L + 100.0, coupling=coupling))
    assert found == pytest.approx(prandtl(100.0) * stiffness_of_mesh(), rel=5e-3)


def test_the_same_as_a_longer_blade_with_a_stiff_end() -> None:
    down = RegionLoad("down", "arm.end", (0.0, 0.0, -1.0))
    part = box_part(L + 100.0, WIDTH, DEPTH, [MEAN_WALL], [down])
    longer = buckling(part, stiff_block(100.0), Buckling("all", modes=1))
    assert least(longer) == pytest.approx(prandtl(100.0) * stiffness_of_mesh(), rel=5e-3)
    assert blade(far(L + 100.0)) == pytest.approx(least(longer), rel=1e-2)


@pytest.mark.parametrize("above", [-20.0, 60.0])
def test_force_above_the_end_of_a_blade(above: float) -> None:
    """Its arm lies along the force, so that no moment is handed on; hung below, it holds the blade upright."""
    found = blade(far(L, z=above))
    assert found == pytest.approx(prandtl(0.0, above) * stiffness_of_mesh(), rel=5e-3)


@pytest.mark.parametrize("coupling", ["average", "rigid"])
def test_force_beside_the_end_and_beyond(coupling: str) -> None:
    """Beside: against a traction on a patch of the side of a stiff block, which has no lever of its own."""
    patch = {"arm.patch": lambda x: (x[1] > DEPTH / 2 - 1e-6) & (x[0] > L + 60.0) & (np.abs(x[2]) < 10.0)}
    load = RegionLoad("down", "arm.patch", (0.0, 0.0, -1.0))
    part = box_part(L + 100.0, WIDTH, DEPTH, [MEAN_WALL], [load])
    block = least(buckling(part, stiff_block(100.0, patch), Buckling("all", modes=1)))
    found = blade(far(L + 80.0, DEPTH / 2, coupling=coupling))
    assert found == pytest.approx(block, rel=1e-2)


@pytest.mark.parametrize("couplings", [("average", "average"), ("rigid", "average"), ("rigid", "rigid")])
def test_opposite_forces_at_one_point_do_nothing_when_the_part_turns(couplings: tuple[str, str]) -> None:
    """Exact: two forces that cancel at one point have no potential, so that the second variation of a rigid turn, which
    strains nothing, is nought, wherever the point lies and whatever hands the forces on."""
    at, force, moment = (150.0, 60.0, 35.0), np.array([3.0, -5.0, 7.0]), np.array([200.0, 100.0, -300.0])
    patch = {"arm.patch": lambda x: (x[2] > 15.0 - 1e-6) & (np.abs(x[0] - 130.0) < 30.0)}
    loads = [RemotePoint(f"at {end}", f"arm.{end}", at, c, tuple(sign * force), tuple(sign * moment))  # type: ignore[arg-type]
             for end, c, sign in zip(("start", "patch"), couplings, (1.0, -1.0), strict=True)]  # fmt: skip
    side = Support("side", "arm.bottom", MEAN_WALL.held, "average")
    part = box_part(200.0, 20.0, 30.0, [side], loads)
    mesh = box_mesh(200.0, 20.0, 30.0, (10, 1, 2), patch)
    model = build_model(part, mesh)
    system = HeldSystem(model.K, model.constraints, mesh, BUDGET)
    n = mesh.nodes.shape[1]
    u = system.solve(model.forces()).u.T.reshape(1, n, 3).transpose(0, 2, 1)
    _, varying = stress_stiffnesses(model, system, np.ascontiguousarray(u), Buckling("all"))
    assert varying is not None
    R = rigid_motions(mesh.nodes, mesh.nodes.mean(axis=1))
    energy = R.T @ (varying @ R)
    parts = R.T @ (varying.part @ R)
    assert np.abs(parts[3:, 3:]).max() > 500.0  # N mm: what the levers take out
    assert energy == pytest.approx(np.zeros((6, 6)), abs=1e-6 * np.abs(parts).max())


def test_turning_the_whole_changes_nothing() -> None:
    load = far(L + 60.0, 25.0, 15.0, force=(0.2, 0.3, -1.0), moment=(20.0, -10.0, 5.0))
    part, mesh = box_part(L, WIDTH, DEPTH, [MEAN_WALL], [load]), box_mesh(L, WIDTH, DEPTH, (20, 1, 2))
    plain = buckling(part, mesh, Buckling("all", modes=2))
    Q = np.linalg.qr(np.random.default_rng(3).standard_normal((3, 3)))[0]
    Q *= np.linalg.det(Q)

    def turned(v: tuple[float, ...]) -> tuple[float, ...]:
        return tuple(float(x) for x in Q @ np.array(v))

    arm = part.members[0]
    member = replace(arm, start=turned(arm.start), end=turned(arm.end), up=turned(arm.up))  # type: ignore[arg-type]
    moved = replace(load, point=turned(load.point), force=turned(load.force), moment=turned(load.moment))  # type: ignore[arg-type]
    there = replace(part, members=(member,), loads=(moved,))
    result = buckling(there, replace(mesh, nodes=Q @ mesh.nodes), Buckling("all", modes=2))
    assert [m.value for m in result.modes] == pytest.approx([m.value for m in plain.modes], rel=1e-6)
