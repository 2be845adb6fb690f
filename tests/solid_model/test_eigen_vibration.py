"""Natural frequencies of the solid against published and exact ones."""

from __future__ import annotations

from dataclasses import replace
from functools import partial
from typing import Any

import numpy as np
import pytest
from eigen_help import (
    ALL,
    BUDGET,
    MEAN_WALL,
    NU,
    PINS,
    RHO,
    WALL,
    E,
    G,
    frequencies,
    slender,
    tapered_mesh,
    tube_mesh,
    vibration,
)
from solid_help import STEEL, box_mesh, box_part

from fem.mode import SHAPE_STATIONS
from fem.solid import solve_solid
from fem.solid.eigen import Eigenmodes, modes, sounding
from fem.solid.eigen import vibration as module
from fem.solid.eigen.pairs import Pairs, Pencil, extreme_pairs
from fem.solid.eigen.space import Space
from fem.solid.factor import TooLarge
from fem.solid.shape import Array
from fem.solid.system import HeldSystem
from geometry.part import Buckling, Member, Part, RegionLoad, RemotePoint, Section, Support, Vibration
from geometry.problem import SolveError

ABOUT_Y, ABOUT_Z = "bending about y", "bending about z"


@pytest.fixture(scope="module")
def cantilever() -> Eigenmodes:
    return vibration(*slender([WALL]))


@pytest.fixture(scope="module")
def free_bar() -> Eigenmodes:
    return vibration(*slender([WALL]), free=True)


def test_cantilever_has_the_frequencies_of_the_beam(cantilever: Eigenmodes) -> None:
    # REFERENCES E2: 25.0655 and 16.7103 Hz
    assert cantilever.modes[0].value == pytest.approx(16.7103, rel=5e-3)
    assert cantilever.modes[1].value == pytest.approx(25.0655, rel=5e-3)
    assert [m.kind for m in cantilever.modes[:4]] == [ABOUT_Z, ABOUT_Y, ABOUT_Z, ABOUT_Y]


def test_ratios_of_the_higher_frequencies(cantilever: Eigenmodes) -> None:
    # REFERENCES E1: beta L 1.875104, 4.694091, 7.854757; shear and rotary inertia take some 0.4 % of the third
    f = frequencies(cantilever, ABOUT_Z)
    assert f[1] / f[0] == pytest.approx((4.694091 / 1.875104) ** 2, rel=5e-3)
    assert f[2] / f[0] == pytest.approx((7.854757 / 1.875104) ** 2, rel=7e-3)


def test_modes_carry_their_share_of_the_mass(cantilever: Eigenmodes) -> None:
    # effective mass of a uniform cantilever (2 sigma / beta L)^2, sigma 0.734096, 1.018467 (Blevins 1979, table 8-1)
    first, second = (m.mass_share for m in cantilever.modes if m.kind == ABOUT_Y and m.value < 200)
    assert first[2] == pytest.approx((2 * 0.734096 / 1.875104) ** 2, rel=5e-3)
    assert second[2] == pytest.approx((2 * 1.018467 / 4.694091) ** 2, rel=1e-2)
    # about the middle: int phi x dx = 2 / (beta L)^2 of a shape with the mean square 1 (from memory)
    about = 2 / 1.875104**2 - 0.734096 / 1.875104
    assert first[4] == pytest.approx(12 * about**2, rel=5e-3)
    assert abs(first[[0, 1, 3, 5]]).max() < 1e-6


def test_shape_of_the_first_mode(cantilever: Eigenmodes) -> None:
    mode = cantilever.modes[0]
    w, slope = mode.displacement[:, 1], mode.rotation[:, 2]
    assert mode.displacement.shape == (SHAPE_STATIONS, 3)
    assert abs(w[-1]) == pytest.approx(1.0, abs=1e-2)  # largest displacement 1 mm, at the tip
    x, b, s = np.linspace(0.0, 1.0, SHAPE_STATIONS), 1.875104, 0.734096
    exact = (np.cosh(b * x) - np.cos(b * x) - s * (np.sinh(b * x) - np.sin(b * x))) / 2
    assert w / w[-1] == pytest.approx(exact, abs=2e-3)
    assert np.gradient(w, 1000.0 / (SHAPE_STATIONS - 1))[1:-1] == pytest.approx(slope[1:-1], abs=2e-5)
    assert mode.section_share > 0.999
    assert np.linalg.norm(cantilever.shapes, axis=1).max(axis=1) == pytest.approx(1.0)


