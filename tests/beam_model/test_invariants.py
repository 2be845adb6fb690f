"""What must hold whatever the part: equilibrium, reciprocity, frames, couplings, and errors for bad input."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from geometry.part import (
    BearingLoad,
    BodyLoad,
    Case,
    Cut,
    LineLoad,
    Patch,
    Pressure,
    RegionLoad,
    RemotePoint,
    Section,
    Station,
    Support,
)
from geometry.problem import RunError, SolveError

L = 600.0
SECTION = Section("channel", {"depth": 80.0, "width": 40.0, "web": 6.0, "flange": 8.0})
TAPER = (Station(L, {"depth": 50.0, "width": 30.0}),)
HOLE = Cut("hole1", "hole", "hole", "y", "web", 250.0, 5.0, 16.0, 16.0)
PATCH = Patch("pad", "top", 300.0, 360.0)
WEIGHT = BodyLoad("g", (1000.0, -2000.0, -9810.0))
LOADS = (
    RegionLoad("tip", "arm.end", force=(100.0, -50.0, -200.0), moment=(1e3, 2e3, 3e3)),
    RegionLoad("pad", "arm.pad", force=(10.0, 20.0, -300.0), moment=(500.0, 1e3, -700.0)),
    RegionLoad("avg", "arm.pad", force=(0.0, 0.0, 40.0), moment=(0.0, 100.0, 0.0), coupling="average"),
    RegionLoad("stiff", "arm.pad", force=(5.0, 0.0, 40.0), moment=(0.0, 100.0, 9.0), coupling="rigid"),
    Pressure("p_top", "arm.top", 0.05),
    Pressure("p_end", "arm.end", 0.3),
    BearingLoad("pin", "arm.hole1", (150.0, 0.0, -80.0)),
    LineLoad("line", "arm.bottom", 100.0, 400.0, (0.0, 0.0, -0.2), (0.1, 0.0, -0.6)),
    RemotePoint("camera", "arm.end", (700.0, 30.0, 20.0), "rigid", (0.0, 0.0, -20.0), (0.0, 0.0, 300.0), 2e-3),
    WEIGHT,
)
CASES = tuple(Case(v.name, {v.name: 1.0}) for v in LOADS)


@pytest.fixture
def full(part):
    def build(**more):
        return part(SECTION, L, LOADS, cases=CASES, stations=TAPER, anchor="top", cuts=(HOLE,), patches=(PATCH,),
                    **more)

    return build


def expected_resultant(name, r):
    """Force and moment about the global origin of each load; the region's centroid is where it is drawn."""
    mass, centre = r("", "mass", case=""), np.array([r("", "centre_of_mass", c, "") for c in "xyz"])
    if name == "g":
        F = np.array(WEIGHT.force_per_mass)
        return (mass + 2e-3) * F, np.cross(centre, mass * F) + np.cross((700.0, 30.0, 20.0), 2e-3 * F)
    if name == "camera":
        return np.array([0.0, 0.0, -20.0]), np.cross((700.0, 30.0, 20.0), (0.0, 0.0, -20.0)) + (0.0, 0.0, 300.0)
    return None


def test_reactions_balance_every_load(full, solve):
    """Forces on the one support: for loads with a known resultant, force and moment; 1e-9 of the load."""
    r = solve(full(), plain=True)  # statics only
    centre = np.array([0.0, 0.0, 0.0])  # the line is the centroid's at the start
    for name in ("g", "camera"):
        F, M = expected_resultant(name, r)
        got_F = np.array([r("wall", "reaction_force", c, name) for c in "xyz"])
        got_M = np.array([r("wall", "reaction_moment", c, name) for c in "xyz"])
        assert got_F == pytest.approx(-F, abs=1e-6 * np.linalg.norm(F))
        assert got_M == pytest.approx(-(M - np.cross(centre, F)), abs=2e-6 * np.linalg.norm(M))
    for load in LOADS[:4]:
        got_F = np.array([r("wall", "reaction_force", c, load.name) for c in "xyz"])
        assert got_F == pytest.approx(-np.array(load.force), abs=1e-9 * np.linalg.norm(load.force))


