"""A load that travels along a face: influence lines, and what strips do at ends, on tapers and beside cuts."""

from __future__ import annotations

import time
from dataclasses import replace

import numpy as np
import pytest

from geometry.part import Case, Cut, LineLoad, Place, RegionLoad, Section, Station, StripLoad, Support
from geometry.problem import RunError

L, P, S = 2000.0, 1000.0, 10.0
PIN = Support("a", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0, "rx": 0.0}, "average")
ROLLER = Support("b", "arm.end", {"y": 0.0, "z": 0.0}, "average")
CHANNEL = Section("channel", {"depth": 102.0, "width": 51.0, "web": 2.0, "flange": 2.0})


def crossing(part, positions, axles=(0.0,), on="arm.top", force=(0.0, 0.0, -P), length=S, supports=(PIN, ROLLER),
             section=None, **more):
    loads = [StripLoad(f"t@{x:g}", on, tuple(x + a for a in axles), length, force) for x in positions]
    cases = [Case(f"c@{x:g}", {f"t@{x:g}": 1.0}) for x in positions]
    return part(section, L, loads, supports, cases, **more)


def moment(r, at, case):
    return -r(f"arm@{at:g}", "section_moment", "My", case)


def test_influence_line_of_the_middle(part, solve):
    """M(L/2) of a force at a: P a/2 (a < L/2); over the station itself the strip's own length takes P s/8 off P L/4."""
    where = [100.0, 350.0, 700.0, 990.0, 1010.0, 1500.0, 1933.0]
    r = solve(crossing(part, [*where, L / 2]), plain=True)
    for a in where:
        assert moment(r, L / 2, f"c@{a:g}") == pytest.approx(P * min(a, L - a) / 2, rel=1e-9)
    assert moment(r, L / 2, "c@1000") == pytest.approx(P * L / 4 - P * S / 8, rel=1e-9)


def test_moment_under_the_load(part, solve):
    """P a b/L less P s/8, at each of nineteen stations."""
    where = [100.0 * k for k in range(1, 20)]
    r = solve(crossing(part, where), plain=True)
    got = [moment(r, a, f"c@{a:g}") for a in where]
    assert got == pytest.approx([P * a * (L - a) / L - P * S / 8 for a in where], rel=1e-9)


def test_two_axles(part, solve):
    """Two equal forces d apart: the greatest moment anywhere is P (L - d/2)^2/(2 L), under the axle d/4 from the middle
    (common handbook result); the other positions give less."""
    d = 400.0
    first = [L / 2 - d / 4 + e for e in (-20.0, 0.0, 20.0)]  # the first axle is the one that stands beside the middle
    places = [Place(f"p{k}", "arm", a) for k, a in enumerate(first)]
    r = solve(crossing(part, first, (0.0, d), places=places), plain=True)
    under = []
    for a in first:
        diagram = r.result.diagrams[f"c@{a:g}"]
        under.append(-diagram.My[np.argmin(np.abs(diagram.x - a))])
    assert under[1] > max(under[0], under[2])
    assert under[1] + P * S / 8 == pytest.approx(P / (2 * L) * (L - d / 2) ** 2, rel=1e-9)  # the strip's own length


def test_a_strip_is_a_line_load(part, solve):
    """The same stretch as a line load: every figure equal, on a tapered channel and a turned member."""
    force = (50.0, 30.0, -100.0)
    shape = {"section": CHANNEL, "stations": (Station(L, {"depth": 60.0}),), "anchor": "bottom",
             "roll": 0.3, "supports": None}
    strip = crossing(part, [780.0], force=force, length=60.0, **shape)
    q = tuple(f / 60.0 for f in force)
    line = replace(strip, loads=(LineLoad("t@780", "arm.top", 750.0, 810.0, q, q),))
    a, b = solve(strip, plain=True), solve(line, plain=True)
    assert set(a.values) == set(b.values)
    for key, value in a.values.items():
        assert value == pytest.approx(b.values[key], rel=1e-9, abs=1e-9)
    assert abs(a("arm.end", "rotation", "x", "c@780")) > 1e-4  # the middle of the flange is off the shear centre


