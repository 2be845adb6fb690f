"""Natural frequencies of the beam model (REFERENCES E1-E5, and closed forms with their sources)."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from fem.beam.along import Sections
from fem.beam.modes import beam_vibration
from geometry.part import Case, Cut, Material, Patch, RegionLoad, RemotePoint, Section, Station, Support, Vibration
from geometry.problem import RunError, SolveError

HEAVY = pytest.mark.heavy
E, RHO, L = 210000.0, 7.85e-9, 1000.0
G = E / 2.6
FLAT = Section("rectangle", {"depth": 30.0, "width": 20.0})
WALL = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
PIN = Support("a", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0, "rx": 0.0}, "average")
ROLLER = Support("b", "arm.end", {"y": 0.0, "z": 0.0}, "average")
FORK = Support("b", "arm.end", {"y": 0.0, "z": 0.0, "rx": 0.0}, "average")
GUIDE = Support("b", "arm.end", {"y": 0.0, "z": 0.0, "ry": 0.0, "rz": 0.0}, "average")
CHANNEL = Section("channel", {"depth": 102.0, "width": 51.0, "web": 4.0, "flange": 4.0})
KIND = {"y": "bending about y", "z": "bending about z"}


@pytest.fixture
def modes(part, solve):
    def run(section=FLAT, count=6, free=False, plain=True, shear=False, length=L, supports=(WALL,), loads=(), **more):
        one = replace(part(section, length, loads, supports, cases=(), **more), vibration=Vibration(count, free))
        return beam_vibration(one, shear=shear, section_solver=solve.plain if plain else solve.sections)

    return run


def of_kind(found, kind):
    return [m.value for m in found if m.kind == kind]


def bending(beta_l, depth=30.0, length=L):
    """Euler-Bernoulli, Hz: (beta L)^2 / (2 pi L^2) sqrt(E I / rho A)."""
    return np.square(beta_l) / (2 * math.pi * length**2) * math.sqrt(E * depth**2 / 12 / RHO)


@pytest.mark.parametrize(("supports", "free", "beta_l"), [
    ((WALL,), False, [1.875104, 4.694091, 7.854757]),
    ((), True, [4.730041, 7.853205, 10.995608]),
    pytest.param((WALL, GUIDE), False, [4.730041, 7.853205, 10.995608], marks=HEAVY),
    pytest.param((PIN, ROLLER), False, [math.pi, 2 * math.pi, 3 * math.pi], marks=HEAVY),
    ((WALL, ROLLER), False, [3.926602, 7.068583]),
])
def test_uniform_beams(modes, supports, free, beta_l):
    """E1, in both planes: Blevins, Formulas for Natural Frequency and Mode Shape, 1979, table 8-1."""
    found = modes(supports=supports, free=free, count=8)
    for kind, depth in (("y", 30.0), ("z", 20.0)):
        n = len(beta_l) if depth == 20.0 else 2
        assert of_kind(found, KIND[kind])[:n] == pytest.approx(bending(beta_l[:n], depth), rel=1e-5)
    assert max(m.residual for m in found) < 1e-3


@HEAVY
def test_numbers_of_a_steel_bar(modes):
    """E2: cantilever, pinned, free-free, strong and weak."""
    for supports, free, strong, weak in (((WALL,), False, 25.0655, 16.7103), ((PIN, ROLLER), False, 70.3599, 46.9066),
                                         ((), True, 159.498, 106.332)):
        found = modes(supports=supports, free=free, count=2)
        assert [m.value for m in found] == pytest.approx([weak, strong], rel=1e-5)


@pytest.mark.parametrize(("share", "expected"), [
    pytest.param(0.1, [2.96784, 19.3558, 55.5182], marks=HEAVY), (1.0, [1.557298, 16.25009, 50.89584]),
    pytest.param(10.0, [0.541375], marks=HEAVY)])
def test_tip_mass(modes, share, expected):
    """E3: (beta L)^2 of a cantilever with a mass at its tip, the mass's region rigid or average."""
    for coupling in ("rigid", "average"):
        tip = RemotePoint("m", "arm.end", (L, 0.0, 0.0), coupling, mass=share * RHO * 600.0 * L)
        got = of_kind(modes(loads=(tip,), count=8), KIND["z"])[:len(expected)]
        assert got == pytest.approx(bending(np.sqrt(expected), 20.0), rel=2e-5)