def test_region_moments_are_about_the_regions_centroid(full, solve):
    """The pad lies on the flat top, x 300 to 360, and is narrower at its far end."""
    r = solve(full(), plain=True)  # statics only
    load = LOADS[1]
    y0, z0 = 0.0, 0.0
    widths = 40.0 - 10.0 * np.array([300.0, 360.0]) / L
    cx = 300 + 60 * (widths[0] + 2 * widths[1]) / (3 * widths.sum())
    from fem.beam.outlines import member_outline

    member = full().members[0]
    top = max(p.start[1] for p in member_outline(member, 0.0).outer)
    left = min(p.start[0] for p in member_outline(member, 0.0).outer)
    cy = left + (widths[0] ** 2 + widths[0] * widths[1] + widths[1] ** 2) / (3 * widths.sum())
    want = -(np.array(load.moment) + np.cross((cx - y0, cy - y0, top - z0), load.force))
    got = np.array([r("wall", "reaction_moment", c, "pad") for c in "xyz"])
    assert got == pytest.approx(want, rel=1e-6)


def test_pressure_resultants(full, solve):
    """Top stays straight: p times its area downwards; the end face axially."""
    r = solve(full(), plain=True)  # statics only
    assert r("wall", "reaction_force", "z", "p_top") == pytest.approx(0.05 * 35.0 * L, rel=1e-9)
    area = 50 * 6 + 2 * 24 * 8
    assert r("wall", "reaction_force", "x", "p_end") == pytest.approx(0.3 * area, rel=1e-9)


def test_pressure_on_a_closed_surface_has_no_resultant_but_its_ends(part, solve):
    """All sides and both ends of a tapered block."""
    faces = ("start", "end", "top", "bottom", "left", "right")
    loads = [Pressure(f, f"arm.{f}", 2.0) for f in faces]
    r = solve(part(Section("rectangle", {"depth": 60.0, "width": 40.0}), L, loads,
                   stations=(Station(L, {"depth": 30.0, "width": 25.0}),), anchor="bottom"), plain=True)
    forces = [r("wall", "reaction_force", c) for c in "xyz"] + [r("wall", "reaction_moment", c) / L for c in "xyz"]
    assert np.abs(forces).max() < 1e-6 * 2.0 * 60 * 40


def test_reciprocity(full, solve):
    """Betti: the work of one load on the displacement of another, for a tip force against a tip moment."""
    def tip(**load):
        p = full()
        extra = RegionLoad("one", "arm.end", **load)
        return solve(replace(p, loads=(extra,), cases=(Case("one", {"one": 1.0}),)))

    a = tip(force=(0.0, 1000.0, 0.0))("arm.end", "rotation", "x", "one") * 1e5
    b = tip(moment=(1e5, 0.0, 0.0))("arm.end", "displacement", "y", "one") * 1000.0
    assert a == pytest.approx(b, rel=1e-8)  # ten times what rounding in the equations left
    assert abs(a) > 1e-3


def test_a_turned_part_gives_turned_figures(full, solve):
    """The whole job, turned in space by a rotation about (1, 2, 3)."""
    axis = np.array([1.0, 2.0, 3.0]) / math.sqrt(14)
    K = np.cross(np.eye(3), -axis)
    R = np.eye(3) + math.sin(0.7) * K + (1 - math.cos(0.7)) * K @ K
    shift = np.array([10.0, -20.0, 30.0])

    def turn(v):
        return tuple(float(c) for c in R @ np.array(v))

    plain = full()
    m = plain.members[0]
    loads = [RegionLoad("f", "arm.end", turn((100.0, -50.0, -200.0)), turn((1e3, 2e3, 3e3)))]
    moved = replace(plain, loads=tuple(loads), cases=(Case("c", {"f": 1.0}),), members=(replace(
        m, start=tuple(R @ np.array(m.start) + shift), end=tuple(R @ np.array(m.end) + shift), up=turn(m.up)),))
    a, b = solve(replace(plain, loads=LOADS[:1], cases=(Case("tip", {"tip": 1.0}),))), solve(moved)
    for quantity in ("displacement", "rotation"):
        want = R @ np.array([a("arm.end", quantity, c, "tip") for c in "xyz"])
        assert np.array([b("arm.end", quantity, c) for c in "xyz"]) == pytest.approx(want, rel=1e-9)
    assert b("arm@300", "section_moment", "My") == pytest.approx(a("arm@300", "section_moment", "My", "tip"), rel=1e-9)


def test_roll_is_a_right_handed_turn(part, solve):
    """Rolled by 90 degrees, a depth along z lies along -y: bending about global y meets the weak axis."""
    tip = RegionLoad("tip", "arm.end", force=(0.0, 0.0, -1000.0))
    upright = solve(part(loads=[tip]), shear=False)
    rolled = solve(part(loads=[tip], roll=math.pi / 2), shear=False)
    ratio = rolled("arm.end", "displacement", "z") / upright("arm.end", "displacement", "z")
    assert ratio == pytest.approx(4.0, rel=1e-9)
    # "left" (least y) of the rolled section looks down (its y points up): compression under a tip weight
    assert rolled("arm@0", "nominal_stress", "xx@left") < 0 < rolled("arm@0", "nominal_stress", "xx@right")