def test_torque_of_a_strip_off_the_shear_centre(part, solve):
    """The torque at the root is the force times the distance from the line (the centroid) to the middle of the flange's
    width."""
    r = solve(crossing(part, [700.0], section=CHANNEL, supports=None), plain=True)
    left = -r("arm@0", "section_moment", "T", "c@700") / P
    from fem.beam.outlines import line_offset

    y0, _ = line_offset(part(CHANNEL, L).members[0])
    assert left == pytest.approx(51.0 / 2 - y0, rel=1e-9)
    assert left > 5.0


@pytest.mark.parametrize(("axles", "where"), [((0.0,), 0.0), ((0.0,), L), ((-1990.0, 4.0), L - 2.0)])
def test_a_strip_that_passes_an_end_keeps_its_force(part, solve, axles, where):
    """The reactions carry the whole force, from the middle of what is left."""
    r = solve(crossing(part, [where], axles), plain=True)
    name = f"c@{where:g}"
    total = sum(r(s, "reaction_force", "z", name) for s in "ab")
    assert total == pytest.approx(P * len(axles), rel=1e-9)
    middles = [0.5 * (max(where + a - S / 2, 0.0) + min(where + a + S / 2, L)) for a in axles]
    assert r("b", "reaction_force", "z", name) == pytest.approx(P * sum(middles) / L, rel=1e-9)


def test_nothing_left_under_a_strip(part, solve):
    """Beyond the end, on a hole that takes the whole width, and on something that is no face."""
    with pytest.raises(RunError, match="left under the strip"):
        solve(crossing(part, [L + S]), plain=True)
    with pytest.raises(RunError, match="no face"):
        solve(crossing(part, [500.0], on="arm.end"), plain=True)
    cut = Cut("o", "o", "notch", "y", "all", 500.0, 0.0, 60.0, 20.0, edge="top")
    r = solve(crossing(part, [530.0], length=20.0, cuts=(cut,)), plain=True)  # half of it over the notch
    assert r("b", "reaction_force", "z", "c@530") == pytest.approx(P * 535.0 / L, rel=1e-6)


def test_no_notch_factor_beside_a_strip(part, solve):
    """A small hole in a flat bar: its factor is not given in the cases in which the load stands near it."""
    hole = Cut("h", "h", "hole", "y", "all", 800.0, 0.0, 12.0, 12.0)
    r = solve(crossing(part, [700.0, 790.0, 840.0, 1200.0], cuts=(hole,)), plain=True)
    given = {key[0] for key in r.values if key[1:3] == ("arm.h", "notch_stress")}
    assert given == {"c@700", "c@1200"}
    assert any("2 of the cases" in note for note in r.result.notes)


def test_many_positions_cost_little(part, solve):
    """Fifty positions of two axles against fifty plain cases: a few milliseconds a position."""
    spread = [100.0 + 30.0 * k for k in range(50)]
    moving = crossing(part, spread, (0.0, 137.0))
    tip = RegionLoad("tip", "arm.end", force=(0.0, 0.0, -P))
    still = replace(moving, loads=(tip,), cases=tuple(Case(f"c{k}", {"tip": 1.0 + k}) for k in range(50)))
    seconds = {}
    for name, one in (("moving", moving), ("still", still), ("moving", moving), ("still", still)):
        clock = time.process_time()
        solve(one, plain=True)
        seconds[name] = time.process_time() - clock
    assert seconds["moving"] < 4.0 * seconds["still"]


def test_positions_are_ordinary_cases(part, solve):
    """The figures of a position do not depend on which other positions there are."""
    alone = solve(crossing(part, [700.0], (0.0, 90.0)), plain=True)
    many = solve(crossing(part, [*np.arange(100.0, 1800.0, 60.0)], (0.0, 90.0)), plain=True)
    for key, value in alone.values.items():
        if key[0] and key[2] != "strain_energy":  # the energy's quadrature goes with the nodes
            assert many.values[key] == pytest.approx(value, rel=1e-8, abs=1e-9)
