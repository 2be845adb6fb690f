"""Deflections and reactions of the standard beam tables (REFERENCES B5-B16; Gere & Goodno, appendix; AISC table 3-23).

b 50, h 100, L 2000, E 210000: EI = 8.75e11 N mm^2. Shear is left out, as the tables do. A roller is the mean of a
region (coupling average); a force at a point is a force on a patch 0.02 mm long.
"""

from __future__ import annotations

import math

import pytest

from geometry.part import Case, LineLoad, Patch, Place, RegionLoad, Support

EI, L, P, W = 8.75e11, 2000.0, 1000.0, 1.0
TIGHT = 1e-6
PIN = Support("a", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0, "rx": 0.0}, "average")
ROLLER = Support("b", "arm.end", {"y": 0.0, "z": 0.0}, "average")
WALL = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
FAR_WALL = Support("far", "arm.end", {"x": 0.0, "y": 0.0, "z": 0.0})
UNIFORM = LineLoad("w", "arm.top", 0.0, L, (0.0, 0.0, -W), (0.0, 0.0, -W))


def spot(name, at):
    return Patch(name, "top", at - 0.01, at + 0.01)


def point_force(at, size=P):
    return spot("spot", at), RegionLoad("p", "arm.spot", force=(0.0, 0.0, -size))


def solved(part, solve, loads, supports=(PIN, ROLLER), at=(), **more):
    places = [Place(f"p{i}", "arm", x) for i, x in enumerate(at)]
    return solve(part(loads=loads, supports=supports, places=places, **more), shear=False, plain=True)


def down(r, place):
    return -r(place, "displacement", "z")


def test_simple_centre_force(part, solve):
    """B5"""
    patch, load = point_force(L / 2)
    r = solved(part, solve, [load], patches=(patch,))
    assert down(r, "arm@1000") == pytest.approx(P * L**3 / 48 / EI, rel=TIGHT)


def test_simple_uniform(part, solve):
    """B6"""
    r = solved(part, solve, [UNIFORM])
    assert down(r, "arm@1000") == pytest.approx(0.238095238, rel=TIGHT)
    assert r("arm@1000", "section_moment", "My") == pytest.approx(-W * L**2 / 8, rel=TIGHT)


def test_simple_force_at_a_quarter(part, solve):
    """B7: under the load, and the maximum."""
    a = L / 4
    patch, load = point_force(a)
    r = solved(part, solve, [load], at=[a, L - math.sqrt((L**2 - a**2) / 3)], patches=(patch,))
    assert down(r, "p0") == pytest.approx(0.107142857, rel=TIGHT)
    assert down(r, "p1") == pytest.approx(P * a * (L**2 - a**2) ** 1.5 / (9 * math.sqrt(3) * L * EI), rel=TIGHT)


def test_simple_end_moment(part, solve):
    """B8"""
    r = solved(part, solve, [RegionLoad("m", "arm.end", moment=(0.0, -1e6, 0.0))], at=[L / math.sqrt(3)])
    assert abs(down(r, "p0")) == pytest.approx(0.293257, rel=2e-6)
    assert abs(down(r, "arm@1000")) == pytest.approx(0.285714286, rel=TIGHT)


def test_simple_half_uniform(part, solve):
    """B9"""
    half = LineLoad("w", "arm.top", 0.0, L / 2, (0.0, 0.0, -W), (0.0, 0.0, -W))
    r = solved(part, solve, [half], at=[0.375 * L])
    assert down(r, "arm@1000") == pytest.approx(0.119047619, rel=TIGHT)
    assert r("a", "reaction_force", "z") == pytest.approx(750.0, rel=TIGHT)
    assert r("b", "reaction_force", "z") == pytest.approx(250.0, rel=TIGHT)
    diagram = r.result.diagrams["c"]
    assert diagram.My.min() == pytest.approx(-281250.0, rel=TIGHT)


def test_simple_triangular(part, solve):
    """B10; the printed 0.0065222 has five digits."""
    ramp = LineLoad("w", "arm.top", 0.0, L, (0.0, 0.0, 0.0), (0.0, 0.0, -W))
    r = solved(part, solve, [ramp], at=[0.51933 * L, L / math.sqrt(3)])
    assert down(r, "p0") == pytest.approx(0.0065222 * W * L**4 / EI, rel=1e-5)
    assert r("a", "reaction_force", "z") == pytest.approx(W * L / 6, rel=TIGHT)
    assert r("b", "reaction_force", "z") == pytest.approx(W * L / 3, rel=TIGHT)
    assert r.result.diagrams["c"].My.min() == pytest.approx(-W * L**2 / (9 * math.sqrt(3)), rel=TIGHT)


