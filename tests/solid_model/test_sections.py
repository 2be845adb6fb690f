"""Section means and section forces: exact statics on meshes that do not follow the stations, and invariance."""

from __future__ import annotations

import numpy as np
import pytest
from skfem import MeshTet2
from solid_help import STEEL, box_mesh, box_part, box_regions, named_mesh, structured_box

from fem.figure import FigureKey
from fem.solid import SolidResult, solve_solid
from fem.solid.clip import clip_beyond
from fem.solid.cut import Cutter, section_means
from fem.solid.frame import Frame
from geometry.budget import Budget
from geometry.part import (
    BodyLoad,
    Case,
    LineLoad,
    Member,
    Part,
    Place,
    Pressure,
    RegionLoad,
    Section,
    Support,
    TemperatureLoad,
)

BUDGET = Budget(threads=1)
ALL = {"x": 0.0, "y": 0.0, "z": 0.0}
L, B, H = 210.0, 20.0, 30.0
FORCES = (
    ("section_force", "N"),
    ("section_force", "Vy"),
    ("section_force", "Vz"),
    ("section_moment", "T"),
    ("section_moment", "My"),
    ("section_moment", "Mz"),
)


def section_forces(result: SolidResult, case: str) -> np.ndarray:
    table = {f.key: f.value for f in result.figures}
    return np.array(
        [[table[FigureKey(case, f"arm@{L * k / 20:.6g}", q, c, "member")] for q, c in FORCES] for k in range(21)]
    )


def loads() -> list:
    return [
        RegionLoad("tip", "arm.end", (300.0, 50.0, -100.0), (2000.0, 3000.0, -4000.0)),
        BodyLoad("self_weight", (0.0, 2000.0, -9810.0)),
        LineLoad("snow", "arm.top", 60.0, 150.0, (0.0, 0.0, -1.0), (0.2, 0.0, -3.0)),
        Pressure("wind", "arm.left", 0.05),
        TemperatureLoad("heat", 40.0),
    ]


@pytest.fixture(scope="module")
def mixed() -> SolidResult:
    cases = [Case(load.name, {load.name: 1.0}) for load in loads()]
    cases.append(Case("all", {load.name: 1.5 for load in loads()}))
    part = box_part(L, B, H, [Support("wall", "arm.start", ALL)], loads(), cases)
    x = lambda p: (p[0] > 60) & (p[0] < 150) & (p[2] > H / 2 - 1e-6)  # noqa: E731
    return solve_solid(part, box_mesh(L, B, H, (7, 2, 3), {"arm.load:snow": x}), BUDGET)


def test_all_checks_hold(mixed: SolidResult) -> None:
    assert [c for c in mixed.checks if not c.ok] == []


def test_section_forces_are_exact_statics(mixed: SolidResult) -> None:
    # stations every 10.5 mm, elements every 30 mm; y and z forces beyond the plane, moments about the line
    x = L * np.arange(21) / 20
    left = L - x
    tip = section_forces(mixed, "tip")
    expected = np.stack([300 + 0 * x, 50 + 0 * x, -100 + 0 * x, 2000 + 0 * x, 3000 + 100 * left, -4000 + 50 * left], 1)
    assert tip == pytest.approx(expected, rel=1e-7, abs=1e-4)
    weight = section_forces(mixed, "self_weight")
    q = 7.85e-9 * B * H * np.array([2000.0, -9810.0])
    expected = np.stack([0 * x, q[0] * left, q[1] * left, 0 * x, -q[1] * left**2 / 2, q[0] * left**2 / 2], 1)
    assert weight == pytest.approx(expected, rel=1e-7, abs=1e-4)
    wind = section_forces(mixed, "wind")
    expected = np.stack([0 * x, 0.05 * H * left, 0 * x, 0 * x, 0 * x, 0.05 * H * left**2 / 2], 1)
    assert wind == pytest.approx(expected, rel=1e-7, abs=1e-4)
    assert np.abs(section_forces(mixed, "heat")).max() < 1e-3


def test_line_load_gives_its_trapezium(mixed: SolidResult) -> None:
    got = section_forces(mixed, "snow")
    for k, at in enumerate(L * np.arange(21) / 20):
        a = min(max(at, 60.0), 150.0)
        s = np.linspace(a, 150.0, 20001)
        f = (s - 60) / 90
        qx, qz = 0.2 * f, -1.0 - 2.0 * f
        integral = np.trapezoid
        assert got[k, 0] == pytest.approx(integral(qx, s), abs=1e-3)
        assert got[k, 2] == pytest.approx(integral(qz, s), abs=1e-3)
        # My = sum (z Fx - (s - x) Fz); the traction sits on the top face
        assert got[k, 4] == pytest.approx(integral(H / 2 * qx - (s - at) * qz, s), rel=1e-4, abs=0.5)


def test_cases_are_factored_sums(mixed: SolidResult) -> None:
    each = sum(section_forces(mixed, load.name) for load in loads())
    assert section_forces(mixed, "all") == pytest.approx(1.5 * each, rel=1e-9, abs=1e-3)
    assert mixed.u[5] == pytest.approx(1.5 * mixed.u[:5].sum(axis=0), abs=1e-9 * np.abs(mixed.u[5]).max())


def test_raw_stress_gap_shrinks_with_the_mesh() -> None:
    gaps = []
    for cells in ((6, 1, 2), (12, 2, 4)):
        part = box_part(
            L, B, H, [Support("wall", "arm.start", ALL)], [RegionLoad("tip", "arm.end", (0.0, 0.0, -100.0))]
        )
        result = solve_solid(part, box_mesh(L, B, H, cells), BUDGET)
        gaps.append(np.abs(result.section_gap[0, 5:15, 0, 4]).max())
    assert 0 < gaps[1] < gaps[0] / 2
    assert gaps[1] < 0.01 * 100 * L


