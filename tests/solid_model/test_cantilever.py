"""The rectangular cantilever through the whole solid model."""

from __future__ import annotations

import pytest
from solid_help import box_mesh, box_part

from fem.figure import FigureKey
from fem.solid import SolidResult, solve_solid
from geometry.budget import Budget
from geometry.part import RegionLoad, Support

L, B, H, P = 500.0, 50.0, 100.0, 1000.0
E, NU, G = 210000.0, 0.3, 80769.23


def value(
    result: SolidResult, place: str, quantity: str, component: str, case: str = "all", axes: str = "global"
) -> float:
    return {f.key: f.value for f in result.figures}[FigureKey(case, place, quantity, component, axes)]


@pytest.fixture(scope="module")
def cantilever() -> SolidResult:
    part = box_part(
        L,
        B,
        H,
        [Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})],
        [RegionLoad("tip", "arm.end", (0.0, 0.0, -P))],
    )
    return solve_solid(part, box_mesh(L, B, H, (12, 2, 4)), Budget(threads=1))


def test_tip_deflection_is_that_of_a_timoshenko_beam(cantilever: SolidResult) -> None:
    # REFERENCES B17: bending 0.0476190 + shear (Cowper) 0.0014571 at L 500; H6: 2 % at L/h 5
    assert value(cantilever, "arm.end", "displacement", "z") == pytest.approx(-0.0490761, rel=0.02)


def test_reactions_are_the_statics(cantilever: SolidResult) -> None:
    assert value(cantilever, "wall", "reaction_force", "z") == pytest.approx(P, rel=1e-9)
    # the wall holds the bar against turning down: -P at x = L turns about +y, so the wall gives -P L
    assert value(cantilever, "wall", "reaction_moment", "y") == pytest.approx(-P * L, rel=1e-9)
    assert abs(value(cantilever, "wall", "reaction_moment", "z")) < 1e-6 * P * L


def test_every_check_holds(cantilever: SolidResult) -> None:
    assert [c for c in cantilever.checks if not c.ok] == []


def test_a_very_slender_bar_is_solved_although_rounding_dominates_its_residual() -> None:
    """Length over depth 600: tip deflection of Gere & Goodno's appendix, P L^3 / 3 E I."""
    length, side = 6000.0, 10.0
    mesh = box_mesh(length, side, side, (200, 1, 1))
    wall = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
    part = box_part(length, side, side, [wall], [RegionLoad("tip", "arm.end", force=(0.0, 0.0, -0.01))])
    result = solve_solid(part, mesh, Budget(threads=1))
    residual = next(c for c in result.checks if c.name.startswith("residual"))
    assert residual.value > 1e-6  # else the test shows nothing
    assert residual.ok and "slender" in residual.note
    assert not [c.name for c in result.checks if not c.ok and "largest displacement" not in c.name]
    tip = -0.01 * length**3 / (3 * 210000 * side**4 / 12)
    value = next(f.value for f in result.figures
                 if f.key.place == "arm.end" and f.key.quantity == "displacement" and f.key.component == "z")
    assert value == pytest.approx(tip, rel=5e-3)
