"""Rows of REFERENCES groups C and D whose reference is a stress: the solid model, at the accuracy that was asked for.

D1, D3, D4 and D5 are held to the recomputed (plane or axisymmetric) values. The bars here have a thickness: the
thickness mean of the notch stress is up to 0.5 % above the plane value (measured by refining the plate of D1), so the
band is the requested accuracy plus 0.5 %.
"""

from __future__ import annotations

from math import pi

import numpy as np
import pytest
from chain import CLAMPED, Solved, bar_text, end_force, end_moment, rectangle, solved

from fem.solid.stress import principal_stresses

THICK = 0.005
AVERAGE_HELD = '[supports.wall]\non = "bar.start"\ncoupling = "average"\nhold = ["x", "y", "z", "rx", "ry", "rz"]\n'


def holed(width: float, diameter: float, thickness: float, length: float, load: str) -> str:
    return bar_text(
        rectangle(width, thickness), f"{length:g} mm", CLAMPED + load,
        member=f'[[members.bar.holes]]\nname = "eye"\nalong = "y"\nat = "{length / 2:g} mm"\n'
        f'diameter = "{diameter:g} mm"\n',
    )  # fmt: skip


def stepped(section: str, dimension: str, large: float, small: float, radius: float, load: str) -> str:
    """Shoulder after 2 large depths, 2.5 of them beyond it."""
    station = f'[[members.bar.stations]]\nat = "{2 * large:g} mm"\n{dimension} = '
    return bar_text(
        section, f"{4.5 * large:g} mm", CLAMPED + load,
        member=f'{station}"{large:g} mm"\n{station}"{small:g} mm"\nshoulder_fillet = "{radius:g} mm"\n',
    )  # fmt: skip


def flat_step(small: float, large: float, radius: float, thickness: float, bend: bool) -> str:
    area, modulus = small * thickness, thickness * small**2 / 6
    load = end_moment(y=modulus) if bend else end_force(x=area)  # nominal 1 MPa
    return stepped(rectangle(large, thickness), "depth", large, small, radius, load)


def round_step(small: float, large: float, radius: float, kind: str) -> str:
    load = end_force(x=pi / 4 * small**2) if kind == "tension" else end_moment(x=pi * small**3 / 16)
    return stepped(f'shape = "round", diameter = "{large:g} mm"', "diameter", large, small, radius, load)


def notched(height: float, radius: float, thickness: float, bend: bool) -> str:
    net = height - 2 * radius
    load = end_moment(y=thickness * net**2 / 6) if bend else end_force(x=thickness * net)
    notch = "".join(
        f'[[members.bar.notches]]\nname = "{edge}_notch"\nalong = "y"\nedge = "{edge}"\nat = "{2.5 * height:g} mm"\n'
        f'length = "{2 * radius:g} mm"\ndepth = "{radius:g} mm"\ncorner_radius = "{radius:g} mm"\n'
        for edge in ("top", "bottom")
    )
    return bar_text(rectangle(height, thickness), f"{5 * height:g} mm", CLAMPED + load, member=notch)


HOLE_TENSION = holed(100, 30, 10, 400, end_force(x=70 * 10))
HOLE_BENDING = holed(60, 30, 10, 300, end_moment(y=(60**3 - 30**3) * 10 / (6 * 30)))
WIDE = holed(300, 15, 10, 500, end_force(x=300 * 10))
HOLE, STEP = "bar.eye", "bar.step@"
ROWS = [  # name, text, place, component, recomputed factor (signed)
    ("D1 d/W 0.3", HOLE_TENSION, HOLE, "xx@upper", 2.3621),
    ("D1 d/W 0.3 thick", holed(100, 30, 60, 400, end_force(x=70 * 60)), HOLE, "xx@lower", 2.3621),
    ("D1 d/W 0.5", holed(100, 50, 5, 400, end_force(x=50 * 5)), HOLE, "xx@upper", 2.1738),
    ("D2a d/H 0.5", HOLE_BENDING, HOLE, "xx@upper", 1.928),
    ("D3 2.0, 0.1 tension", flat_step(40, 80, 4, 10, False), STEP + "160", "xx@upper", 2.506),
    ("D3 1.5, 0.1 bending", flat_step(40, 60, 4, 10, True), STEP + "120", "xx@upper", 1.898),
    ("D4 0.2 tension", notched(60, 6, 10, False), "bar.top_notch", "xx@lower", 2.429),
    ("D4 0.3 bending", notched(60, 9, 10, True), "bar.bottom_notch", "xx@upper", -1.694),
    ("D5 2.0, 0.2 tension", round_step(20, 40, 4, "tension"), STEP + "80", "xx@upper", 1.755),
]


@pytest.mark.heavy
@pytest.mark.parametrize("accuracy", [0.05, 0.02, 0.01])
@pytest.mark.parametrize("row", ROWS, ids=[r[0] for r in ROWS])
def test_notch_stress_is_as_accurate_as_asked(row: tuple[str, str, str, str, float], accuracy: float) -> None:
    _, text, place, component, factor = row
    part = solved(text, accuracy, beam=False)
    assert part.from_solid(place, "notch_stress", component) == pytest.approx(factor, rel=accuracy + THICK)


def test_d1_at_five_per_cent() -> None:
    part = solved(holed(40, 12, 4, 120, end_force(x=28 * 4)), 0.05, beam=False)  # the plate of d/W 0.3, smaller
    for side in ("upper", "lower"):
        assert part.from_solid(HOLE, "notch_stress", f"xx@{side}") == pytest.approx(2.3621, rel=0.05 + THICK)


