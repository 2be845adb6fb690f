"""Linear buckling of the beam model (REFERENCES E6-E10, and closed forms with their sources)."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy.linalg import eigh
from scipy.optimize import brentq
from scipy.special import jv

from fem.beam.along import Sections
from fem.beam.modes import beam_buckling, buckling_studies
from geometry.part import (
    BodyLoad,
    Buckling,
    Case,
    LineLoad,
    Patch,
    Pressure,
    RegionLoad,
    RemotePoint,
    Section,
    Station,
    StripLoad,
    Support,
    TemperatureLoad,
)
from geometry.problem import RunError

HEAVY = pytest.mark.heavy
E, L = 210000.0, 1000.0
G = E / 2.6
FLAT = Section("rectangle", {"depth": 30.0, "width": 20.0})
BLADE = Section("rectangle", {"depth": 60.0, "width": 5.0})
SECTION_I = Section("I", {"depth": 200.0, "width": 100.0, "web": 6.0, "flange": 10.0})
TEE = Section("tee", {"depth": 100.0, "width": 80.0, "web": 5.0, "flange": 8.0})
CHANNEL = Section("channel", {"depth": 102.0, "width": 51.0, "web": 4.0, "flange": 4.0})
WALL = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
PIN = Support("a", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0, "rx": 0.0}, "average")
ROLLER = Support("b", "arm.end", {"y": 0.0, "z": 0.0}, "average")
FORK = Support("b", "arm.end", {"y": 0.0, "z": 0.0, "rx": 0.0}, "average")
GUIDE = Support("b", "arm.end", {"y": 0.0, "z": 0.0, "ry": 0.0, "rz": 0.0}, "average")
PUSH = RegionLoad("n", "arm.end", force=(-1.0, 0.0, 0.0))
BEND = (RegionLoad("a", "arm.start", moment=(0.0, -1e3, 0.0)), RegionLoad("b", "arm.end", moment=(0.0, 1e3, 0.0)))


@pytest.fixture
def factors(part, solve):
    def run(section, loads, supports, length=L, count=3, plain=True, shear=False, fixed=(), case=None, **more):
        cases = (Case("c", case or {v.name: 1.0 for v in loads}),)
        one = replace(part(section, length, loads, supports, cases, **more), buckling=(Buckling("c", fixed, count),))
        return beam_buckling(one, shear=shear, section_solver=solve.plain if plain else solve.sections)

    return run


def least(modes, kind=""):
    return min(m.value for m in modes if m.value > 0.0 and kind in m.kind)


def properties(part, solve, section, length=L):
    return Sections(part(section, length).members[0], length, 0.3, solve.sections).solved[0]


EULER = math.pi**2 * E * 30 * 20**3 / 12 / L**2


@pytest.mark.parametrize(("supports", "factor"), [
    ((WALL,), 0.25), pytest.param((PIN, ROLLER), 1.0, marks=HEAVY), ((WALL, ROLLER), 2.04575),
    pytest.param((WALL, GUIDE), 4.0, marks=HEAVY)])
def test_euler_columns(factors, supports, factor):
    """E6, about the weak axis; the strong axis at (30/20)^2 of it."""
    modes = factors(FLAT, [PUSH], supports)
    assert modes[0].value == pytest.approx(factor * EULER, rel=1e-5)
    assert modes[0].kind == "bending about z"
    strong = [m.value for m in modes if m.kind == "bending about y"]
    assert not strong or strong[0] == pytest.approx(2.25 * factor * EULER, rel=1e-4)
    assert all(m.value > 0.0 for m in modes) and max(m.residual for m in modes) < 1e-9


def test_shear_softens_a_column(factors):
    """Engesser: P = Pe / (1 + 1.2 Pe/(G A)), and E less by the stress itself (Green's strain along the fibres).

    F. Engesser 1889; Timoshenko & Gere 2.17. Depth 200 over 1000, so that shear matters: about the strong axis of a
    square bar.
    """
    bar = Section("rectangle", {"depth": 200.0, "width": 200.0})
    push = replace(PUSH, force=(-1e3, 0.0, 0.0))
    got = 1e3 * factors(bar, [push], (PIN, ROLLER), shear=True, count=2)[0].value
    A, I = 4e4, 200.0**4 / 12
    k2 = (math.pi / L) ** 2
    P = 0.0
    for _ in range(60):  # P = k^2 (E - P/A) I / (1 + k^2 (E - P/A) I * 1.2/(G A))
        soft = k2 * (E - P / A) * I
        P = soft / (1.0 + 1.2 * soft / (G * A))
    assert got == pytest.approx(P, rel=1e-5)
    assert got == pytest.approx(k2 * E * I / (1.0 + 1.2 * k2 * E * I / (G * A)), rel=0.04)


def test_own_weight(factors):
    """E7 (Greenhill): q = 7.8373 EI/L^3 on a cantilever that stands."""
    down = BodyLoad("g", (0.0, 0.0, -9810.0))
    # it stands along z: x of the member is up
    got = factors(FLAT, [down], (WALL,), end=(0.0, 0.0, L), up=(0.0, 1.0, 0.0))[0].value
    q = 7.85e-9 * 600.0 * 9810.0
    assert got * q == pytest.approx(7.8373 * E * 30 * 20**3 / 12 / L**3, rel=1e-4)


@pytest.mark.parametrize(("ratio", "share", "m"), [
    (0.4, 0.4, 1.6693), pytest.param(0.4, 0.6, 2.1275, marks=HEAVY), pytest.param(0.2, 0.4, 1.0554, marks=HEAVY),
    (0.6, 0.6, 2.3109), pytest.param(0.8, 0.4, 2.2942, marks=HEAVY)])
def test_stepped_column(factors, ratio, share, m):
    """E8: lower part I2 over a share of the length, upper I1 = ratio I2; P = m E I2/L^2."""
    h = 20.0 * ratio ** (1 / 3)
    step = (Station(share * L, {"width": 20.0}), Station(share * L, {"width": h}))
    got = factors(FLAT, [PUSH], (WALL,), stations=step)[0].value
    assert got == pytest.approx(m * E * 30 * 20**3 / 12 / L**2, rel=1e-4)


def blade(part, solve, length=L):
    p = properties(part, solve, BLADE, length)
    return math.sqrt(E * p.Izz * G * p.J)


def sides(total, start, end):
    """A force at the level of the centroid: half on the left face, half on the right."""
    patches = tuple(Patch(f"p_{s}", s, start, end) for s in ("left", "right"))
    loads = [RegionLoad(f"f_{s}", f"arm.p_{s}", force=(0.0, 0.0, -0.5 * total)) for s in ("left", "right")]
    return loads, patches


def test_blade_cantilever(part, solve, factors):
    """E9, E10: end load at the centroid, 4.0126 sqrt(EI GJ)/L^2 = 635.9 N; both signs alike."""
    tip = RegionLoad("f", "arm.end", force=(0.0, 0.0, -1.0))
    modes = factors(BLADE, [tip], (WALL,), plain=False, count=2)
    assert sorted(m.value for m in modes) == pytest.approx([-635.9, 635.9], rel=1e-4)
    assert modes[0].value in (pytest.approx(4.0126 * blade(part, solve) / L**2, rel=2e-5),
                              pytest.approx(-4.0126 * blade(part, solve) / L**2, rel=2e-5))
    assert modes[0].kind == "lateral-torsional"


def test_blade_with_equal_end_moments(part, solve, factors):
    """E9: pi sqrt(EI GJ)/L between forks."""
    got = factors(BLADE, BEND, (PIN, FORK), plain=False, count=2)
    assert 1e3 * least(got) == pytest.approx(math.pi * blade(part, solve) / L, rel=1e-5)


def test_blade_with_a_force_in_the_middle(part, solve, factors):
    """E9: 16.936 sqrt(EI GJ)/L^2 at the centroid; the UDL's total 28.315."""
    loads, patches = sides(1.0, 0.499 * L, 0.501 * L)
    got = factors(BLADE, loads, (PIN, FORK), plain=False, count=2, patches=patches)
    assert least(got) == pytest.approx(16.936 * blade(part, solve) / L**2, rel=1e-4)
    lines = [LineLoad(s, f"arm.{s}", 0.0, L, *2 * [(0.0, 0.0, -0.5 / L)]) for s in ("left", "right")]
    got = factors(BLADE, lines, (PIN, FORK), plain=False, count=2)
    assert least(got) == pytest.approx(28.315 * blade(part, solve) / L**2, rel=1e-4)


@pytest.mark.parametrize("a", [pytest.param(-40.0, marks=HEAVY), pytest.param(5.0, marks=HEAVY), 40.0])
def test_tip_load_above_the_centroid(part, solve, factors, a):
    """At a height a above the centroid of the end: t'' + (P s)^2/(EI GJ) t = 0 from the tip, GJ t' = -P a t there.

    Timoshenko & Gere 6.3; the solutions are sqrt(s) J(+-1/4, k s^2/2), k = P/sqrt(EI GJ).
    """
    p = properties(part, solve, BLADE)
    ratio = math.sqrt(E * p.Izz / (G * p.J))

    def left(k):
        even = math.gamma(0.75) * (k / 4) ** 0.25 * math.sqrt(L) * jv(-0.25, k * L * L / 2)
        odd = math.gamma(1.25) * (k / 4) ** -0.25 * math.sqrt(L) * jv(0.25, k * L * L / 2)
        return even - k * a * ratio * odd

    want = brentq(left, 3.0 / L**2, 5.5 / L**2) * blade(part, solve)
    high = RemotePoint("f", "arm.end", (L, 0.0, a), "rigid", force=(0.0, 0.0, -1.0))
    assert least(factors(BLADE, [high], (WALL,), plain=False, count=2)) == pytest.approx(want, rel=2e-5)


def test_force_at_the_end_of_a_rigid_arm(part, solve, factors):
    """A remote point `d` beyond the end, in a rigid arm that turns with it, is a longer bar with a stiff end."""
    d = 300.0
    remote = RemotePoint("f", "arm.end", (L + d, 0.0, 0.0), "rigid", force=(0.0, 0.0, -1.0))
    got = least(factors(BLADE, [remote], (WALL,), plain=False, count=2))
    stiff = 30.0
    steps = (Station(L, {"depth": 60.0, "width": 5.0}), Station(L, {"depth": 60.0 * stiff, "width": 5.0 * stiff}))
    tip = RegionLoad("f", "arm.end", force=(0.0, 0.0, -1.0))
    want = least(factors(BLADE, [tip], (WALL,), plain=False, count=2, length=L + d, stations=steps))
    assert got == pytest.approx(want, rel=1e-3)


@pytest.mark.parametrize("remote", [pytest.param(False, marks=HEAVY), True])
def test_column_pushed_through_a_rigid_pad(factors, remote):
    """A cantilever of 250 with a pad of 100 that stays straight, pushed at its middle: kL tan kL = 250/50.

    (A column with a rigid end of length d: k d tan kL = 1; from equilibrium.) A remote point in the pad's middle is the
    same load. An average pad bends: less than a column of 300 pushed at its end.
    """
    thin = Section("rectangle", {"depth": 10.0, "width": 20.0})
    pad = (Patch("pad", "top", 250.0, 350.0),)
    got = {}
    for coupling in ("rigid", "average"):
        load = RemotePoint("n", "arm.pad", (300.0, 0.0, 5.0), coupling, (-1.0, 0.0, 0.0)) if remote else \
            RegionLoad("n", "arm.pad", (-1.0, 0.0, 0.0), coupling=coupling)
        got[coupling] = factors(thin, [load], (WALL,), 600.0, patches=pad)[0].value
    EI = E * 20 * 10**3 / 12
    k = brentq(lambda v: v * math.tan(v) - 5.0, 0.1, 1.57) / 250.0
    assert got["rigid"] == pytest.approx(EI * k * k, rel=1e-5)
    assert 0.99 < got["average"] / (EI * (math.pi / 600.0) ** 2) < 1.0


def test_built_up_beam_in_uniform_bending(part, solve, factors):
    """Doubly symmetric I with warping: M = pi/L sqrt(E Iz G J (1 + pi^2 E Iw/(G J L^2))) (Timoshenko & Gere 6.2)."""
    long = 4000.0
    p = properties(part, solve, SECTION_I, long)
    got = factors(SECTION_I, BEND, (PIN, FORK), long, 2, plain=False)
    GJ, w = G * p.J, math.pi**2 * E * p.Iw / (G * p.J * long**2)
    want = math.pi / long * math.sqrt(E * p.Izz * GJ * (1.0 + w))
    assert w > 0.3
    assert sorted(1e3 * m.value for m in got) == pytest.approx([-want, want], rel=1e-5)


def test_tee_in_uniform_bending(part, solve, factors):
    """One axis of symmetry: M = Pz (b/2 -+ sqrt(b^2/4 + r^2)) with the section's asymmetry b (N. S. Trahair, Flexural-
    Torsional Buckling of Structures, 1993, ch. 7): the sign of the moment matters.

    b = int z (y^2 + z^2) dA / Iy - 2 zs about the centroid; the integral here by dividing the tee into rectangles.
    """
    long = 3000.0
    p = properties(part, solve, TEE, long)
    got = sorted(1e3 * m.value for m in factors(TEE, BEND, (PIN, FORK), long, 3, plain=False))
    total = 0.0
    for width, low, high in ((5.0, -50.0, 42.0), (80.0, 42.0, 50.0)):
        z = np.linspace(low, high, 20001)
        z = 0.5 * (z[1:] + z[:-1]) - p.zc - _middle(part, TEE)
        total += (high - low) / 20000 * np.sum(width * z**3 + width**3 / 12 * z)
    b = total / p.Iyy - 2.0 * (p.zs - p.zc)
    Pz = math.pi**2 * E * p.Izz / long**2
    r2 = G * p.J / Pz  # a tee is stocky in the beam's terms: it warps freely
    roots = sorted(Pz * (0.5 * b + s * math.sqrt(0.25 * b * b + r2)) for s in (-1.0, 1.0))
    nearest = [min(got, key=lambda v: abs(v - w)) for w in roots]
    assert nearest == pytest.approx(roots, rel=2e-4)
    assert abs(roots[0]) < 0.9 * roots[1] or abs(roots[0]) > 1.1 * roots[1]


def _middle(part, section):
    """z of the shape's own origin less the line's (the centroid)."""
    from fem.beam.outlines import line_offset

    return line_offset(part(section).members[0])[1]


def ritz(p, long, moment, load_height, terms=12):
    """Least factor of both signs by sine series for v and the twist: an oracle of its own.

    Energy of a doubly symmetric beam between forks (Timoshenko & Gere 6.2): int E Iz v''^2 + G J t'^2 + E Iw t''^2 over
    two, plus int M v'' t, less the work of the load's height: `moment` (x) for a unit factor, `load_height` a function
    that gives the (terms, terms) matrix of sum P a t^2.
    """
    x, w = np.polynomial.legendre.leggauss(200)
    x, w = 0.5 * long * (x + 1.0), 0.5 * long * w
    k = np.arange(1, terms + 1) * math.pi / long
    s = np.sin(np.outer(k, x))
    K = np.diag(np.concatenate([E * p.Izz * k**4, G * p.J * k**2 + E * p.Iw * k**4])) * long / 2.0
    cross = -(k[:, None] ** 2) * ((s * w * moment(x)) @ s.T)
    H = np.block([[np.zeros((terms, terms)), cross], [cross.T, -load_height(k)]])
    mu = eigh(H, K, eigvals_only=True)
    return -1.0 / mu[0], -1.0 / mu[-1]


@pytest.mark.parametrize("face", ["top", pytest.param("bottom", marks=HEAVY)])
def test_load_on_a_flange(part, solve, factors, face):
    """A force spread over a short strip in the middle of an I, on the upper or the lower flange: sine series."""
    long, strip = 4000.0, 40.0
    p = properties(part, solve, SECTION_I, long)
    load = StripLoad("f", f"arm.{face}", (long / 2,), strip, (0.0, 0.0, -1.0))
    got = factors(SECTION_I, [load], (PIN, FORK), long, 4, plain=False)
    a = 100.0 if face == "top" else -100.0

    def moment(x):  # My: negative where the top is pressed; M of the oracle has the sign of My
        d = np.maximum(x - (long - strip) / 2, 0.0)
        return -(0.5 * x - np.where(x < (long + strip) / 2, d**2 / (2 * strip), x - long / 2))

    def height(k):
        x = long / 2 + np.linspace(-0.5, 0.5, 201)[:, None] * strip
        s = np.sin(x * k)
        return a * (s.T @ s) / len(x)

    want = ritz(p, long, moment, height)
    mine = [min(v for v in (m.value for m in got) if v > 0), max(v for v in (m.value for m in got) if v < 0)]
    assert mine == pytest.approx([max(want), min(want)], rel=3e-4)


@HEAVY
def test_load_height_has_its_sign(factors):
    """On top it buckles sooner than at the centroid, below later."""
    got = {}
    for face in ("top", "bottom"):
        line = LineLoad("q", f"arm.{face}", 0.0, 4000.0, (0.0, 0.0, -1.0), (0.0, 0.0, -1.0))
        got[face] = least(factors(SECTION_I, [line], (PIN, FORK), 4000.0, 4, plain=False))
    down = BodyLoad("g", (0.0, 0.0, -1.0))
    area = 2 * 100 * 10 + 180 * 6
    weight = least(factors(SECTION_I, [down], (PIN, FORK), 4000.0, 4, plain=False)) * area * 7.85e-9
    assert 1.2 * got["top"] < weight < got["bottom"] / 1.2


@HEAVY
def test_torsional_buckling_of_a_column(part, solve, factors):
    """Wagner: P = (G J + pi^2 E Iw/L^2)/r0^2 for a doubly symmetric section between forks, as a mode of its own."""
    long = 1500.0
    p = properties(part, solve, SECTION_I, long)
    got = factors(SECTION_I, [replace(PUSH, force=(-1e3, 0.0, 0.0))], (PIN, FORK), long, 8, plain=False)
    want = (G * p.J + math.pi**2 * E * p.Iw / long**2) * p.area / (p.Iyy + p.Izz)
    twisted = [m.value for m in got if m.kind == "torsion"]
    assert 1e3 * twisted[0] == pytest.approx(want, rel=1e-4)


def test_channel_column_bends_and_twists(part, solve, factors):
    """(P - Py)(P - Pt) r0^2 = P^2 e^2 for bending square to the axis of symmetry (Timoshenko & Gere 5.4)."""
    long = 1500.0
    p = properties(part, solve, CHANNEL, long)
    got = np.array([m.value for m in factors(CHANNEL, [PUSH], (PIN, FORK), long, 6, plain=False)])
    e2 = (p.ys - p.yc) ** 2
    r2 = (p.Iyy + p.Izz) / p.area + e2
    Py = math.pi**2 * E * p.Iyy / long**2
    Pt = (G * p.J + math.pi**2 * E * p.Iw / long**2) / r2
    roots = np.sort(np.roots([1.0 - e2 / r2, -(Py + Pt), Py * Pt]).real)
    assert np.abs(got / roots[0] - 1.0).min() < 1e-4
    assert roots[0] < 0.97 * min(Py, Pt)
    Pz = math.pi**2 * E * p.Izz / long**2
    assert np.abs(got / Pz - 1.0).min() < 1e-4


MIXED = (
    RegionLoad("f", "arm.end", (-900.0, 20.0, -60.0), (2e3, 1e4, -5e3)),
    RemotePoint("r", "arm.end", (650.0, 40.0, 70.0), "rigid", (-50.0, 5.0, -40.0)),
    LineLoad("q", "arm.top", 100.0, 400.0, (0.0, 0.1, -0.5), (0.0, 0.0, -0.2)),
    Pressure("p", "arm.bottom", 0.02),
    BodyLoad("g", (0.0, 0.0, -9810.0)),
)


LEANING = Support("b", "arm.end", {"y": 0.0, "z": 0.0, "ry": 0.0}, "average")


@pytest.mark.parametrize("supports", [pytest.param((WALL,), marks=HEAVY), (PIN, LEANING)])
def test_where_the_line_lies_does_not_matter(part, factors, supports):
    """A channel under every kind of load, its line at the centroid, a corner, and with from and to swapped."""
    from fem.beam.outlines import line_offset

    y0, z0 = line_offset(part(CHANNEL, 600.0).members[0])
    values = []
    for where in ("centroid", "bottom right"):
        y1, z1 = line_offset(part(CHANNEL, 600.0, line_at=where).members[0])
        shift = {"start": (0.0, y1 - y0, z1 - z0), "end": (600.0, y1 - y0, z1 - z0)}
        got = factors(CHANNEL, MIXED, supports, 600.0, 4, plain=False, shear=True, line_at=where, **shift)
        values.append([m.value for m in got])
    assert values[1] == pytest.approx(values[0], rel=1e-6)
    assert 1.0 < values[0][0] < 1000.0


@HEAVY
def test_turned_member(factors):
    """The whole job turned in space."""
    axis = np.array([1.0, 2.0, 3.0]) / math.sqrt(14)
    K = np.cross(np.eye(3), -axis)
    R = np.eye(3) + math.sin(0.7) * K + (1 - math.cos(0.7)) * K @ K

    def turn(v):
        return tuple(float(c) for c in R @ np.array(v))

    f, r, q, p, g = MIXED
    turned = (replace(f, force=turn(f.force), moment=turn(f.moment)),
              replace(r, point=turn(r.point), force=turn(r.force)),
              replace(q, first=turn(q.first), last=turn(q.last)), p, replace(g, force_per_mass=turn(g.force_per_mass)))
    tapered = (Station(600.0, {"depth": 70.0}),)
    a = factors(CHANNEL, MIXED, (WALL,), 600.0, 3, plain=False, shear=True, stations=tapered)
    b = factors(CHANNEL, turned, (WALL,), 600.0, 3, plain=False, shear=True, stations=tapered,
                end=turn((600.0, 0.0, 0.0)), up=turn((0.0, 0.0, 1.0)))
    assert [m.value for m in b] == pytest.approx([m.value for m in a], rel=1e-6)
    assert np.abs(np.abs(b[0].displacement) - np.abs(a[0].displacement @ R.T)).max() < 1e-4
    assert b[0].case == "c"


def test_fixed_and_varying_loads(factors):
    """A column that carries half its Euler load for good has half of it left; temperature pushes between walls."""
    fixed = RegionLoad("w", "arm.end", force=(-0.5 * EULER, 0.0, 0.0))
    got = factors(FLAT, [fixed, PUSH], (PIN, ROLLER), fixed=("w",))
    assert got[0].value == pytest.approx(0.5 * EULER, rel=1e-5)
    far = Support("far", "arm.end", {"x": 0.0, "y": 0.0, "z": 0.0})
    hot = TemperatureLoad("t", 1.0)
    got = factors(FLAT, [hot], (WALL, far))
    assert got[0].value * E * 12e-6 * 600.0 == pytest.approx(4.0 * EULER, rel=1e-5)


def test_prescribed_displacement_grows(factors):
    """Ends pushed together by 0.01 mm: factor on the displacement."""
    far = Support("far", "arm.end", {"x": -0.01, "y": 0.0, "z": 0.0})
    got = factors(FLAT, [], (WALL, far))
    assert got[0].value * E * 600.0 * 0.01 / L == pytest.approx(4.0 * EULER, rel=1e-5)


def test_what_has_no_factor(part, solve, factors):
    """No stress, fixed loads that buckle by themselves, a case that is not there: a note or an error."""
    assert factors(FLAT, [RegionLoad("n", "arm.end")], (WALL,)) == ()
    from fem.beam.mesh import BeamMesh

    heavy = RegionLoad("w", "arm.end", force=(-2.0 * EULER, 0.0, 0.0))
    one = replace(part(FLAT, L, [heavy, PUSH], (PIN, ROLLER)), buckling=(Buckling("c", ("w",), 2),))
    modes, notes = buckling_studies(one, BeamMesh.of(one, solve.plain))
    assert modes == () and "fixed loads alone" in notes[0]
    with pytest.raises(RunError, match="no such case"):
        beam_buckling(replace(one, buckling=(Buckling("d"),)), section_solver=solve.plain)


def test_pull_buckles_reversed(factors):
    """A bar that is pulled: negative factors only."""
    got = factors(FLAT, [RegionLoad("n", "arm.end", force=(1.0, 0.0, 0.0))], (PIN, ROLLER))
    assert got[0].value == pytest.approx(-EULER, rel=1e-5)


def test_two_studies_are_in_the_result(part, solve):
    """`solve_beam` gives both, one after the other, and says what is left out."""
    cases = (Case("c", {"n": 1.0}), Case("d", {"n": 2.0}))
    one = replace(part(FLAT, L, [PUSH], (PIN, ROLLER), cases), buckling=(Buckling("c", (), 1), Buckling("d", (), 2)))
    r = solve(one, plain=True).result
    assert [m.case for m in r.buckling] == ["c", "d", "d"]
    assert r.buckling[0].value == pytest.approx(2.0 * r.buckling[1].value, rel=1e-9)
    assert any("deflection before buckling" in note for note in r.notes)
