"""Linear buckling of the solid against Euler, Greenhill, Prandtl and Michell."""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np
import pytest
from eigen_help import MEAN_WALL, NU, PINS, WALL, E, buckling, slender
from scipy.optimize import brentq
from solid_help import STEEL, box_mesh, box_part

from fem.solid.eigen import Eigenmodes
from fem.solid.eigen import buckling as module
from fem.solid.eigen.pairs import Pairs, Pencil, extreme_pairs
from fem.solid.shape import Array
from geometry.part import BodyLoad, Buckling, Case, RegionLoad, RemotePoint, Support, TemperatureLoad
from geometry.problem import SolveError

ABOUT_Y, ABOUT_Z = "bending about y", "bending about z"
L = 1000.0
EULER = np.pi**2 * E * (30 * 20**3 / 12) / L**2
"""Of 20 x 30 x 1000 about its weak axis, both ends pinned, N (REFERENCES E6)."""
PUSH = RegionLoad("push", "arm.end", (-1.0, 0.0, 0.0))


def failed(result: Eigenmodes) -> list[str]:
    return [c.name for c in result.checks if not c.ok]


@pytest.fixture(scope="module")
def column() -> Eigenmodes:
    return buckling(*slender([MEAN_WALL], [PUSH]), Buckling("all"))


def test_cantilever_column(column: Eigenmodes) -> None:
    # REFERENCES E6: a quarter of the pinned load; about the strong axis and for three quarter waves 9/4 and 9 times it
    assert [m.value for m in column.modes] == pytest.approx(EULER / 4 * np.array([1, 9 / 4, 9]), rel=1e-2)
    assert [m.kind for m in column.modes] == [ABOUT_Z, ABOUT_Y, ABOUT_Z]
    assert failed(column) == []
    assert column.modes[0].case == "all"
    assert column.modes[0].section_share > 0.999
    assert not column.modes[0].mass_share.any()


def test_the_count_is_that_of_the_factors(column: Eigenmodes) -> None:
    note = next(c.note for c in column.checks if "missed" in c.name)
    assert note.startswith("3 between 0 and")


def test_shape_of_the_column(column: Eigenmodes) -> None:
    w = column.modes[0].displacement[:, 1]
    x = np.linspace(0.0, 1.0, w.size)
    assert w / w[-1] == pytest.approx(1 - np.cos(np.pi / 2 * x), abs=2e-3)


def test_a_pull_buckles_the_column_in_reverse() -> None:
    pull = RegionLoad("pull", "arm.end", (1.0, 0.0, 0.0))
    result = buckling(*slender([MEAN_WALL], [pull]), Buckling("all", modes=1))
    assert [m.value for m in result.modes] == pytest.approx([-EULER / 4], rel=1e-2)
    assert failed(result) == []


def test_pinned_column() -> None:
    # REFERENCES E6
    result = buckling(*slender(PINS, [PUSH]), Buckling("all", modes=1))
    assert result.modes[0].value == pytest.approx(EULER, rel=1e-2)


def test_column_under_its_own_weight() -> None:
    # REFERENCES E7: 7.8373 E I / L^2 of weight
    weight = BodyLoad("weight", (-9810.0, 0.0, 0.0))
    result = buckling(*slender([MEAN_WALL], [weight]), Buckling("all", modes=1))
    exact = 7.8373 * E * (30 * 20**3 / 12) / L**2 / (STEEL.density * 600 * L * 9810)
    assert result.modes[0].value == pytest.approx(exact, rel=1e-2)


def test_lateral_buckling_either_way() -> None:
    # REFERENCES E10: 635.9 N at the end of 5 x 60 x 1000, of either sign; the wall lets the section warp
    down = RegionLoad("down", "arm.end", (0.0, 0.0, -1.0))
    result = buckling(
        box_part(L, 5.0, 60.0, [MEAN_WALL], [down]), box_mesh(L, 5.0, 60.0, (50, 1, 6)), Buckling("all", modes=2)
    )
    assert sorted(m.value for m in result.modes) == pytest.approx([-635.9, 635.9], rel=1e-2)
    assert {m.kind for m in result.modes} == {"lateral-torsional"}
    assert failed(result) == []


def test_the_other_sign_is_looked_for() -> None:
    """A bar held at both ends and pulled along at its middle is pushed on one side and pulled on the other, so that it
    buckles either way at one factor."""
    ends = [Support(s, f"arm.{s}", {"x": 0.0, "y": 0.0, "z": 0.0}) for s in ("start", "end")]
    ring = {"arm.ring": lambda x: (np.abs(x[0] - 500.0) < 25.0) & (np.hypot(x[1], x[2]) > 9.0)}
    load = RegionLoad("pull", "arm.ring", (1.0, 0.0, 0.0))
    part = box_part(L, 20.0, 30.0, ends, [load])
    result = buckling(part, box_mesh(L, 20.0, 30.0, (40, 2, 2), ring), Buckling("all", modes=1))
    assert len(result.modes) == 2  # one was asked for, and the first of the other sign comes with it
    assert result.modes[0].value == pytest.approx(-result.modes[1].value, rel=1e-3)


def test_fixed_loads_take_their_part() -> None:
    dead = RegionLoad("dead", "arm.end", (-EULER / 8, 0.0, 0.0))
    part, mesh = slender([MEAN_WALL], [PUSH, dead])
    alone = buckling(*slender([MEAN_WALL], [PUSH]), Buckling("all", modes=2))
    result = buckling(part, mesh, Buckling("all", ("dead",), 2))
    assert [m.value for m in result.modes] == pytest.approx([m.value - EULER / 8 for m in alone.modes], rel=1e-6)
    assert failed(result) == []


