"""Published and exact solutions through `solve_solid`."""

from __future__ import annotations

import numpy as np
import pytest
from skfem import MeshTet, MeshTet2
from solid_help import STEEL, box_mesh, box_part, named_mesh

from fem.figure import FigureKey
from fem.solid import SolidResult, solve_solid
from geometry.budget import Budget
from geometry.part import (
    BodyLoad,
    Case,
    Material,
    Member,
    Part,
    Pressure,
    RegionLoad,
    Section,
    Support,
    TemperatureLoad,
)

BUDGET = Budget(threads=1)
ALL = {"x": 0.0, "y": 0.0, "z": 0.0}


def value(
    result: SolidResult, place: str, quantity: str, component: str, case: str = "all", axes: str = "global"
) -> float:
    return {f.key: f.value for f in result.figures}[FigureKey(case, place, quantity, component, axes)]


def test_c9_pure_bending_is_exact() -> None:
    # REFERENCES C9: 20 x 20, M 1e5: curvature 3.571429e-5, anticlastic nu times that, stress 75.0, sagitta over 200 mm
    # 0.178571. Held statically by mean values so that nothing disturbs the field.
    held = dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0)
    part = box_part(
        200.0,
        20.0,
        20.0,
        [Support("base", "arm.start", held, "average")],
        [RegionLoad("bend", "arm.end", moment=(0.0, 1e5, 0.0))],
    )
    result = solve_solid(part, box_mesh(200.0, 20.0, 20.0, (4, 2, 2)), BUDGET)
    k, nu = 1e5 / (210000.0 * 20.0**4 / 12), 0.3
    assert k == pytest.approx(3.571429e-5, rel=1e-6)
    assert value(result, "arm.end", "rotation", "y") == pytest.approx(k * 200, rel=1e-6)
    # the mean of a section moves down by k x^2 / 2
    assert value(result, "arm@100", "displacement", "z") == pytest.approx(-k * 100**2 / 2, rel=1e-6)
    x, y, z = result.mesh.nodes
    assert result.stress[0, 0] == pytest.approx(75.0 * z / 10.0, abs=75e-6)
    assert np.abs(result.stress[0, 1:]).max() < 75e-6
    exact = np.array([k * x * z, -nu * k * y * z, -k * (x**2 + nu * (z**2 - y**2)) / 2])
    # a uniform lift is left: the start's mean z displacement is held, not that of its middle
    assert np.abs(result.u[0] - exact - (result.u[0] - exact).mean(axis=1)[:, None]).max() < 1e-8
    assert value(result, "arm@100", "nominal_stress", "xx@top", axes="member") == pytest.approx(75.0, rel=1e-6)
    assert value(result, "", "strain_energy", "") == pytest.approx(1e5 * k * 200 / 2, rel=1e-6)
    assert [c for c in result.checks if not c.ok] == []


@pytest.mark.parametrize(("direction", "expected"), [(0, 2.9975e-5), (2, 0.1079), (1, 0.4309)])
def test_c1_straight_cantilever(direction: int, expected: float) -> None:
    # REFERENCES C1: L 6, 0.2 x 0.1, E 1e7, nu 0.3, unit tip loads; recomputed 3D values; tol 0.5 % (twist not used: R!)
    soft = Material("c1", 1e7, 0.3, 1.0, 0.0, None, None, "declared", "")
    force = tuple(float(i == direction) for i in range(3))
    part = box_part(
        6.0, 0.1, 0.2, [Support("wall", "arm.start", ALL)], [RegionLoad("tip", "arm.end", force)], material=soft
    )
    result = solve_solid(part, box_mesh(6.0, 0.1, 0.2, (36, 1, 2)), BUDGET)
    assert value(result, "arm.end", "displacement", "xyz"[direction]) == pytest.approx(expected, rel=5e-3)
    assert [c.name for c in result.checks if not c.ok and "largest" not in c.name] == []


def lame_cylinder(cells: tuple[int, int, int], length: float) -> tuple[Part, object]:
    ri, ro = 50.0, 100.0
    box = MeshTet2.from_mesh(
        MeshTet.init_tensor(
            np.linspace(0, length, cells[0] + 1),
            np.linspace(ri, ro, cells[1] + 1),
            np.linspace(0, np.pi / 2, cells[2] + 1),
        )
    )
    x, r, t = box.doflocs
    mesh = MeshTet2(np.array([x, r * np.cos(t), r * np.sin(t)]), box.t)
    tol = 1e-6

    def radius(p: np.ndarray) -> np.ndarray:
        return np.hypot(p[1], p[2])

    regions = {
        "tube.start": lambda p: p[0] < tol,
        "tube.end": lambda p: p[0] > length - tol,
        "tube.left": lambda p: p[1] < tol,
        "tube.bottom": lambda p: p[2] < tol,
        "tube.bore": lambda p: (radius(p) < 0.6 * ri + 0.4 * ro) & ~_flat(p, length),
        "tube.surface": lambda p: (radius(p) > 0.4 * ri + 0.6 * ro) & ~_flat(p, length),
    }
    named = named_mesh(mesh, regions)
    member = Member("tube", (0.0, 0.0, 0.0), (length, 0.0, 0.0), (0.0, 0.0, 1.0), 0.0, Section("tube", {}))
    supports = (
        Support("sym_x", "tube.start", {"normal": 0.0}),
        Support("sym_x2", "tube.end", {"normal": 0.0}),
        Support("sym_y", "tube.left", {"normal": 0.0}),
        Support("sym_z", "tube.bottom", {"normal": 0.0}),
    )
    loads = (Pressure("p", "tube.bore", 60.0),)
    return Part("c5", STEEL, (member,), supports, loads, (Case("all", {"p": 1.0}),)), named