def rotation() -> np.ndarray:
    a, b, c = 0.4, -0.7, 1.1
    rx = np.array([[1, 0, 0], [0, np.cos(a), -np.sin(a)], [0, np.sin(a), np.cos(a)]])
    ry = np.array([[np.cos(b), 0, np.sin(b)], [0, 1, 0], [-np.sin(b), 0, np.cos(b)]])
    rz = np.array([[np.cos(c), -np.sin(c), 0], [np.sin(c), np.cos(c), 0], [0, 0, 1]])
    return rz @ ry @ rx


def test_a_turned_part_gives_the_same_figures() -> None:
    R, shift = rotation(), np.array([13.0, -40.0, 7.0])
    box = structured_box(L, B, H, (7, 2, 2))
    force, moment = np.array([30.0, 50.0, -100.0]), np.array([2000.0, 3000.0, -4000.0])
    results = []
    for Q, t in ((np.eye(3), np.zeros(3)), (R, shift)):
        mesh = MeshTet2(Q @ box.doflocs + t[:, None], box.t)
        rules = {n: (lambda p, r=r, Q=Q, t=t: r(Q.T @ (p - t[:, None]))) for n, r in box_regions(L, B, H).items()}
        member = Member(
            "arm",
            tuple(t),
            tuple(Q @ [L, 0, 0] + t),
            tuple(Q @ [0.3, 0, 1.0]),
            0.0,
            Section("rectangle", {"depth": H, "width": B}),
        )
        part = Part(
            "bar",
            STEEL,
            (member,),
            (
                Support("wall", "arm.start", ALL, axes="member"),
                Support("side", "arm.left", {"normal": 0.0}),
            ),
            (
                RegionLoad("tip", "arm.end", tuple(Q @ force), tuple(Q @ moment)),
                BodyLoad("self_weight", tuple(Q @ [0.0, 0.0, -9810.0])),
            ),
            (Case("all", {"tip": 1.0, "self_weight": 1.0}),),
            places=(Place("third", "arm", L / 3),),
        )
        results.append((solve_solid(part, named_mesh(mesh, rules), BUDGET), Q))
    (first, _), (second, _) = results
    a, b = ({f.key: f.value for f in r.figures} for r in (first, second))
    assert a.keys() == b.keys()
    for key in a:
        if key.axes == "member":
            scale = max(abs(v) for k, v in a.items() if k.quantity == key.quantity)
            assert b[key] == pytest.approx(a[key], abs=1e-6 * scale), key
        elif key.component in ("x", "y", "z") and key.quantity != "centre_of_mass":
            turned = R @ [a[key._replace(component=c)] for c in "xyz"]
            scale = max(abs(v) for k, v in a.items() if k.quantity == key.quantity)
            assert b[key] == pytest.approx(turned["xyz".index(key.component)], abs=1e-6 * scale), key
        elif not key.component:
            assert b[key] == pytest.approx(a[key], rel=1e-8), key


def test_clip_measures_the_part_beyond() -> None:
    rng = np.random.default_rng(3)
    d = rng.normal(size=(6, 200))
    owner, bary, weights = clip_beyond(d[None], 2)
    one = np.bincount(owner, weights=weights, minlength=200)
    owner2, _, weights2 = clip_beyond(-d[None], 2)
    assert one + np.bincount(owner2, weights=weights2, minlength=200) == pytest.approx(np.full(200, 0.5))
    assert (weights >= 0).all() and bary.sum(axis=0) == pytest.approx(np.ones(owner.size))
    # every point lies beyond; with a lone corner beyond, the area is the product of the two edges' shares
    assert ((bary * d[:3, owner]).sum(axis=0) >= -1e-14).all()
    lone = (d[0] > 0) & (d[1] < 0) & (d[2] < 0)
    expected = d[0] ** 2 / (d[0] - d[1]) / (d[0] - d[2]) / 2
    assert lone.sum() > 10
    assert one[lone] == pytest.approx(expected[lone])
    # two planes at once: the strip between them is what both leave
    between = clip_beyond(np.array([d, 0.3 - d]), 2)
    strip = np.bincount(between[0], weights=between[2], minlength=200)
    over = clip_beyond(d[None] - 0.3, 2)
    assert strip == pytest.approx(one - np.bincount(over[0], weights=over[2], minlength=200), abs=1e-14)


def test_section_means_of_a_rigid_motion_and_area() -> None:
    mesh = box_mesh(L, B, H, (5, 2, 2))
    frame = Frame(np.zeros(3), np.eye(3), L)
    shift, turn = np.array([0.1, -0.2, 0.3]), np.array([1e-3, -2e-3, 3e-3])
    u = (shift[:, None] + np.cross(turn, mesh.nodes.T).T)[None]
    for at in (0.0, 17.3, L / 5, 100.0, L):
        cut = Cutter(mesh).cut(frame, at)
        assert cut.area == pytest.approx(B * H, rel=1e-12)
        assert cut.centroid == pytest.approx([at, 0.0, 0.0], abs=1e-9)
        mean, rot = section_means(cut, u, frame)
        assert mean[0] == pytest.approx(shift + np.cross(turn, [at, 0, 0]), abs=1e-12)
        assert rot[0] == pytest.approx(turn, abs=1e-12)
