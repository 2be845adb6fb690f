"""Predicted honest differences."""

from __future__ import annotations

import pytest

from geometry.part import Cut, Patch, RegionLoad, Section, Support

FLAT = Section("rectangle", {"depth": 60.0, "width": 8.0})


def predicted(r, quantity, component, place="arm.end"):
    return [c for c in r.result.causes if (c.place, c.quantity, c.component) == (place, quantity, component)]


def test_clamped_warping_of_a_solid_bar(part, solve):
    """C1: L 6, 0.2 x 0.1, E 1e7, nu 0.3, unit torque: Saint-Venant gives 0.034109, the clamped solid 0.0339."""
    from geometry.part import Material

    steel = Material("m", 1e7, 0.3, 1e-9, 0.0, None, None, "declared", "")
    r = solve(part(Section("rectangle", {"depth": 0.2, "width": 0.1}), 6.0,
                   [RegionLoad("t", "arm.end", moment=(1.0, 0.0, 0.0))], material=steel))
    assert r("arm.end", "rotation", "x") == pytest.approx(0.034109, rel=1e-4)
    (cause,) = predicted(r, "rotation", "x")
    assert r("arm.end", "rotation", "x") + cause.difference == pytest.approx(0.0339, abs=5e-5)
    assert "warping" in cause.text


def test_hole_in_a_pulled_bar(part, solve):
    """The net section adds int (1/A_net - 1/A) dx; the cause adds once more that, and leaves as much open."""
    pull = RegionLoad("p", "arm.end", force=(9600.0, 0.0, 0.0))
    cut = Cut("h", "h", "hole", "y", "all", 300.0, 0.0, 24.0, 24.0)
    r = solve(part(FLAT, 600.0, [pull], cuts=(cut,)), plain=True)
    gross = 9600 * 600 / (210000 * 480)
    added = r("arm.end", "displacement", "x") - gross
    (cause,) = predicted(r, "displacement", "x")
    assert added > 0
    assert cause.difference == pytest.approx(added, rel=1e-6)
    assert cause.band == pytest.approx(added, rel=1e-6)


def test_rigid_pad(part, solve):
    """Half the way from a rigid stretch to one that may bend, and as much left open."""
    pad = Patch("pad", "top", 800.0, 1200.0)
    tip = RegionLoad("tip", "arm.end", force=(0.0, 0.0, -1000.0))
    held = dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0)
    r = solve(part(loads=[tip], supports=[Support("s", "arm.pad", held, "rigid")], patches=(pad,)), plain=True)
    causes = [c for c in predicted(r, "displacement", "z") if "one body" in c.text]
    assert len(causes) == 1 and causes[0].difference < 0 and causes[0].band == pytest.approx(-causes[0].difference)


def test_a_plain_cantilever_has_none(part, solve):
    """Nothing but bending: nothing is predicted."""
    r = solve(part(loads=[RegionLoad("tip", "arm.end", force=(0.0, 0.0, -1000.0))]))
    assert not r.result.causes


def test_clamped_warping_and_modes(part, solve):
    """A blade clamped at one end: twist is stiffer there, so that its torsion and its lateral buckling come later.

    The clamp holds the twist's warping over about sqrt(E Iw/(G J)) = d (Vlasov: the bar is that much shorter in
    torsion): f goes with 1/(L - d), Iw = b^3 t^3/144 of a thin rectangle. The modes in bending stay as they are.
    """
    from dataclasses import replace

    from geometry.part import Buckling, Vibration

    blade = Section("rectangle", {"depth": 40.0, "width": 5.0})
    tip = RegionLoad("f", "arm.end", force=(0.0, 0.0, -100.0))
    one = replace(part(blade, 400.0, [tip]), vibration=Vibration(5), buckling=(Buckling("c", (), 2),))
    r = solve(one).result
    frequency = {c.component: c for c in r.causes if c.quantity == "natural_frequency"}
    number = next(k for k, m in enumerate(r.vibration, 1) if m.kind == "torsion")
    assert set(frequency) == {f"mode {number}"}
    J = 40.0 * 5.0**3 / 3 * (1 - 0.63 * 5 / 40)
    d = (2.6 * 40.0**3 * 5.0**3 / 144 / J) ** 0.5
    cause = frequency[f"mode {number}"]
    assert cause.difference / r.vibration[number - 1].value == pytest.approx(d / (400.0 - d), rel=0.1)
    factor = [c for c in r.causes if c.quantity == "buckling_factor"]
    assert [c.case for c in factor] == ["c", "c"]
    assert all(c.difference * m.value > 0.0 for c, m in zip(factor, r.buckling, strict=True))