def _flat(p: np.ndarray, length: float) -> np.ndarray:
    return (p[0] < 1e-6) | (p[0] > length - 1e-6) | (p[1] < 1e-6) | (p[2] < 1e-6)


@pytest.mark.heavy
def test_c5_lame_cylinder() -> None:
    # REFERENCES C5: ri 50, ro 100, p 60: hoop 100 inside, 40 outside; radial -60, 0; plane strain u(ri) 0.0272381
    part, mesh = lame_cylinder((1, 4, 6), 10.0)
    result = solve_solid(part, mesh, BUDGET)  # type: ignore[arg-type]
    _, y, z = result.mesh.nodes
    r = np.hypot(y, z)
    inside, outside = np.abs(r - 50) < 1e-6, np.abs(r - 100) < 1e-6
    radial = (result.u[0, 1] * y + result.u[0, 2] * z) / r
    assert radial[inside].mean() == pytest.approx(0.0272381, rel=5e-4)
    assert radial[inside] == pytest.approx(0.0272381, rel=2e-3)
    c, s = y / r, z / r
    yy, zz, yz = result.stress[0, 1], result.stress[0, 2], result.stress[0, 4]
    hoop = s * s * yy + c * c * zz - 2 * s * c * yz
    assert hoop[inside].mean() == pytest.approx(100.0, rel=0.03)
    assert hoop[outside].mean() == pytest.approx(40.0, rel=0.01)
    # half of the wall's pull at each flat side: p ri = int hoop dr
    assert value(result, "sym_z", "reaction_force", "z") == pytest.approx(-60.0 * 50.0 * 10.0, rel=1e-6)
    assert [c for c in result.checks if not c.ok] == []


def test_b26_thermal() -> None:
    # REFERENCES B26: fully restrained, dT 50, alpha 12e-6: 126.0 compressive. Sides free to move along themselves.
    sides = [Support(s, f"arm.{s}", {"normal": 0.0}) for s in ("start", "end", "left", "bottom")]
    part = box_part(100.0, 20.0, 20.0, sides, [TemperatureLoad("heat", 50.0)])
    result = solve_solid(part, box_mesh(100.0, 20.0, 20.0, (4, 2, 2)), BUDGET)
    assert result.stress[0, 0] == pytest.approx(-126.0, rel=1e-9)
    assert np.abs(result.stress[0, 1:]).max() < 1e-8
    assert value(result, "arm@50", "section_force", "N", axes="member") == pytest.approx(-126.0 * 400, rel=1e-9)
    assert value(result, "end", "reaction_force", "x") == pytest.approx(-126.0 * 400, rel=1e-9)
    assert [c for c in result.checks if not c.ok] == []
    # free to grow: no stress, growth alpha dT L
    free = [Support(s, f"arm.{s}", {"normal": 0.0}) for s in ("start", "left", "bottom")]
    result = solve_solid(
        box_part(100.0, 20.0, 20.0, free, [TemperatureLoad("heat", 50.0)]),
        box_mesh(100.0, 20.0, 20.0, (4, 2, 2)),
        BUDGET,
    )
    assert np.abs(result.stress).max() < 1e-8
    assert value(result, "arm.end", "displacement", "x") == pytest.approx(12e-6 * 50 * 100, rel=1e-9)
    assert [c for c in result.checks if not c.ok] == []


def test_b27_self_weight() -> None:
    # REFERENCES B27: 50 x 50, L 1000, 7850 kg/m3, g 9.81: tip 0.220024 (bending); shear adds w L^2 / (2 k A G)
    part = box_part(1000.0, 50.0, 50.0, [Support("wall", "arm.start", ALL)], [BodyLoad("self_weight", (0, 0, -9810.0))])
    result = solve_solid(part, box_mesh(1000.0, 50.0, 50.0, (30, 2, 2)), BUDGET)
    w = 0.1925213
    shear = w * 1000.0**2 / (2 * 0.8497 * 2500 * 80769)
    assert value(result, "arm.end", "displacement", "z") == pytest.approx(
        -(0.220024 + shear), rel=1e-2
    )  # H6: L/h >= 10
    assert value(result, "wall", "reaction_force", "z") == pytest.approx(w * 1000, rel=1e-6)
    assert result.mass == pytest.approx(7.85e-9 * 2500 * 1000, rel=1e-12)
    assert result.centre_of_mass == pytest.approx([500.0, 0.0, 0.0], abs=1e-9)
    for at in (0.0, 130.0 / 130 * 150, 400.0, 950.0, 1000.0):
        left = 1000.0 - at
        place = f"arm@{at:g}"
        assert value(result, place, "section_force", "Vz", axes="member") == pytest.approx(
            -w * left, rel=1e-6, abs=1e-6
        )
        assert value(result, place, "section_moment", "My", axes="member") == pytest.approx(
            w * left**2 / 2, rel=1e-6, abs=1e-3
        )


def test_b17_deep_cantilever_shear() -> None:
    # REFERENCES B17 at L 2000: 3.047619 + 0.005829 (Cowper); H6: 1 % for L/h >= 10
    part = box_part(
        2000.0, 50.0, 100.0, [Support("wall", "arm.start", ALL)], [RegionLoad("tip", "arm.end", (0.0, 0.0, -1000.0))]
    )
    result = solve_solid(part, box_mesh(2000.0, 50.0, 100.0, (40, 1, 2)), BUDGET)
    assert value(result, "arm.end", "displacement", "z") == pytest.approx(-3.053448, rel=5e-3)
    assert value(result, "arm@1000", "nominal_stress", "xx@top", axes="member") == pytest.approx(12.0, rel=5e-3)
    assert value(result, "arm@1000", "nominal_stress", "xx@bottom", axes="member") == pytest.approx(-12.0, rel=5e-3)
