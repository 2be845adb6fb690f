"""Stress concentration factors (REFERENCES D1-D5) and the figures that use them."""

from __future__ import annotations

import pytest

from fem.beam import notch_factors as k
from geometry.part import Cut, RegionLoad, Section, Station

FLAT = Section("rectangle", {"depth": 60.0, "width": 8.0})
PULL = RegionLoad("pull", "arm.end", force=(9600.0, 0.0, 0.0))
BEND = RegionLoad("bend", "arm.end", moment=(0.0, 1e5, 0.0))


@pytest.mark.parametrize(("ratio", "heywood", "pilkey", "plane"), [
    (0.1, 2.729, 2.732, 2.7325), (0.2, 2.512, 2.519, 2.5220), (0.3, 2.343, 2.358, 2.3621), (0.4, 2.216, 2.240, 2.2483),
    (0.5, 2.125, 2.157, 2.1738), (0.6, 2.064, 2.102, 2.1275), (0.7, 2.027, 2.067, 2.0963), (0.8, 2.008, 2.043, 2.0700)])
def test_hole_in_tension(ratio, heywood, pilkey, plane):
    """D1: both fits to the printed digits; within 2.5 % of the recomputed plane-stress values."""
    assert k.hole_tension(ratio, 1.0) == pytest.approx(pilkey, abs=6e-4)
    assert k.hole_tension_heywood(ratio, 1.0) == pytest.approx(heywood, abs=6e-4)
    assert k.hole_tension(ratio, 1.0) == pytest.approx(plane, rel=0.025)


@pytest.mark.parametrize(("wide", "r", "tension", "bending", "exact"), [
    (1.1, 0.05, 1.927, 1.818, (2.060, 1.932)), (1.2, 0.1, 1.880, 1.689, (1.968, 1.765)),
    (1.5, 0.05, 2.769, 2.339, (2.899, 2.387)), (1.5, 0.1, 2.227, 1.862, (2.295, 1.898)),
    (2.0, 0.1, 2.516, 1.951, (2.506, 1.942)), (2.0, 0.2, 1.992, 1.564, (1.983, 1.573)),
    (2.0, 0.3, 1.765, 1.392, (1.750, 1.418))])
def test_flat_shoulder(wide, r, tension, bending, exact):
    """D3: the fit to its printed digits; the recomputed values lie inside its 8 % band."""
    got = k.shoulder(wide, 1.0, r, k.FLAT_TENSION), k.shoulder(wide, 1.0, r, k.FLAT_BENDING)
    assert got == pytest.approx((tension, bending), abs=6e-4)
    assert got == pytest.approx(exact, rel=k.FLAT_BAND)


@pytest.mark.parametrize(("wide", "r", "tension", "bending", "exact"), [
    (1.1, 0.05, 1.812, 1.814, 2.014), (1.2, 0.1, 1.690, 1.666, 1.883), (1.5, 0.05, 2.261, 2.169, 2.692),
    (2.0, 0.1, 1.965, 1.802, 2.230), (2.0, 0.2, 1.629, 1.475, 1.755)])
def test_round_shoulder(wide, r, tension, bending, exact):
    """D5: the fit to its printed digits; in tension the recomputed values lie inside its 20 % band."""
    assert k.shoulder(wide, 1.0, r, k.ROUND_TENSION) == pytest.approx(tension, abs=6e-4)
    assert k.shoulder(wide, 1.0, r, k.ROUND_BENDING) == pytest.approx(bending, abs=6e-4)
    assert tension == pytest.approx(exact, rel=k.ROUND_TENSION_BAND)


@pytest.mark.parametrize(("x", "tension", "bending"), [
    (0.1, 2.728, 2.480), (0.2, 2.414, 2.038), (0.3, 2.125, 1.716), (0.5, 1.632, 1.349)])
def test_edge_notches(x, tension, bending):
    """D4"""
    assert (k.notch_tension(x / 2, 1.0), k.notch_bending(x / 2, 1.0)) == pytest.approx((tension, bending), abs=6e-4)


@pytest.mark.parametrize("fit", [k.FLAT_TENSION, k.FLAT_BENDING])
def test_no_extrapolation(fit):
    """Beyond the range of the fit there is no factor."""
    with pytest.raises(k.OutOfRange):
        k.shoulder(2.0, 1.0, 0.02, fit)
    with pytest.raises(k.OutOfRange):
        k.hole_tension(0.9, 1.0)