def test_free_bar(free_bar: Eigenmodes) -> None:
    # REFERENCES E2: 159.498 and 106.332 Hz, and nothing below
    assert free_bar.modes[0].value == pytest.approx(106.332, rel=5e-3)
    assert free_bar.modes[1].value == pytest.approx(159.498, rel=5e-3)
    # REFERENCES E1: 4.730041, 7.853205
    f = frequencies(free_bar, ABOUT_Z)
    assert f[1] / f[0] == pytest.approx((7.853205 / 4.730041) ** 2, rel=5e-3)


def test_modes_of_a_free_part_carry_no_mass(free_bar: Eigenmodes) -> None:
    assert max(abs(m.mass_share).max() for m in free_bar.modes) < 1e-12


def test_pinned_bar_on_mean_values() -> None:
    # REFERENCES E2: 70.3599 and 46.9066 Hz
    f = frequencies(vibration(*slender(PINS), modes=2))
    assert f == pytest.approx([46.9066, 70.3599], rel=5e-3)


def test_pinned_timoshenko_beam() -> None:
    # REFERENCES E4, h 100: 230.680, 881.522 Hz
    result = vibration(box_part(1000.0, 50.0, 100.0, PINS), box_mesh(1000.0, 50.0, 100.0, (20, 2, 4)))
    assert frequencies(result, ABOUT_Y)[:2] == pytest.approx([230.680, 881.522], rel=5e-3)


@pytest.mark.parametrize("coupling", ["average", "rigid"])
def test_mass_at_the_tip(coupling: str) -> None:
    # REFERENCES E3, M/m 1: (beta L)^2 1.557298, 16.25009
    tip = RemotePoint("tip", "arm.end", (1000.0, 0.0, 0.0), coupling, mass=RHO * 600e3)  # type: ignore[arg-type]
    f = frequencies(vibration(*slender([WALL], [tip]), modes=4), ABOUT_Z)
    unit = np.sqrt(E * 30 * 20**3 / 12 / (RHO * 600)) / 1000**2 / (2 * np.pi)
    assert f == pytest.approx([1.557298 * unit, 16.25009 * unit], rel=5e-3)


@pytest.mark.parametrize("coupling", ["average", "rigid"])
def test_remote_mass_with_inertia_on_a_lever(coupling: str) -> None:
    """A light bar with a body at a distance from its end: two freedoms in each plane, in closed form."""
    L, a, m, inertia = 1000.0, 150.0, 2e-3, (30.0, 80.0, 50.0, 0.0, 0.0, 0.0)
    part, mesh = slender(
        [WALL], [RemotePoint("body", "arm.end", (L + a, 0.0, 0.0), coupling, mass=m, inertia=inertia)]  # type: ignore[arg-type]
    )
    part = replace(part, material=replace(STEEL, density=1e-15))
    result = vibration(part, mesh, modes=5)

    def plane(EI: float, J: float) -> list[float]:
        flexibility = np.array([[L**3 / 3, L**2 / 2], [L**2 / 2, L]]) / EI
        lever = np.array([[1.0, a], [0.0, 1.0]])  # motion of the body from that of the end
        M = lever.T @ np.diag([m, J]) @ lever
        return sorted(1 / np.sqrt(np.linalg.eigvals(flexibility @ M).real) / (2 * np.pi))

    about_y, about_z = plane(E * 20 * 30**3 / 12, inertia[1]), plane(E * 30 * 20**3 / 12, inertia[2])
    assert frequencies(result, ABOUT_Y) == pytest.approx(about_y, rel=5e-3)
    assert frequencies(result, ABOUT_Z) == pytest.approx(about_z, rel=5e-3)
    # torsion constant of 20 x 30: 0.196 x 30 x 20^3 (Timoshenko & Goodier, from memory); the mesh is coarse for it
    torsion = np.sqrt(G * 0.196 * 30 * 20**3 / L / inertia[0]) / (2 * np.pi)
    assert frequencies(result, "torsion") == pytest.approx([torsion], rel=2.5e-2)