def test_offset_mass_with_inertia(modes):
    """A heavy body on a light bar: two coupled freedoms, closed form by the 2 x 2 flexibility of the tip.

    The body's centre is `a` beyond the tip and its inertia about it is J: (w, theta) of the tip, M = [[m, m a],
    [m a, m a^2 + J]] (signs of a downward w).
    """
    m, a, J = 1.0, 150.0, 8000.0
    body = RemotePoint("m", "arm.end", (L + a, 0.0, 0.0), "rigid", mass=m, inertia=(1e9, J, 1e9, 0.0, 0.0, 0.0))
    light = steel(1e-16)
    found = modes(loads=(body,), material=light, count=8)
    EI = E * 20 * 30**3 / 12
    F = np.array([[L**3 / 3, L**2 / 2], [L**2 / 2, L]]) / EI
    M = np.array([[m, m * a], [m * a, m * a * a + J]])
    expected = 1 / (2 * math.pi * np.sqrt(np.linalg.eigvals(F @ M)))
    got = of_kind(found, KIND["y"])
    assert got[:2] == pytest.approx(sorted(expected), rel=1e-6)


def steel(density):
    return Material("steel", E, 0.3, density, 12e-6, None, None, "declared", "")


@pytest.mark.parametrize(("h", "expected"), [
    pytest.param(50.0, [116.774, 461.361, 1017.80], marks=HEAVY),
    pytest.param(100.0, [230.680, 881.522, 1857.20], marks=HEAVY), (200.0, [440.761, 1528.76, 2920.88])])
def test_timoshenko_beam(modes, h, expected):
    """E4: pinned, k = 5/6, with shear and rotary inertia."""
    found = modes(Section("rectangle", {"depth": h, "width": 49.0}), supports=(PIN, ROLLER), shear=True, count=14)
    assert of_kind(found, KIND["y"])[:3] == pytest.approx(expected, rel=1e-5)


ROOT = 60.0
TAPERS = [
    pytest.param({"depth": 0.5}, [3.82378, 18.3173, 47.2648], marks=HEAVY),
    pytest.param({"depth": 0.75}, [3.63624, 20.2539, 54.7684], marks=HEAVY),
    ({"depth": 0.25}, [4.17659, 16.1843, 38.7750]),
    pytest.param({"width": 0.5}, [4.31517, 23.5193, 63.1992], marks=HEAVY),
    ({"depth": 0.5, "width": 0.5}, [4.62515, 19.5476, 48.5789]),
]


@pytest.mark.parametrize(("tip", "expected"), TAPERS)
def test_tapers(modes, tip, expected):
    """E5 (Mabie & Rogers): depth and width to a share of the root's; omega = c sqrt(E I0/rho A0)/L^2."""
    long = 20.0 * L
    section = Section("rectangle", {"depth": ROOT, "width": 25.0})
    stations = (Station(long, {k: v * section.dims[k] for k, v in tip.items()}),)
    got = of_kind(modes(section, length=long, stations=stations, count=10), KIND["y"])[:len(expected)]
    assert got == pytest.approx(bending(np.sqrt(expected[:len(got)]), ROOT, long), rel=1e-4)
    assert len(got) == 3


def test_wedge(modes):
    """E5 (Kirchhoff): the depth goes to nothing: 5.31510, from two blunt tips by extrapolation."""
    got = []
    for share in (0.01, 0.005):
        stations = (Station(L, {"depth": share * ROOT}),)
        found = modes(Section("rectangle", {"depth": ROOT, "width": 25.0}), stations=stations, count=3)
        got.append(of_kind(found, KIND["y"])[0] / bending(1.0, ROOT))
    assert 2.0 * got[1] - got[0] == pytest.approx(5.31510, rel=1e-3)


def test_torsion_and_axial(modes, part, solve):
    """Clamped-free: (2 k - 1)/(4 L) sqrt(E/rho) and sqrt(G J/(rho I_p)) (Blevins, tables 8-16 and 8-19)."""
    round_bar = Section("round", {"diameter": 80.0})
    found = modes(round_bar, plain=False, count=14, length=600.0)
    assert of_kind(found, "torsion")[:2] == pytest.approx(np.array([1, 3]) / 2400 * math.sqrt(G / RHO), rel=1e-5)
    assert of_kind(found, "axial")[:2] == pytest.approx(np.array([1, 3]) / 2400 * math.sqrt(E / RHO), rel=1e-5)