def hole(d, at=300.0, z=0.0, name="hole1"):
    return Cut(name, name, "hole", "y", "all", at, z, d, d)


def test_hole_in_a_flat_bar(part, solve):
    """d/H = 0.2: 9600 N over 8 x 48 gives 25 MPa net; bending 6 M d/((H^3 - d^3) t) times 2, tension on top (+My)."""
    pulled = solve(part(FLAT, 600.0, [PULL], cuts=(hole(12.0),)), plain=True)
    for side in ("upper", "lower"):
        assert pulled("arm.hole1", "notch_stress", f"xx@{side}") == pytest.approx(25.0 * 2.519, rel=3e-4)
    bent = solve(part(FLAT, 600.0, [BEND], cuts=(hole(12.0),)), plain=True)
    edge = 2 * 6 * 1e5 * 12 / ((60.0**3 - 12.0**3) * 8)
    assert bent("arm.hole1", "notch_stress", "xx@upper") == pytest.approx(edge, rel=1e-6)
    assert bent("arm.hole1", "notch_stress", "xx@lower") == pytest.approx(-edge, rel=1e-6)
    figure = next(f for f in bent.result.figures if f.key.quantity == "notch_stress")
    assert figure.error == pytest.approx(0.08 * edge, rel=1e-6)


@pytest.mark.parametrize("cuts", [
    (hole(12.0, 20.0),), (hole(12.0), hole(12.0, 330.0, name="hole2")), (hole(12.0, z=15.0),)])
def test_no_figure_near_other_things(part, solve, cuts):
    """Near a support, near another hole, or out of the middle: a note instead of a figure."""
    r = solve(part(FLAT, 600.0, [PULL], cuts=cuts), plain=True)
    assert not [f for f in r.result.figures if f.key.quantity == "notch_stress"]
    assert r.result.notes and "no published" in r.result.notes[0]


def test_shoulder_of_a_flat_bar(part, solve):
    """H 60, d 40, r 4 (D3: H/d 1.5, r/d 0.1), pulled and bent."""
    step = (Station(300.0, {"depth": 60.0}), Station(300.0, {"depth": 40.0}, 4.0))
    r = solve(part(FLAT, 600.0, [PULL], stations=step), plain=True)
    assert r("arm.step@300", "notch_stress", "xx@upper") == pytest.approx(9600 / 320 * 2.227, rel=3e-4)
    r = solve(part(FLAT, 600.0, [BEND], stations=step), plain=True)
    assert r("arm.step@300", "notch_stress", "xx@upper") == pytest.approx(6e5 / (8 * 1600) * 1.862, rel=3e-4)
    assert r("arm.step@300", "notch_stress", "xx@lower") < 0


def test_two_notches(part, solve):
    """D4: H 60, r 6: x = 0.2; one figure for each root."""
    cuts = tuple(Cut(f"n_{e}", f"n_{e}", "notch", "y", "all", 300.0, 0.0, 12.0, 6.0, 6.0, edge=e)
                 for e in ("top", "bottom"))
    r = solve(part(FLAT, 600.0, [BEND], cuts=cuts), plain=True)
    nominal = 6e5 / (8 * 48.0**2)
    assert r("arm.n_top", "notch_stress", "xx@lower") == pytest.approx(2.038 * nominal, rel=3e-4)
    assert r("arm.n_bottom", "notch_stress", "xx@upper") == pytest.approx(-2.038 * nominal, rel=3e-4)


def test_small_hole_in_a_web(part, solve):
    """3 times the stress at its middle and twice its change over the radius (Kirsch; D2a)."""
    section = Section("I", {"depth": 200.0, "width": 100.0, "web": 6.0, "flange": 10.0})
    cut = Cut("h", "h", "hole", "y", "web", 600.0, 30.0, 8.0, 8.0)
    r = solve(part(section, 1200.0, [RegionLoad("m", "arm.end", moment=(0.0, 1e6, 0.0))], cuts=(cut,)), plain=True)
    Iyy = (100 * 200.0**3 - 94 * 180.0**3) / 12
    assert r("arm.h", "notch_stress", "xx@upper") == pytest.approx(1e6 / Iyy * (3 * 30 + 2 * 4), rel=1e-6)
    assert r("arm.h", "notch_stress", "xx@lower") == pytest.approx(1e6 / Iyy * (3 * 30 - 2 * 4), rel=1e-6)