@pytest.mark.heavy
def test_d5_torsion_of_a_round_shoulder() -> None:
    # D5, D/d 2.0, r/d 0.2: 1.229 recomputed; largest shear stress of the shaft beyond reach of its ends
    part = solved(round_step(20, 40, 4, "torsion"), 0.02, beam=False)
    p = principal_stresses(part.solid_result.stress)[0]
    x = part.mesh.nodes[0]
    shear = ((p[0] - p[2]) / 2)[(x > 40) & (x < 120)]
    assert shear.max() == pytest.approx(1.229, rel=0.02)


@pytest.mark.heavy
def test_c8_small_hole_in_a_wide_plate() -> None:
    # C8 (Kirsch): 3 S at the rim, on the ligament (2 + (a/r)^2 + 3 (a/r)^4) / 2; a / W = 1 / 40 alters 0.4 %.
    part = solved(WIDE, 0.02, beam=False)
    assert part.from_solid(HOLE, "notch_stress", "xx@upper") == pytest.approx(3.0, rel=0.025)
    x, _, z = part.mesh.nodes - np.array([[250.0], [0.0], [0.0]])
    ligament = np.flatnonzero((np.abs(x) < 1.5) & (np.abs(z) > 11.25) & (np.abs(z) < 30.0))
    assert ligament.size > 10
    r, c = np.hypot(x, z)[ligament] / 7.5, ((x**2 - z**2) / (x**2 + z**2))[ligament]
    # Kirsch's field in full: radial, hoop and shear stress turned to x (angle from the direction of tension)
    rr = (1 - r**-2) / 2 + (1 - 4 * r**-2 + 3 * r**-4) / 2 * c
    tt = (1 + r**-2) / 2 - (1 + 3 * r**-4) / 2 * c
    rt = -(1 + 2 * r**-2 - 3 * r**-4) / 2  # times sin 2 theta
    s2 = 1 - c**2
    exact = (rr + tt) / 2 + (rr - tt) / 2 * c - rt * s2
    # 2 % asked, and 1 % because nodes of the middle and of the faces are not at the thickness mean (note of D1)
    assert np.abs(part.solid_result.stress[0, 0, ligament] - exact).max() < 0.03 * 3.0


def _tube() -> Solved:
    text = bar_text(
        'shape = "tube", diameter = "200 mm", wall = "50 mm"', "60 mm",
        AVERAGE_HELD + '[loads.inside]\non = "bar.bore"\npressure = "60 MPa"\n',
    )  # fmt: skip
    return solved(text, 0.05, beam=False)


@pytest.mark.heavy
def test_c5_thick_tube_under_internal_pressure() -> None:
    # C5 (Lame), free ends: hoop 100.0 inside, 40.0 outside; radial -60, 0; u(ri) 0.0280952 (plane stress)
    part = _tube()
    _, y, z = part.mesh.nodes
    r = np.hypot(y, z)
    e = np.array([y, z]) / r
    stress = part.solid_result.stress[0]
    yy, zz, yz = stress[1], stress[2], stress[4]
    radial = yy * e[0] ** 2 + zz * e[1] ** 2 + 2 * yz * e[0] * e[1]
    hoop = yy + zz - radial
    inner, outer = np.abs(r - 50.0) < 1e-3, np.abs(r - 100.0) < 1e-3
    grown = (part.solid_result.u[0, 1:] * e).sum(axis=0)
    assert hoop[inner].mean() == pytest.approx(100.0, rel=0.05)
    assert hoop[outer].mean() == pytest.approx(40.0, rel=0.02)
    assert radial[inner].mean() == pytest.approx(-60.0, rel=0.05)
    assert abs(radial[outer].mean()) < 2.0
    assert grown[inner].mean() == pytest.approx(0.0280952, rel=0.005)


@pytest.mark.heavy
@pytest.mark.parametrize(
    ("depth", "width", "accuracy", "centre", "edge"),
    [(40, 20, 0.01, 0.983, 1.033), (20, 20, 0.01, 0.940, 1.126), (20, 40, 0.004, 0.856, 1.396)],
)
def test_c6_shear_stress_of_a_rectangle(
    depth: float, width: float, accuracy: float, centre: float, edge: float
) -> None:
    # C6 (Timoshenko & Goodier), nu 0.25: shear stress over 1.5 P/A on the neutral line, 1 % away from the ends. The
    # wide bar varies steeply across its width, which the mesh of 1 % does not follow (centre 4 % off): finer there.
    text = bar_text(
        rectangle(depth, width), "200 mm", CLAMPED + end_force(z=depth * width / 1.5),
        material='{ E = "210 GPa", nu = 0.25, density = "7850 kg/m^3" }',
    )  # fmt: skip
    part = solved(text, accuracy, beam=False)
    x, y, z = part.mesh.nodes
    inside = np.flatnonzero((x > 60.0) & (x < 140.0))
    eta, zeta = 2 * y[inside] / width, 2 * z[inside] / depth
    # the exact field is even in both: a polynomial in the squares smooths the scatter of the nodes
    powers = [(i, j) for i in range(4) for j in range(4 - i)]
    terms = np.stack([eta ** (2 * i) * zeta ** (2 * j) for i, j in powers], axis=1)
    found, *_ = np.linalg.lstsq(terms, part.solid_result.stress[0, 5, inside], rcond=None)
    assert found[powers.index((0, 0))] == pytest.approx(centre, rel=0.01)
    assert sum(f for f, (_, j) in zip(found, powers, strict=True) if j == 0) == pytest.approx(edge, rel=0.01)