def test_reversed_member(part, solve):
    """From and to swapped: the same displacements at the same point in space."""
    section = Section("rectangle", {"depth": 60.0, "width": 20.0})
    a = solve(part(section, L, [RegionLoad("t", "arm.end", force=(5.0, 20.0, -100.0))],
                   stations=(Station(L, {"depth": 30.0}),)), plain=True)
    b = solve(part(Section("rectangle", {"depth": 30.0, "width": 20.0}), L,
                   [RegionLoad("t", "arm.start", force=(5.0, 20.0, -100.0))],
                   [Support("wall", "arm.end", {"x": 0.0, "y": 0.0, "z": 0.0})],
                   stations=(Station(L, {"depth": 60.0}),), start=(L, 0.0, 0.0), end=(0.0, 0.0, 0.0)), plain=True)
    for c in "xyz":
        assert b("arm.start", "displacement", c) == pytest.approx(a("arm.end", "displacement", c), rel=1e-8, abs=1e-12)
        assert b("wall", "reaction_moment", c) == pytest.approx(a("wall", "reaction_moment", c), rel=1e-8, abs=1e-6)


def test_work_is_twice_the_energy(full, solve):
    """Force times displacement at the tip."""
    p = full()
    one = RegionLoad("one", "arm.end", (30.0, 40.0, -200.0))
    r = solve(replace(p, loads=(one,), cases=(Case("one", {"one": 1.0}),)))
    u = [r("arm.end", "displacement", c, "one") for c in "xyz"]
    assert r("", "strain_energy", "", "one") == pytest.approx(0.5 * np.dot(u, (30.0, 40.0, -200.0)), rel=1e-6)


def test_prescribed_settlement(part, solve):
    """A simple beam whose far support is lowered by 2 mm turns as a rigid body."""
    ends = [Support("a", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0, "rx": 0.0}, "average"),
            Support("b", "arm.end", {"y": 0.0, "z": -2.0}, "average")]
    r = solve(part(supports=ends, cases=(Case("c", {}),)))
    assert r("arm@1000", "displacement", "z") == pytest.approx(-1.0, rel=1e-9)
    assert r("arm@1000", "rotation", "y") == pytest.approx(1e-3, rel=1e-9)
    assert abs(r("b", "reaction_force", "z")) < 1e-6


def test_rigid_and_average_differ_where_they_should(part, solve):
    """A rigid pad keeps its length straight; an average one bends with the beam."""
    pad = Patch("pad", "top", 800.0, 1200.0)
    tip = RegionLoad("tip", "arm.end", force=(0.0, 0.0, -1000.0))
    held = dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0)
    got = {}
    for coupling in ("rigid", "average", "surface"):
        freedoms = {"x": 0.0, "y": 0.0, "z": 0.0} if coupling == "surface" else held
        held_pad = part(loads=[tip], supports=[Support("s", "arm.pad", freedoms, coupling)], patches=(pad,))
        got[coupling] = -solve(held_pad, shear=False)("arm.end", "displacement", "z")
    span = 800.0**3 * 1000 / (3 * 8.75e11)
    assert got["rigid"] == pytest.approx(span, rel=1e-6)
    assert got["surface"] == pytest.approx(span, rel=1e-6)
    assert got["average"] > 1.05 * span


@pytest.mark.parametrize(("held", "motion"), [
    ({"x": 0.0, "y": 0.0, "z": 0.0}, "turning about x"),
    ({"x": 0.0, "y": 0.0, "rx": 0.0, "ry": 0.0, "rz": 0.0}, "moving along z"),
])
def test_a_mechanism_is_named(part, solve, held, motion):
    """The free motion is in the message."""
    with pytest.raises(SolveError, match=motion):
        solve(part(supports=[Support("s", "arm.start", held, "average")], cases=(Case("c", {}),)))


def test_contradicting_supports(part, solve):
    """Two supports that prescribe different values of one motion."""
    rest = {"y": 0.0, "z": 0.0}
    with pytest.raises(SolveError, match="different values"):
        solve(part(supports=[Support("a", "arm.start", {"x": 0.0, **rest}), Support("b", "arm.start", {"x": 1.0})],
                   cases=(Case("c", {}),)))


def test_unknown_region(part, solve):
    """The message lists what there is."""
    with pytest.raises(RunError, match="start, end"):
        solve(part(loads=[RegionLoad("t", "arm.middle")]))