def test_a_pull_that_stays_stiffens() -> None:
    stay = RegionLoad("stay", "arm.end", (EULER, 0.0, 0.0))
    result = buckling(*slender([MEAN_WALL], [PUSH, stay]), Buckling("all", ("stay",), 1))
    assert result.modes[0].value == pytest.approx(EULER * 1.25, rel=1e-2)


def test_fixed_loads_that_buckle_the_part_alone_are_told() -> None:
    dead = RegionLoad("dead", "arm.end", (-EULER / 3, 0.0, 0.0))
    result = buckling(*slender([MEAN_WALL], [PUSH, dead]), Buckling("all", ("dead",)))
    assert result.modes == () and result.shapes.shape[0] == 0
    (bad,) = (c for c in result.checks if not c.ok)
    assert bad.value == pytest.approx(4 / 3, rel=1e-2)
    assert "the fixed loads alone buckle the part" in bad.note


def test_heat_buckles_a_bar_between_walls() -> None:
    # REFERENCES E6: 4 times the pinned load, reached by E A alpha dT; walls that let the section swell
    ends = [
        Support("first", "arm.start", MEAN_WALL.held, "average"),
        Support("second", "arm.end", MEAN_WALL.held, "average"),
    ]
    result = buckling(*slender(ends, [TemperatureLoad("heat", 1.0)]), Buckling("all", modes=1))
    assert result.modes[0].value == pytest.approx(4 * EULER / (E * 600 * STEEL.expansion), rel=1e-2)


def test_fixed_heat_and_a_push_that_grows() -> None:
    """Between walls that hold what heat makes: the push in a case with heat is short of the whole by the heat's."""
    ends = [
        Support("first", "arm.start", MEAN_WALL.held, "average"),
        Support("second", "arm.end", MEAN_WALL.held, "average"),
    ]
    critical = 4 * EULER / (E * 600 * STEEL.expansion)
    heat, more = TemperatureLoad("heat", critical / 2), TemperatureLoad("more", 1.0)
    result = buckling(*slender(ends, [heat, more]), Buckling("all", ("heat",), 1))
    assert result.modes[0].value == pytest.approx(critical / 2, rel=2e-2)


@pytest.mark.parametrize("coupling", ["average", "rigid"])
def test_a_push_at_the_end_of_a_lever(coupling: str) -> None:
    """Cantilever L with a stiff part of length a beyond it, pushed at its end: tan(k L) k a = 1."""
    a = 400.0
    far = RemotePoint("far", "arm.end", (L + a, 0.0, 0.0), coupling, force=(-1.0, 0.0, 0.0))  # type: ignore[arg-type]
    result = buckling(*slender([MEAN_WALL], [far]), Buckling("all", modes=1))
    kl = brentq(lambda t: np.tan(t) * t * a / L - 1.0, 0.1, 1.5)
    assert result.modes[0].value == pytest.approx(kl**2 / np.pi**2 * EULER, rel=1e-2)
    assert failed(result) == []


def test_two_studies_and_a_case_without_stress() -> None:
    part, mesh = slender([MEAN_WALL], [PUSH])
    part = box_part(L, 20.0, 30.0, [MEAN_WALL], [PUSH], (Case("twice", {"push": 2.0}), Case("none", {"push": 0.0})))
    result = buckling(part, mesh, Buckling("none"), Buckling("twice", modes=1))
    assert [m.case for m in result.modes] == ["twice"]
    assert result.modes[0].value == pytest.approx(EULER / 8, rel=1e-2)
    assert "there is none" in next(c.note for c in result.checks if c.name.startswith("buckling of none"))


def test_a_wide_plate_under_a_push_is_stiffer_than_a_strut() -> None:
    """Width over length 4: bending without the sideways curvature, E / (1 - nu^2) (plane strain), when pinned ends
    force a cylinder. Between the strut and the cylinder."""
    length, width, h = 100.0, 400.0, 4.0
    sides = [
        Support("first", "arm.start", {"z": 0.0, "x": 0.0, "y": 0.0}, "average"),
        Support("left", "arm.left", {"y": 0.0}),
        Support("right", "arm.right", {"y": 0.0}),
    ]
    part = box_part(length, width, h, [WALL, *sides[1:]], [PUSH])
    result = buckling(part, box_mesh(length, width, h, (10, 8, 1)), Buckling("all", modes=1))
    cylinder = np.pi**2 / 4 * E / (1 - NU**2) * width * h**3 / 12 / length**2
    assert result.modes[0].value == pytest.approx(cylinder, rel=2e-2)


def test_a_missed_factor_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    def without_the_second(pencil: Pencil, start: Array, tolerance: Array, *rest: Any, **more: Any) -> Pairs:
        found = extreme_pairs(pencil, start, np.r_[tolerance[:1], tolerance], *rest, **more)
        kept = np.delete(np.arange(found.mu.size), 1)
        return Pairs(found.mu[kept], found.x[:, kept], found.residual[kept], found.rounds)

    monkeypatch.setattr(module, "extreme_pairs", without_the_second)
    with pytest.raises(SolveError, match="are missing: 3 between 0 and"):
        buckling(*slender([MEAN_WALL], [PUSH]), Buckling("all", modes=2))


def test_factors_that_do_not_converge_are_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "extreme_pairs", partial(extreme_pairs, rounds=1))
    with pytest.raises(SolveError, match="do not converge"):
        buckling(*slender([MEAN_WALL], [PUSH]), Buckling("all"))
