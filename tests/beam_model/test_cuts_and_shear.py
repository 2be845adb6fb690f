"""Net sections in the stiffness and the mass, and nominal shear."""

from __future__ import annotations

import math

import numpy as np
import pytest

from fem.beam.cut_stiffness import extent
from geometry.part import Cut, RegionLoad, Section, Station

FLAT = Section("rectangle", {"depth": 60.0, "width": 8.0})
E, L = 210000.0, 600.0


def hole(d, at=300.0, z=0.0):
    return Cut("h", "h", "hole", "y", "all", at, z, d, d)


def test_a_hole_lengthens_a_pulled_bar(part, solve):
    """int dx / (E A_net) with the chord of the circle: closed form by fine quadrature in the angle."""
    r = solve(part(FLAT, L, [RegionLoad("p", "arm.end", force=(9600.0, 0.0, 0.0))], cuts=(hole(24.0),)), plain=True)
    a = (np.arange(200000) + 0.5) * np.pi / 200000
    net = np.mean(np.pi * 12.0 * np.sin(a) / (8.0 * (60.0 - 24.0 * np.sin(a))))
    want = 9600 / E * ((L - 24.0) / 480.0 + net)
    assert r("arm.end", "displacement", "x") == pytest.approx(want, rel=2e-6)


def test_a_hole_takes_its_mass_and_moves_the_centre(part, solve):
    """Off-centre hole of 24 in 60 x 8 x 600."""
    r = solve(part(FLAT, L, [], cuts=(hole(24.0, 200.0, 10.0),)), plain=True)
    gone, whole = math.pi * 144 * 8, 60.0 * 8 * L
    assert r("", "mass", case="") == pytest.approx(7.85e-9 * (whole - gone), rel=2e-6)
    assert r("", "centre_of_mass", "z", "") == pytest.approx(-10.0 * gone / (whole - gone), rel=2e-4)
    assert r("", "centre_of_mass", "x", "") == pytest.approx((300 * whole - 200 * gone) / (whole - gone), rel=2e-6)


@pytest.mark.parametrize("shape", ["rectangle", "round", "I"])
def test_a_shoulder_fillet_has_mass(part, solve, shape):
    """Strips of (1 - pi/4) r^2, or a ring of it (by Pappus; here by quadrature over the fillet)."""
    r, d, D = 5.0, 30.0, 50.0
    name = {"rectangle": "depth", "round": "diameter", "I": "width"}[shape]
    section = Section(shape, {"rectangle": {"depth": D, "width": 8.0}, "round": {"diameter": D},
                              "I": {"depth": 80.0, "width": D, "web": 5.0, "flange": 8.0}}[shape])
    stations = (Station(200.0, {name: D}), Station(200.0, {name: d}, r))
    with_fillet = solve(part(section, L, [], stations=stations), plain=True)
    sharp = solve(part(section, L, [], stations=(stations[0], Station(200.0, {name: d}))), plain=True)
    s = (np.arange(100000) + 0.5) / 100000 * r
    rise = r - np.sqrt(r * r - (r - s) ** 2)
    strips = {"rectangle": 2, "I": 4}.get(shape, 0)
    area = strips * 8 * rise if strips else math.pi * ((d / 2 + rise) ** 2 - d * d / 4)
    volume = r * area.mean()
    got = (with_fillet("", "mass", case="") - sharp("", "mass", case="")) / 7.85e-9
    assert got == pytest.approx(volume, rel=1e-5)


def test_nominal_stress_on_the_net_section(part, solve):
    """At a station inside the hole: M z / I_net at the outer edge."""
    bend = RegionLoad("m", "arm.end", moment=(0.0, 1e5, 0.0))
    r = solve(part(FLAT, L, [bend], cuts=(hole(24.0),)), plain=True)
    I_net = 8.0 * (60.0**3 - 24.0**3) / 12
    assert r("arm@300", "nominal_stress", "xx@top") == pytest.approx(1e5 * 30 / I_net, rel=1e-6)
    assert r("arm@270", "nominal_stress", "xx@top") == pytest.approx(1e5 * 30 / (8 * 60.0**3 / 12), rel=1e-6)


def test_an_opening_bends_its_chords(part, solve):
    """Vierendeel: the ends of an opening of length a move by V a^3/(12 E sum I) against one another, beside bending
    with the net section and shear with the depth that is left."""
    a, c = 60.0, 30.0
    cut = Cut("o", "o", "opening", "y", "all", 300.0, 0.0, a, c)
    r = solve(part(FLAT, L, [RegionLoad("f", "arm.end", force=(0.0, 0.0, -100.0))], cuts=(cut,)), plain=True)
    plain = solve(part(FLAT, L, [RegionLoad("f", "arm.end", force=(0.0, 0.0, -100.0))]), plain=True)
    own = 2 * 8.0 * 15.0**3 / 12
    I, I_net = 8.0 * 60.0**3 / 12, 8.0 * (60.0**3 - 30.0**3) / 12
    bending = 100 / E * (1 / I_net - 1 / I) * ((L - 270) ** 3 - (L - 330) ** 3) / 3
    shear = 100 * a * 2.6 / E * 1.2 / 480 * (60 / 30 - 1)
    want = bending + shear + 100 * a**3 / (12 * E * own)
    got = plain("arm.end", "displacement", "z") - r("arm.end", "displacement", "z")
    assert got == pytest.approx(want, rel=1e-6)


@pytest.mark.parametrize(("kind", "length", "depth", "turned", "half"), [
    ("hole", 10.0, 10.0, 0.3, 5.0), ("slot", 30.0, 10.0, 0.0, 15.0), ("slot", 30.0, 10.0, math.pi / 2, 5.0),
    ("opening", 30.0, 10.0, math.pi / 2, 5.0), ("notch", 12.0, 6.0, 0.0, 6.0)])
def test_extent(kind, length, depth, turned, half):
    """Where along the member a cut begins and ends."""
    cut = Cut("c", "c", kind, "y", "all", 100.0, 0.0, length, depth, turned=turned)
    assert extent(cut) == pytest.approx((100.0 - half, 100.0 + half))


def test_shear_of_a_rectangle(part, solve):
    """1.5 V/A at the middle, in both directions, with their signs."""
    tip = RegionLoad("f", "arm.end", force=(0.0, 70.0, -100.0))
    r = solve(part(FLAT, L, [tip]), plain=True).result.nominal_shear["c"]
    assert r[10, 1:3] == pytest.approx([-150 / 480, 105 / 480], rel=1e-9)


def test_shear_of_a_wedge(part, solve):
    """1.5 (V - M h'/h)/A at the middle: a cantilever that tapers to 30 from 60, at half its length."""
    tip = RegionLoad("f", "arm.end", force=(0.0, 0.0, -100.0))
    r = solve(part(FLAT, L, [tip], stations=(Station(L, {"depth": 30.0}),)), plain=True).result.nominal_shear["c"]
    V, M = -100.0, 100.0 * 300.0
    assert r[10, 1] == pytest.approx(1.5 * (V - M * (-30.0 / 600) / 45) / (8 * 45), rel=1e-6)


def test_torsion_stress_of_a_square_bar(part, solve):
    """A9: T/(0.208 a^3)."""
    r = solve(part(Section("rectangle", {"depth": 20.0, "width": 20.0}), L,
                   [RegionLoad("t", "arm.end", moment=(1e5, 0.0, 0.0))])).result.nominal_shear["c"]
    assert r[10, 3] == pytest.approx(1e5 / (0.20817 * 8000), rel=0.01)