def test_channel_bends_and_twists_together(modes, part, solve):
    """Forks at both ends, free to warp: a quadratic in omega^2 for each wave.

    With the shear centre the distance e from the centroid, omega_b and omega_t of bending and of torsion alone and
    I0 = Ip + A e^2 about the shear centre: (w^2 - w_b^2)(w^2 - w_t^2) = w^4 A e^2/I0 (S. P. Timoshenko, D. H. Young and
    W. Weaver, Vibration Problems in Engineering, 1974, sec. 5.21). Bending square to the axis of symmetry takes part;
    without shear flexibility and rotary inertia.
    """
    long = 2000.0
    found = modes(CHANNEL, plain=False, supports=(PIN, FORK), length=long, count=8)
    p = Sections(part(CHANNEL, long).members[0], long, 0.3, solve.sections).solved[0]
    e2 = (p.ys - p.yc) ** 2
    I0 = p.Iyy + p.Izz + p.area * e2
    expected = []
    for n in (1, 2):
        k = n * math.pi / long
        # the inertia of warping adds k^2 Iw to I0
        own = I0 + k**2 * p.Iw
        wb2 = E * p.Iyy * k**4 / (RHO * p.area)
        wt2 = (G * p.J * k**2 + E * p.Iw * k**4) / (RHO * own)
        roots = np.roots([1.0 - p.area * e2 / own, -(wb2 + wt2), wb2 * wt2])
        expected += list(np.sqrt(roots.real) / (2 * math.pi))
    got = np.array([m.value for m in found])
    for f in sorted(expected)[:3]:
        assert np.abs(got / f - 1.0).min() < 1e-5
    weak = math.pi / (2 * long**2) * math.sqrt(E * p.Izz / (RHO * p.area))
    assert np.abs(got / weak - 1.0).min() < 1e-5
    twist = next(m for m in found if m.kind == "torsion")  # the centroid goes up and down with it
    assert np.abs(twist.displacement[:, 2]).max() > 0.2 and np.abs(twist.displacement[:, 1]).max() < 1e-6


HOLE = Cut("h", "h", "hole", "z", "top flange", 400.0, 5.0, 14.0, 14.0)


@pytest.mark.parametrize("free", [False, pytest.param(True, marks=HEAVY)])
def test_turned_member_and_other_line(modes, free):
    """Turned in space, rolled with its roll undone, or with the line elsewhere: the same frequencies and shapes."""
    skew = {"stations": (Station(600.0, {"depth": 80.0}),)} if free else {"cuts": (HOLE,)}
    tip = RemotePoint("m", "arm.end", (650.0, 30.0, 20.0), "rigid", mass=2e-3, inertia=(4.0, 5.0, 6.0, 1.0, 0.5, -0.7))
    base = modes(CHANNEL, plain=False, shear=True, free=free, length=600.0, loads=(tip,), **skew)
    axis = np.array([1.0, 2.0, 3.0]) / math.sqrt(14)
    K = np.cross(np.eye(3), -axis)
    R = np.eye(3) + math.sin(0.7) * K + (1 - math.cos(0.7)) * K @ K

    def turn(v):
        return tuple(float(c) for c in R @ np.array(v))

    J = R @ np.array([[4.0, 1.0, -0.7], [1.0, 5.0, 0.5], [-0.7, 0.5, 6.0]]) @ R.T
    moved = replace(tip, point=turn(tip.point), inertia=(J[0, 0], J[1, 1], J[2, 2], J[0, 1], J[1, 2], J[2, 0]))
    turned = modes(CHANNEL, plain=False, shear=True, free=free, length=600.0, loads=(moved,),
                   end=turn((600.0, 0.0, 0.0)), up=turn((0.0, 0.0, 1.0)), **skew)
    for a, b in zip(base, turned, strict=True):
        assert b.value == pytest.approx(a.value, rel=1e-7)
        want = a.displacement @ R.T
        assert np.abs(np.abs(b.displacement) - np.abs(want)).max() < 1e-4


@HEAVY
def test_where_the_line_lies_does_not_matter(part, modes):
    """The channel with its line at the centroid, the web or a corner, at one place in space."""
    from fem.beam.outlines import line_offset

    y0, z0 = line_offset(part(CHANNEL, 600.0).members[0])
    values = []
    for where in ("centroid", "top left"):
        y1, z1 = line_offset(part(CHANNEL, 600.0, line_at=where).members[0])
        shift = {"start": (0.0, y1 - y0, z1 - z0), "end": (600.0, y1 - y0, z1 - z0)}
        values.append([m.value for m in modes(CHANNEL, plain=False, shear=True, length=600.0, line_at=where, **shift)])
    assert values[1] == pytest.approx(values[0], rel=1e-8)


