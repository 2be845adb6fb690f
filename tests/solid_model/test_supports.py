"""Couplings of supports and loads, reactions, reciprocity, and what is said when the part is not held."""

from __future__ import annotations

import numpy as np
import pytest
from skfem import MeshTet, MeshTet2
from solid_help import STEEL, box_mesh, box_part, named_mesh

from fem.figure import FigureKey
from fem.solid import SolidResult, solve_solid
from fem.solid.load import bearing_piece, linear_traction, surface_vector
from fem.solid.region import surface_region
from geometry.budget import Budget
from geometry.part import BearingLoad, BodyLoad, Case, RegionLoad, RemotePoint, Support
from geometry.problem import SolveError

BUDGET = Budget(threads=1)
ALL = {"x": 0.0, "y": 0.0, "z": 0.0}
SIX = {**ALL, "rx": 0.0, "ry": 0.0, "rz": 0.0}
L, B, H = 200.0, 20.0, 30.0
MESH = box_mesh(L, B, H, (8, 2, 3))


def value(
    result: SolidResult, place: str, quantity: str, component: str, case: str = "all", axes: str = "global"
) -> float:
    return {f.key: f.value for f in result.figures}[FigureKey(case, place, quantity, component, axes)]


def solve(supports, loads, cases=None, **more) -> SolidResult:  # type: ignore[no-untyped-def]
    result = solve_solid(box_part(L, B, H, supports, loads, cases), MESH, BUDGET, **more)
    assert [c for c in result.checks if not c.ok] == []
    return result


TIP = RegionLoad("tip", "arm.end", (200.0, 50.0, -100.0), (2000.0, 3000.0, -4000.0))


@pytest.mark.parametrize(
    "support",
    [
        Support("wall", "arm.start", ALL),
        Support("wall", "arm.start", SIX, "rigid"),
        Support("wall", "arm.start", SIX, "average"),
        Support("wall", "arm.start", SIX, "average", "member"),
    ],
)
@pytest.mark.parametrize("coupling", ["surface", "rigid", "average"])
def test_every_coupling_gives_the_reactions_of_statics(support: Support, coupling: str) -> None:
    tip = RegionLoad("tip", "arm.end", TIP.force, TIP.moment, coupling)  # type: ignore[arg-type]
    result = solve([support], [tip])
    force = [value(result, "wall", "reaction_force", c) for c in "xyz"]
    moment = [value(result, "wall", "reaction_moment", c) for c in "xyz"]
    assert force == pytest.approx([-200.0, -50.0, 100.0], abs=1e-6)
    # r x F with r = (L, 0, 0): (0, -L Fz, L Fy)
    assert moment == pytest.approx([-2000.0, -(3000 + L * 100), -(-4000 + L * 50)], abs=1e-3)
    assert value(result, "arm@0", "section_moment", "My", axes="member") == pytest.approx(3000 + L * 100, rel=1e-8)
    # bending deflection of the beam: P L^3 / 3EI + M L^2 / 2EI, both down; shear part with Cowper's k. H6: 2 % at
    # L/h 5; a root held point by point is also stiffer by the Poisson contraction that it prevents
    EI, kGA = 210000.0 * B * H**3 / 12, 0.8497 * 80769.0 * B * H
    exact = -(100 * L**3 / 3 + 3000 * L**2 / 2) / EI - 100 * L / kGA
    assert value(result, "arm.end", "displacement", "z") == pytest.approx(exact, rel=0.02)


@pytest.mark.heavy
def test_rigid_is_stiffer_than_surface_and_average() -> None:
    wall = Support("wall", "arm.start", ALL)
    energy = {}
    for coupling in ("surface", "rigid", "average"):
        tip = RegionLoad("tip", "arm.end", (0.0, 0.0, -100.0), (0.0, 0.0, 0.0), coupling)  # type: ignore[arg-type]
        result = solve([wall], [tip])
        energy[coupling] = result.strain_energy[0]
        if coupling == "rigid":
            ends = np.unique(result.mesh.facets["arm.end"])
            r = result.mesh.nodes[:, ends] - np.array([[L], [0], [0]])
            turn = [value(result, "arm.end", "rotation", c) for c in "xyz"]
            mean = [value(result, "arm.end", "displacement", c) for c in "xyz"]
            assert result.u[0][:, ends] == pytest.approx(np.array(mean)[:, None] + np.cross(turn, r.T).T, abs=1e-12)
    assert energy["rigid"] < energy["surface"]
    assert energy["average"] == pytest.approx(energy["surface"], rel=1e-12)  # both are tractions linear over the face