def test_tapered_cantilever() -> None:
    # REFERENCES E5, depth ratio 0.5: 3.82378, 18.3173
    L, b, h = 1000.0, 20.0, 40.0
    result = vibration(box_part(L, b, h, [MEAN_WALL]), tapered_mesh(L, b, h, 0.5, (30, 1, 2)), modes=6)
    unit = np.sqrt(E * h**2 / 12 / RHO) / L**2 / (2 * np.pi)
    assert frequencies(result, ABOUT_Y)[:2] == pytest.approx([3.82378 * unit, 18.3173 * unit], rel=7e-3)


def test_axial_frequencies_of_a_guided_bar() -> None:
    """(2 n - 1) / 4 L sqrt(E / rho), exact without Poisson's ratio when nothing moves across."""
    L = 400.0
    guides = [Support(s, f"arm.{s}", {"y": 0.0, "z": 0.0}) for s in ("top", "bottom", "left", "right")]
    part = box_part(L, 10.0, 10.0, [Support("end", "arm.start", ALL), *guides])
    part = replace(part, material=replace(STEEL, nu=0.0))
    result = vibration(part, box_mesh(L, 10.0, 10.0, (16, 1, 1)), modes=3)
    exact = [(2 * n - 1) / (4 * L) * np.sqrt(E / RHO) for n in (1, 2, 3)]
    assert frequencies(result) == pytest.approx(exact, rel=2e-4)
    assert [m.kind for m in result.modes] == ["axial"] * 3


def test_torsional_frequencies_of_a_tube() -> None:
    """(2 n - 1) / 4 L sqrt(G / rho), exact for a round section; a quarter, with antisymmetry on its flat sides."""
    L, inner, outer = 300.0, 15.0, 25.0
    member = Member("arm", (0.0,) * 3, (L, 0.0, 0.0), (0.0, 0.0, 1.0), 0.0, Section("round", {"diameter": 2 * outer}))
    supports = (
        Support("wall", "arm.start", ALL),
        Support("left", "arm.left", {"x": 0.0, "z": 0.0}),
        Support("bottom", "arm.bottom", {"x": 0.0, "y": 0.0}),
    )
    part = Part("tube", STEEL, (member,), supports, (), ())
    result = vibration(part, tube_mesh(L, inner, outer, (24, 1, 4)), modes=2)
    exact = [(2 * n - 1) / (4 * L) * np.sqrt(G / RHO) for n in (1, 2)]
    assert frequencies(result) == pytest.approx(exact, rel=2e-3)


def test_pairs_of_a_square_section_come_complete() -> None:
    result = vibration(box_part(500.0, 20.0, 20.0, [WALL]), box_mesh(500.0, 20.0, 20.0, (16, 2, 2)), modes=7)
    f = frequencies(result)
    assert f[0:6:2] == pytest.approx(f[1:6:2], rel=2e-3)
    assert result.modes[6].kind == "torsion"
    # asked for a number that cuts a pair in two
    three = vibration(box_part(500.0, 20.0, 20.0, [WALL]), box_mesh(500.0, 20.0, 20.0, (16, 2, 2)), modes=3)
    assert frequencies(three) == pytest.approx(f[:3], rel=1e-9)
    note = next(c.note for c in three.checks if "missed" in c.name)
    assert note.startswith("4 at or below")


