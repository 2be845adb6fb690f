"""The rectangular cantilever, b 50, h 100, L 2000, E 210000 (REFERENCES B1-B3, B17; Gere & Goodno, appendix)."""

from __future__ import annotations

import pytest

from geometry.part import LineLoad, RegionLoad, Section

TIP = RegionLoad("tip", "arm.end", force=(0.0, 0.0, -1000.0))
TIGHT = 1e-6


def test_tip_force(part, solve):
    """B1: PL^3/3EI and 24 MPa at the root, in tension on top."""
    r = solve(part(loads=[TIP]), shear=False)
    assert r("arm.end", "displacement", "z") == pytest.approx(-3.047619047619, rel=TIGHT)
    assert r("arm@0", "nominal_stress", "xx@top") == pytest.approx(24.0, rel=TIGHT)
    assert r("arm@0", "nominal_stress", "xx@bottom") == pytest.approx(-24.0, rel=TIGHT)
    assert r("wall", "reaction_force", "z") == pytest.approx(1000.0, rel=TIGHT)
    assert r("wall", "reaction_moment", "y") == pytest.approx(-2e6, rel=TIGHT)


def test_uniform_line_load(part, solve):
    """B2: wL^4/8EI, the load on the top face."""
    load = LineLoad("w", "arm.top", 0.0, 2000.0, (0.0, 0.0, -1.0), (0.0, 0.0, -1.0))
    r = solve(part(loads=[load]), shear=False)
    assert r("arm.end", "displacement", "z") == pytest.approx(-2.285714286, rel=TIGHT)


def test_end_moment(part, solve):
    """B3: ML^2/2EI and ML/EI; a moment about -y lifts the tip."""
    r = solve(part(loads=[RegionLoad("m", "arm.end", moment=(0.0, -1e6, 0.0))]), shear=False)
    assert r("arm.end", "displacement", "z") == pytest.approx(2.285714286, rel=TIGHT)
    assert r("arm.end", "rotation", "y") == pytest.approx(-2.285714286e-3, rel=TIGHT)


@pytest.mark.parametrize(("length", "bending", "shear"), [
    (200.0, 0.00304762, 0.00059429), (500.0, 0.0476190, 0.0014857), (2000.0, 3.047619, 0.005943)])
def test_shear_is_in_by_default(part, solve, length, bending, shear):
    """B17 with k = 5/6; the energy-based k of the section analysis (A15: 0.8329) differs by 0.05 %."""
    member = part(length=length, loads=[TIP])
    with_shear = -solve(member)("arm.end", "displacement", "z")
    without = -solve(member, shear=False)("arm.end", "displacement", "z")
    assert without == pytest.approx(bending, rel=2e-6)
    assert with_shear - without == pytest.approx(shear * (5 / 6) / 0.8329, rel=5e-4)


def test_shear_share_of_the_energy(part, solve):
    """B17: 16.3 % at L = 2 h."""
    r = solve(part(length=200.0, loads=[TIP]))
    assert r.result.shear_share["c"] == pytest.approx(0.163, abs=5e-4)


def test_two_directions(part, solve):
    """B24: 1000 N at 30 degrees from the strong plane, L 1000."""
    tip = RegionLoad("tip", "arm.end", force=(0.0, 500.0, -866.0254037844))
    r = solve(part(length=1000.0, loads=[tip]), shear=False)
    assert r("arm.end", "displacement", "z") == pytest.approx(-0.329914, rel=2e-6)
    assert r("arm.end", "displacement", "y") == pytest.approx(0.761905, rel=2e-6)
    # the corner: 22.3923 = top + the share of the side
    corner = abs(r("arm@0", "nominal_stress", "xx@top")) + abs(r("arm@0", "nominal_stress", "xx@left"))
    assert corner == pytest.approx(22.3923, abs=5e-5)


def test_a_square_section_of_its_own(part, solve):
    """B27: self-weight of 50 x 50, L 1000."""
    from geometry.part import BodyLoad

    r = solve(part(Section("rectangle", {"depth": 50.0, "width": 50.0}), 1000.0,
                   [BodyLoad("self_weight", (0.0, 0.0, -9810.0))]), shear=False)
    assert r("arm.end", "displacement", "z") == pytest.approx(-0.220024, rel=3e-6)
    assert r("wall", "reaction_force", "z") == pytest.approx(192.5213, rel=TIGHT)
    assert r("", "mass", case="") == pytest.approx(0.019625, rel=TIGHT)