def test_reversed_member(modes):
    """From and to swapped on a taper with a step."""
    a = modes(stations=(Station(400.0, {"depth": 30.0}), Station(400.0, {"depth": 24.0}), Station(L, {"depth": 15.0})))
    b = modes(Section("rectangle", {"depth": 15.0, "width": 20.0}),
              stations=(Station(600.0, {"depth": 24.0}), Station(600.0, {"depth": 30.0})),
              supports=(Support("w", "arm.end", {"x": 0.0, "y": 0.0, "z": 0.0}),))
    assert [m.value for m in b] == pytest.approx([m.value for m in a], rel=1e-6)


def test_shapes(modes):
    """The first cantilever shape: its deflection and its slope at the 41 stations, scaled to 1 mm, and its mass share.

    cosh - cos - 0.734096 (sinh - sin) of 1.875104 x/L (Blevins); the share 0.6131 of the mass moves with it.
    """
    found = modes(count=2)
    x = 1.875104 * np.linspace(0.0, 1.0, 41)
    shape = np.cosh(x) - np.cos(x) - 0.734096 * (np.sinh(x) - np.sin(x))
    slope = 1.875104 / L * (np.sinh(x) + np.sin(x) - 0.734096 * (np.cosh(x) - np.cos(x)))
    weak = found[0]
    sign = np.sign(weak.displacement[-1, 1])
    tip = abs(weak.displacement[-1, 1])
    assert tip == pytest.approx(1.0, rel=1e-2)
    assert sign * weak.displacement[:, 1] / tip == pytest.approx(shape / shape[-1], abs=1e-5)
    assert sign * weak.rotation[:, 2] / tip == pytest.approx(slope / shape[-1], abs=1e-7)
    assert weak.mass_share[1] == pytest.approx(0.6131, abs=1e-4)
    assert weak.mass_share[[0, 2, 3, 4]] == pytest.approx(np.zeros(4), abs=1e-9)


def test_mass_shares_sum_to_no_more_than_one(modes):
    """Of a short thick cantilever: twelve modes carry most of the mass in each direction, and never more than all."""
    total = np.sum([m.mass_share for m in modes(count=12, length=200.0, shear=True)], axis=0)
    assert total[:3].min() > 0.8
    assert total.max() <= 1.0 + 1e-6


def test_two_halves_are_a_whole(modes):
    """A station without change, a patch, places and loads of other cases change nothing."""
    plain = modes()
    load = RegionLoad("f", "arm.pad", force=(1.0, 2.0, 3.0))
    fussy = modes(stations=(Station(333.0, {"depth": 30.0}),), patches=(Patch("pad", "top", 410.0, 470.0),),
                  loads=(load,))
    assert [m.value for m in fussy] == pytest.approx([m.value for m in plain], rel=1e-6)


@HEAVY
def test_rigid_pad_stiffens(modes):
    """A patch that a load holds rigid: the bar bends in the rest only, as a free part too."""
    pad = (Patch("pad", "top", 400.0, 600.0),)
    load = RegionLoad("f", "arm.pad", coupling="rigid")
    soft = modes(supports=(), free=True, patches=pad, count=2)
    hard = modes(supports=(), free=True, patches=pad, loads=(load,), count=2)
    assert all(1.05 < b.value / a.value < 2.0 for a, b in zip(soft, hard, strict=True))


def test_what_cannot_vibrate(modes):
    """No density; supports that leave a motion free."""
    with pytest.raises(RunError, match="no density"):
        modes(material=steel(0.0))
    with pytest.raises(SolveError, match="moving along z"):
        modes(supports=(Support("s", "arm.start", dict.fromkeys(("x", "y", "rx", "ry", "rz"), 0.0), "average"),))


def test_modes_are_in_the_result(part, solve):
    """`solve_beam` gives what the part asks for."""
    one = replace(part(FLAT, L, [], cases=(Case("c", {}),)), vibration=Vibration(4))
    r = solve(one, plain=True).result
    assert len(r.vibration) == 4 and r.vibration[0].value == pytest.approx(16.705, rel=1e-4)
    assert any("keep their shape" in note for note in r.notes)
    assert not solve(replace(one, vibration=None), plain=True).result.vibration