def test_a_plate_moves_by_itself_in_its_fourth_mode() -> None:
    # square cantilever plate, omega a^2 sqrt(rho h / D): 3.49, 8.55, 21.4, 27.3 (Leissa 1969, from memory): bending,
    # torsion, bending, and one that bends the section
    a, h = 200.0, 6.0
    result = vibration(box_part(a, a, h, [WALL]), box_mesh(a, a, h, (10, 10, 1)), modes=4)
    unit = np.sqrt(E * h**2 / (12 * (1 - NU**2) * RHO)) / a**2 / (2 * np.pi)
    assert np.array(frequencies(result)) / unit == pytest.approx([3.49, 8.55, 21.4, 27.3], rel=2e-2)
    assert [m.kind for m in result.modes] == [ABOUT_Y, "torsion", ABOUT_Y, "local"]
    assert result.modes[3].section_share < 0.5 < 0.8 < result.modes[0].section_share


def test_a_missed_mode_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    def without_the_second(pencil: Pencil, start: Array, tolerance: Array, *rest: Any) -> Pairs:
        found = extreme_pairs(pencil, start, np.r_[tolerance[:1], tolerance], *rest)
        kept = np.delete(np.arange(found.mu.size), 1)
        return Pairs(found.mu[kept], found.x[:, kept], found.residual[kept], found.rounds)

    monkeypatch.setattr(module, "extreme_pairs", without_the_second)
    with pytest.raises(SolveError, match="1 natural frequencies too few"):
        vibration(*slender([WALL]), modes=3)


@pytest.mark.parametrize("decided", [True, False])
def test_where_nothing_is_counted_what_was_missed_is_found(monkeypatch: pytest.MonkeyPatch, decided: bool) -> None:
    """By vectors that go on from random ones, and where these do not decide, by a second search."""
    calls = []
    if not decided:
        monkeypatch.setattr(sounding, "STEPS", 1)

    def first_without_the_second(pencil: Pencil, start: Array, tolerance: Array, *rest: Any) -> Pairs:
        calls.append(start.shape[1])
        if len(calls) > 1:
            return extreme_pairs(pencil, start, tolerance, *rest)
        found = extreme_pairs(pencil, start, np.r_[tolerance[:1], tolerance], *rest)
        kept = np.delete(np.arange(found.mu.size), 1)
        space = Space(pencil, start.shape[0], kept.size)
        space.add(found.x[:, kept])
        return Pairs(found.mu[kept], found.x[:, kept], found.residual[kept], found.rounds, space)

    monkeypatch.setattr(module, "extreme_pairs", first_without_the_second)
    monkeypatch.setattr(module, "too_large", lambda motions: "nothing counted")
    result = vibration(*slender([WALL]), modes=3)
    assert frequencies(result)[1] == pytest.approx(25.0655, rel=5e-3)
    assert len(calls) == 2  # the second search itself goes by another name
    note = next(c.note for c in result.checks if "missed" in c.name)
    if decided:
        assert note.startswith("nothing counted; 3 at or below ")
        assert "steps from random vectors leave a chance below 1e-06 that there is one more; " in note
    else:
        assert note == "nothing counted; a second search from other vectors found none that was missed"


def test_modes_that_do_not_converge_are_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "extreme_pairs", partial(extreme_pairs, rounds=1))
    with pytest.raises(SolveError, match="do not converge"):
        vibration(*slender([WALL]))


def test_an_impossible_inertia_is_refused() -> None:
    body = RemotePoint("body", "arm.end", (0.0,) * 3, "average", mass=1e-3, inertia=(1.0, 1.0, 1.0, 2.0, 0.0, 0.0))
    with pytest.raises(SolveError, match="principal moment -1"):
        vibration(*slender([WALL], [body]))


