"""Restrained warping, shear centres and principal axes: V. Z. Vlasov, Thin-walled elastic beams; Timoshenko & Gere."""

from __future__ import annotations

import math

import numpy as np
import pytest

from geometry.part import RegionLoad, Section, Support

E, G, L = 210000.0, 210000.0 / 2.6, 1500.0
SECTION_I = Section("I", {"depth": 200.0, "width": 100.0, "web": 6.0, "flange": 10.0})
CHANNEL = Section("channel", {"depth": 102.0, "width": 51.0, "web": 2.0, "flange": 2.0})
TORQUE = RegionLoad("t", "arm.end", moment=(1e6, 0.0, 0.0))


def properties(part, solve, section):
    from fem.beam.along import Sections

    # the same cached analysis as the solved part uses
    return Sections(part(section, L).members[0], L, 0.3, solve.sections).solved[0]


def test_torsion_of_a_built_in_I(part, solve):
    """Twist T/GJ (L - tanh(kL)/k), bimoment at the root T tanh(kL)/k, k = sqrt(GJ/EIw) (Timoshenko & Gere, ch. 5)."""
    p = properties(part, solve, SECTION_I)
    assert p.open_thin
    assert p.Iw == pytest.approx(10.0 * 100.0**3 * 190.0**2 / 24, rel=0.02)  # thin-wall formula
    k = math.sqrt(G * p.J / (E * p.Iw))
    r = solve(part(SECTION_I, L, [TORQUE]))
    assert r("arm.end", "rotation", "x") == pytest.approx(1e6 / (G * p.J) * (L - math.tanh(k * L) / k), rel=1e-6)
    B = r.result.diagrams["c"].B
    assert abs(B[0]) == pytest.approx(1e6 * math.tanh(k * L) / k, rel=1e-6)
    assert abs(B[-1]) < 1e-6 * abs(B[0])  # a free end warps freely


def test_flange_stress_of_the_bimoment(part, solve):
    """At the root each flange bends as a plane beam under T/h: edge stress, and its sign at the left edge on top."""
    p = properties(part, solve, SECTION_I)
    r = solve(part(SECTION_I, L, [TORQUE]))
    B, h = abs(r.result.diagrams["c"].B[0]), 190.0
    edge = B / h * 50.0 / (10.0 * 100.0**3 / 12)
    # A torque about +x pushes the upper flange to -y: at the root its left edge (least y) is in compression.
    assert r("arm@0", "nominal_stress", "xx@left") == pytest.approx(-edge, rel=0.03)
    assert p.warping[2] != 0.0


def test_free_warping_is_saint_venant(part, solve):
    """Held and turned through means, the bar twists by TL/GJ."""
    p = properties(part, solve, SECTION_I)
    held = Support("a", "arm.start", dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0), "average")
    r = solve(part(SECTION_I, L, [TORQUE], [held]))
    assert r("arm.end", "rotation", "x") == pytest.approx(1e6 * L / (G * p.J), rel=1e-6)


def test_rigid_far_end_stops_warping(part, solve):
    """Both ends held against warping: T/GJ (L - 2 tanh(kL/2)/k)."""
    p = properties(part, solve, SECTION_I)
    k = math.sqrt(G * p.J / (E * p.Iw))
    r = solve(part(SECTION_I, L, [RegionLoad("t", "arm.end", moment=(1e6, 0.0, 0.0), coupling="rigid")]))
    expected = 1e6 / (G * p.J) * (L - 2 * math.tanh(k * L / 2) / k)
    assert r("arm.end", "rotation", "x") == pytest.approx(expected, rel=1e-6)


def test_channel_pushed_at_its_centroid_twists(part, solve):
    """A18: the shear centre lies 18.75 mm outside the web's middle line; the torque is F times the distance."""
    p = properties(part, solve, CHANNEL)
    load = RegionLoad("f", "arm.end", force=(0.0, 0.0, -100.0))
    r = solve(part(CHANNEL, L, [load]))
    arm = p.yc - p.ys
    assert arm == pytest.approx(18.75 - 1.0 + p.yc - _back(p), rel=0.04)
    k = math.sqrt(G * p.J / (E * p.Iw))
    twist = -100.0 * arm / (G * p.J) * (L - math.tanh(k * L) / k)
    assert r("arm.end", "rotation", "x") == pytest.approx(twist, rel=1e-6)
    assert r("arm@0", "section_moment", "T") == pytest.approx(0.0, abs=1e-6)  # the line is the centroid's


def _back(p):
    """y of the web's back, from the extreme points."""
    return p.extremes[2, 0]


def test_channel_pushed_at_its_shear_centre_does_not_twist(part, solve):
    """The same force with the torque that moves it to the shear centre."""
    p = properties(part, solve, CHANNEL)
    load = RegionLoad("f", "arm.end", force=(0.0, 0.0, -100.0), moment=(100.0 * (p.yc - p.ys), 0.0, 0.0))
    r = solve(part(CHANNEL, L, [load]))
    assert abs(r("arm.end", "rotation", "x")) < 1e-12
    bending = 100.0 * L**3 / (3 * E * p.Iyy) + 100.0 * L * p.shear_compliance[1, 1] / G
    assert -r("arm.end", "displacement", "z") == pytest.approx(bending, rel=1e-6)


def test_where_the_line_lies_does_not_matter(part, solve):
    """Displacements, reactions and stresses of the channel are the same with the line at the web or at a corner."""
    load = RegionLoad("f", "arm.end", force=(50.0, 30.0, -100.0), moment=(1e3, 2e3, -3e3))
    results = []
    for where in ("centroid", "web", "top left"):
        # move the declared line so that the material stays put
        from fem.beam.outlines import line_offset

        base = part(CHANNEL, L, [load], line_at="centroid").members[0]
        y0, z0 = line_offset(base)
        y1, z1 = line_offset(part(CHANNEL, L, [load], line_at=where).members[0])
        shift = (0.0, y1 - y0, z1 - z0)
        member = part(CHANNEL, L, [load], line_at=where, start=shift, end=(L, shift[1], shift[2]))
        results.append(solve(member))
    for place, quantity in (("arm.end", "displacement"), ("arm.end", "rotation"), ("wall", "reaction_moment")):
        want = np.array([results[0](place, quantity, c) for c in "xyz"])
        for other in results[1:]:
            assert np.array([other(place, quantity, c) for c in "xyz"]) == pytest.approx(want, rel=1e-7)
    for point in ("top", "bottom", "left", "right"):
        want = results[0]("arm@300", "nominal_stress", f"xx@{point}")
        got = [r("arm@300", "nominal_stress", f"xx@{point}") for r in results[1:]]
        assert got == pytest.approx([want] * 2, rel=1e-6)


def test_angle_bends_askew(part, solve):
    """A20: angle 100 x 100 x 10; the two displacements follow from the full inertia tensor (B24's superposition)."""
    Iy, Iyz = 1.80004e6, -1.06579e6
    angle = Section("angle", {"depth": 100.0, "width": 100.0, "thickness": 10.0})
    r = solve(part(angle, L, [RegionLoad("f", "arm.end", force=(0.0, 0.0, -100.0))]), shear=False, plain=True)
    unit = -100.0 * L**3 / (3 * E * (Iy**2 - Iyz**2))
    assert r("arm.end", "displacement", "z") == pytest.approx(unit * Iy, rel=1e-5)
    assert r("arm.end", "displacement", "y") == pytest.approx(-unit * Iyz, rel=1e-5)