def test_prescribed_motion_moves_the_part() -> None:
    held = {"x": 0.1, "y": -0.2, "z": 0.3, "rx": 1e-3, "ry": -2e-3, "rz": 3e-3}
    for coupling in ("rigid", "average"):
        result = solve([Support("wall", "arm.start", held, coupling)], [TIP], [Case("none", {})])  # type: ignore[arg-type]
        exact = np.array([0.1, -0.2, 0.3])[:, None] + np.cross([1e-3, -2e-3, 3e-3], MESH.nodes.T).T
        assert result.u[0] == pytest.approx(exact, abs=1e-9)
        assert np.abs(result.stress).max() < 1e-3


def test_prescribed_stretch_and_its_reaction() -> None:
    result = solve(
        [
            Support("wall", "arm.start", {"x": 0.0, "rx": 0.0, "y": 0.0, "z": 0.0}, "average"),
            Support("pull", "arm.end", {"x": 0.05, "ry": 0.0, "rz": 0.0}, "average"),
        ],
        [],
        [Case("none", {})],
    )
    assert value(result, "pull", "reaction_force", "x", "none") == pytest.approx(210000 * B * H * 0.05 / L, rel=1e-6)
    assert value(result, "wall", "reaction_force", "x", "none") == pytest.approx(-210000 * B * H * 0.05 / L, rel=1e-6)
    assert result.strain_energy[0] == pytest.approx(210000 * B * H * 0.05**2 / L / 2, rel=1e-6)


def test_supports_that_share_an_edge_share_its_reaction() -> None:
    result = solve(
        [Support("a", "arm.start", ALL), Support("b", "arm.bottom", {"normal": 0.0})],
        [RegionLoad("press", "arm.top", (0.0, 0.0, -6000.0))],
    )
    total = value(result, "a", "reaction_force", "z") + value(result, "b", "reaction_force", "z")
    assert total == pytest.approx(6000.0, rel=1e-9)
    assert value(result, "b", "reaction_force", "z") > 5000.0
    assert value(result, "b", "reaction_force", "x") == pytest.approx(0.0, abs=1e-9)


def test_rigid_region_that_touches_a_held_face() -> None:
    result = solve(
        [Support("wall", "arm.start", ALL), Support("side", "arm.left", {"normal": 0.0})],
        [RegionLoad("tip", "arm.end", (0.0, 30.0, -100.0), coupling="rigid")],
    )
    total = [value(result, "wall", "reaction_force", c) + value(result, "side", "reaction_force", c) for c in "xyz"]
    assert total == pytest.approx([0.0, -30.0, 100.0], abs=1e-6)
    left = np.unique(MESH.facets["arm.left"])
    assert np.abs(result.u[0, 1, left]).max() < 1e-15


def test_contradicting_values_are_refused() -> None:
    with pytest.raises(SolveError, match="contradict"):
        solve([Support("a", "arm.start", ALL), Support("b", "arm.left", {"y": 0.1})], [TIP])


def test_betti_reciprocity() -> None:
    wall = Support("wall", "arm.start", ALL)
    one = RegionLoad("one", "arm.end", (0.0, 7.0, -3.0), (100.0, 0.0, 20.0))
    two = RegionLoad("two", "arm.top", (5.0, 2.0, -11.0))
    result = solve([wall], [one, two], [Case("1", {"one": 1.0}), Case("2", {"two": 1.0})])
    f = []
    for load in (one, two):
        region = surface_region(MESH, load.on)
        f.append(surface_vector(MESH, linear_traction(region, np.array(load.force), np.array(load.moment))).T)
    assert (f[0] * result.u[1]).sum() == pytest.approx((f[1] * result.u[0]).sum(), rel=1e-9)