def test_modes_are_part_of_the_whole_result() -> None:
    part, mesh = slender([WALL], [RegionLoad("push", "arm.end", (-1.0, 0.0, 0.0))])
    part = replace(part, vibration=Vibration(2), buckling=(Buckling("all", modes=1),))
    told: list[str] = []
    result = solve_solid(part, mesh, BUDGET, told.append)
    assert [m.value for m in result.vibration] == pytest.approx([16.7103, 25.0655], rel=5e-3)
    assert [m.value for m in result.buckling] == pytest.approx([np.pi**2 * E * 20e3 / 4e6], rel=1e-2)
    assert result.vibration_shapes.shape == (2, 3, mesh.nodes.shape[1])
    assert result.buckling_shapes.shape == (1, 3, mesh.nodes.shape[1])
    assert {"natural frequencies", "buckling"} <= set(told) & set(result.timings)
    assert {"natural frequencies: largest residual", "buckling of all: largest residual"} <= {
        c.name for c in result.checks
    }


@pytest.mark.parametrize("free", [False, True])
def test_the_iterative_solver_finds_the_same_modes(free: bool) -> None:
    part = box_part(200.0, 50.0, 60.0, [WALL], [RegionLoad("push", "arm.end", (-1.0, 0.0, 0.0))])
    part = replace(part, vibration=Vibration(4, free), buckling=(Buckling("all", modes=2),))
    mesh = box_mesh(200.0, 50.0, 60.0, (8, 3, 3))
    direct, iterative = (solve_solid(part, mesh, BUDGET, solver=s) for s in ("cholesky", "multigrid"))  # type: ignore[arg-type]
    assert iterative.backend == "multigrid"
    assert "multigrid" in next(c.note for c in iterative.checks if c.name == "natural frequencies: largest residual")
    for a, b in zip(direct.vibration + direct.buckling, iterative.vibration + iterative.buckling, strict=True):
        assert b.value == pytest.approx(a.value, rel=2e-6)
    shapes = zip(
        [*direct.vibration_shapes, *direct.buckling_shapes],
        [*iterative.vibration_shapes, *iterative.buckling_shapes],
        strict=True,
    )
    for p, q in shapes:
        assert abs((p * q).sum()) == pytest.approx(np.linalg.norm(p) * np.linalg.norm(q), rel=1e-4)


def test_modes_that_do_not_settle_iteratively_are_sought_directly(monkeypatch: pytest.MonkeyPatch) -> None:
    part = replace(box_part(200.0, 50.0, 60.0, [WALL]), vibration=Vibration(2))
    mesh = box_mesh(200.0, 50.0, 60.0, (8, 2, 2))

    def few(pencil: Pencil, start: Array, tolerance: Array, *rest: Any) -> Pairs:
        return extreme_pairs(pencil, start, tolerance, *rest, rounds=120 if tolerance[0] < 1e-5 else 1)

    monkeypatch.setattr(module, "extreme_pairs", few)
    result = solve_solid(part, mesh, BUDGET, solver="multigrid")
    note = next(c.note for c in result.checks if c.name == "natural frequencies: largest residual")
    assert "as the iterative one failed: The natural frequencies do not converge" in note
    assert len(result.vibration) == 2


def test_modes_that_neither_settle_nor_fit_a_direct_solver_are_refused_with_both_reasons(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    part = replace(box_part(200.0, 50.0, 60.0, [WALL]), vibration=Vibration(2))
    mesh = box_mesh(200.0, 50.0, 60.0, (8, 2, 2))

    def none(pencil: Pencil, start: Array, tolerance: Array, *rest: Any) -> Pairs:
        return extreme_pairs(pencil, start, tolerance, *rest, rounds=1)

    def too_large(*given: Any) -> HeldSystem:
        assert given[4] == "cholesky"
        raise TooLarge("The factor needs about 9000 MiB and the budget is 4096 MiB. Raise the memory.")

    monkeypatch.setattr(module, "extreme_pairs", none)
    monkeypatch.setattr(modes, "HeldSystem", too_large)
    with pytest.raises(TooLarge, match="do not converge: residual .* allowed 1e-03. The direct .* 9000 MiB .* Raise"):
        solve_solid(part, mesh, BUDGET, solver="multigrid")


def test_same_modes_again() -> None:
    first, again = (vibration(*slender([WALL]), modes=2) for _ in range(2))
    assert np.array_equal(first.shapes, again.shapes)
    assert BUDGET.threads == 1