def test_cantilever_triangular(part, solve):
    """B4: largest at the fixed end, and at the free end."""
    at_root = LineLoad("r", "arm.top", 0.0, L, (0.0, 0.0, -W), (0.0, 0.0, 0.0))
    at_tip = LineLoad("t", "arm.top", 0.0, L, (0.0, 0.0, 0.0), (0.0, 0.0, -W))
    cases = (Case("r", {"r": 1.0}), Case("t", {"t": 1.0}))
    r = solved(part, solve, [at_root, at_tip], (WALL,), cases=cases)
    assert -r("arm.end", "displacement", "z", "r") == pytest.approx(W * L**4 / 30 / EI, rel=TIGHT)
    assert -r("arm.end", "displacement", "z", "t") == pytest.approx(11 * W * L**4 / 120 / EI, rel=TIGHT)


def test_overhang(part, solve):
    """B11: a 500 beyond the span, the inner support on a patch."""
    inner = Support("b", "arm.prop", {"y": 0.0, "z": 0.0}, "average")
    tip = RegionLoad("p", "arm.end", force=(0.0, 0.0, -P))
    r = solved(part, solve, [tip], (PIN, inner), [L / math.sqrt(3)], length=2500.0, patches=(spot("prop", L),))
    assert down(r, "arm.end") == pytest.approx(0.238095238, rel=TIGHT)
    assert -down(r, "p0") == pytest.approx(0.146629, rel=4e-6)


def test_propped_uniform(part, solve):
    """B12; the prop is the far end."""
    r = solved(part, solve, [UNIFORM], (WALL, ROLLER), [L * (1 - 0.42154)])
    assert r("b", "reaction_force", "z") == pytest.approx(3 * W * L / 8, rel=TIGHT)
    assert r("wall", "reaction_moment", "y") == pytest.approx(-W * L**2 / 8, rel=TIGHT)
    assert down(r, "p0") == pytest.approx(0.0054161 * W * L**4 / EI, rel=1e-5)


def test_propped_centre_force(part, solve):
    """B13"""
    patch, load = point_force(L / 2)
    r = solved(part, solve, [load], (WALL, ROLLER), [L * (1 - 1 / math.sqrt(5))], patches=(patch,))
    assert r("b", "reaction_force", "z") == pytest.approx(5 * P / 16, rel=TIGHT)
    assert r("wall", "reaction_moment", "y") == pytest.approx(-3 * P * L / 16, rel=TIGHT)
    assert down(r, "p0") == pytest.approx(P * L**3 / (48 * math.sqrt(5) * EI), rel=TIGHT)


def test_built_in(part, solve):
    """B14: uniform, centre force, and a force at 500."""
    r = solved(part, solve, [UNIFORM], (WALL, FAR_WALL))
    assert down(r, "arm@1000") == pytest.approx(0.0476190476, rel=TIGHT)
    assert r("wall", "reaction_moment", "y") == pytest.approx(-W * L**2 / 12, rel=TIGHT)
    patch, load = point_force(500.0)
    r = solved(part, solve, [load], (WALL, FAR_WALL), patches=(patch,))
    assert r("wall", "reaction_moment", "y") == pytest.approx(-281250.0, rel=TIGHT)
    assert r("far", "reaction_moment", "y") == pytest.approx(93750.0, rel=TIGHT)
    assert down(r, "arm@500") == pytest.approx(0.0200892857, rel=TIGHT)
    patch, load = point_force(1000.0)
    r = solved(part, solve, [load], (WALL, FAR_WALL), patches=(patch,))
    assert down(r, "arm@1000") == pytest.approx(0.0476190476, rel=TIGHT)


def test_two_equal_spans(part, solve):
    """B15: both spans loaded, and one."""
    middle = Support("m", "arm.prop", {"z": 0.0}, "average")
    one = LineLoad("one", "arm.top", 0.0, L, (0.0, 0.0, -W), (0.0, 0.0, -W))
    two = LineLoad("two", "arm.top", L, 2 * L, (0.0, 0.0, -W), (0.0, 0.0, -W))
    cases = (Case("both", {"one": 1.0, "two": 1.0}), Case("left", {"one": 1.0}))
    r = solved(part, solve, [one, two], (PIN, ROLLER, middle), length=2 * L, patches=(spot("prop", L),), cases=cases)
    got = {c: [r(s, "reaction_force", "z", c) / (W * L) for s in "amb"] for c in ("both", "left")}
    assert got["both"] == pytest.approx([3 / 8, 5 / 4, 3 / 8], rel=TIGHT)
    assert got["left"] == pytest.approx([7 / 16, 5 / 8, -1 / 16], rel=TIGHT)
    assert r.result.diagrams["both"].My.max() == pytest.approx(W * L**2 / 8, rel=2e-5)  # the prop is 0.02 mm long


def test_two_unequal_spans(part, solve):
    """B16 (Clapeyron): 3000 and 4000, w 10."""
    middle = Support("m", "arm.prop", {"z": 0.0}, "average")
    w = LineLoad("w", "arm.top", 0.0, 7000.0, (0.0, 0.0, -10.0), (0.0, 0.0, -10.0))
    r = solved(part, solve, [w], (PIN, ROLLER, middle), length=7000.0, patches=(spot("prop", 3000.0),))
    assert [r(s, "reaction_force", "z") for s in "amb"] == pytest.approx([9583.3333, 44479.1667, 15937.5], rel=TIGHT)