def test_remote_point_is_its_force_and_moment_on_the_region() -> None:
    wall = Support("wall", "arm.start", ALL)
    remote = RemotePoint(
        "arm_tip", "arm.end", (L + 50.0, 5.0, -8.0), "average", (10.0, 20.0, -30.0), (1.0, 2.0, 3.0), mass=2e-4
    )
    weight = BodyLoad("self_weight", (0.0, 0.0, -9810.0))
    arm = np.array([50.0, 5.0, -8.0])
    same = RegionLoad(
        "same", "arm.end", (10.0, 20.0, -30.0), tuple(np.array([1.0, 2.0, 3.0]) + np.cross(arm, [10.0, 20.0, -30.0]))
    )
    a = solve([wall], [remote, weight], [Case("force", {"arm_tip": 1.0}), Case("weight", {"self_weight": 1.0})])
    b = solve([wall], [same])
    assert a.u[0] == pytest.approx(b.u[0], abs=1e-12)
    mass = 7.85e-9 * L * B * H + 2e-4
    assert value(a, "wall", "reaction_force", "z", "weight") == pytest.approx(mass * 9810, rel=1e-9)
    assert value(a, "wall", "reaction_moment", "x", "weight") == pytest.approx(2e-4 * 9810 * 5.0, rel=1e-6)


def test_bearing_load_has_its_resultant_and_only_pushes() -> None:
    box = MeshTet2.from_mesh(
        MeshTet.init_tensor(np.linspace(0, 10, 3), np.linspace(8, 20, 3), np.linspace(0, 2 * np.pi, 17))
    )
    x, r, t = box.doflocs
    mesh = named_mesh(
        MeshTet2(np.array([x, r * np.cos(t), r * np.sin(t)]), box.t), {"hole": lambda p: np.hypot(p[1], p[2]) < 8.2}
    )
    region = surface_region(mesh, "hole")
    assert region.area == pytest.approx(2 * np.pi * 8 * 10, rel=1e-3)
    force = np.array([0.0, 300.0, 400.0])
    piece = bearing_piece(mesh, region, force, "pin")
    f = surface_vector(mesh, piece)
    assert f.sum(axis=0) == pytest.approx(force, abs=1e-9 * 500)
    assert np.abs(np.cross(mesh.nodes.T - region.centroid, f).sum(axis=0)).max() < 1e-3 * 500 * 8
    # peak of the cosine: 2 F / (pi r l) at the point that is pushed; nothing on the far side
    n = -np.array([0.0, 0.6, 0.8])
    top = piece.traction(np.zeros((3, 1)), n[:, None])[:, 0]
    assert np.linalg.norm(top) == pytest.approx(2 * 500 / (np.pi * 8 * 10), rel=2e-3)
    assert np.linalg.norm(piece.traction(np.zeros((3, 1)), -n[:, None])) == 0.0
    with pytest.raises(SolveError, match="axis"):
        bearing_piece(mesh, region, np.array([10.0, 300.0, 0.0]), "pin")
    assert BearingLoad("pin", "hole", (0.0, 1.0, 0.0)).on == "hole"


@pytest.mark.parametrize(
    ("supports", "messages"),
    [
        ([Support("wall", "arm.start", {"x": 0.0})], ["turn about an axis along x", "slide along y", "slide along z"]),
        ([Support("wall", "arm.start", {"x": 0.0}), Support("side", "arm.left", {"normal": 0.0})], ["slide along z"]),
        ([Support("wall", "arm.start", ALL, "average")], ["along x", "along y", "along z"]),
        (
            [Support("wall", "arm.start", {**ALL, "rx": 0.0, "rz": 0.0}, "rigid")],
            ["turn about an axis along y through (0, 0, 0)"],
        ),
        ([], ["turn about an axis along x", "slide along x"]),
    ],
)
def test_a_part_that_is_not_held_is_told_its_free_motions(supports: list[Support], messages: list[str]) -> None:
    with pytest.raises(SolveError) as error:
        solve(supports, [TIP])
    for message in messages:
        assert message in str(error.value)
    assert str(error.value).count("it can") == (len(messages) if supports else 6)


def test_rotation_held_point_by_point_is_refused() -> None:
    with pytest.raises(SolveError, match="rotation"):
        solve([Support("wall", "arm.start", {"rx": 0.0})], [TIP])


def test_unknown_region_lists_the_known_ones() -> None:
    with pytest.raises(SolveError, match=r"arm\.end"):
        solve([Support("wall", "arm.foot", ALL)], [TIP])


def test_no_load_no_motion() -> None:
    result = solve([Support("wall", "arm.start", ALL)], [TIP], [Case("none", {}), Case("zero", {"tip": 0.0})])
    assert np.abs(result.u).max() == 0.0
    assert result.strain_energy == pytest.approx([0.0, 0.0])
    assert result.case_stress[0].yield_factor_everywhere is None
    assert result.peaks == ()
    assert STEEL.yield_strength == 235.0
