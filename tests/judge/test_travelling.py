"""Travelling loads: positions are judged as cases, and their extremes picked from either model's own figures."""

from __future__ import annotations

import dataclasses
import functools
import time

import pytest
from bar import DEPTH, LENGTH, bar, cut_solid, mesh

from fem.beam import BeamResult, solve_beam
from fem.figure import Figure, FigureKey
from fem.solid import SolidResult, solve_solid
from geometry.budget import Budget
from geometry.part import Case, Limit, Part, StripLoad, Support, Travel
from studies.check.record import declared_factors, kept_cases
from studies.check.result import Pair
from studies.judge import Judgement, judge
from studies.judge.agreement import pair_figures, table
from studies.judge.context import Context
from studies.judge.travelling import envelopes, kept

POSITIONS = (40.0, 120.0, 200.0, 280.0, 360.0)
FORCE, STRIP = -100.0, 20.0
FAR = Support("far", "arm.end", {"y": 0.0, "z": 0.0}, coupling="average")
PIN = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0, "rx": 0.0}, coupling="average")


def crossing(**more: object) -> Part:
    """The bar on two pins, an axle crossing it."""
    strips = tuple(StripLoad(f"axle@{x:g}", "arm.top", (x,), STRIP, (0.0, 0.0, FORCE)) for x in POSITIONS)
    cases = tuple(Case(f"crossing@{x:g}", {f"axle@{x:g}": 2.0}, Travel("crossing", "axle", x)) for x in POSITIONS)
    return bar(supports=(PIN, FAR), loads=strips, cases=(*cases, Case("parked", {"axle@200": 1.0})), **more)


@functools.cache
def solved() -> tuple[Part, SolidResult, BeamResult]:
    part = crossing()
    return part, solve_solid(part, mesh(), Budget(threads=1)), solve_beam(part)


def judged(**more: object) -> Judgement:
    part, solid, beam = solved()
    return judge(dataclasses.replace(part, **more), cut_solid(), mesh(), solid, beam)  # type: ignore[arg-type]


def test_the_envelope_of_the_bending_moment_is_that_of_a_simple_beam() -> None:
    """Greatest moment at a station x: the axle over it, M = F x (L - x) / L less what the strip spreads."""
    rows = {(r.key.place, r.key.component): r for r in judged().envelopes if r.key.quantity == "section_moment"}
    for place, x in (("arm@200", 200.0), ("arm@120", 120.0)):
        row = rows[place, "My"]
        exact = 2.0 * FORCE * (x * (LENGTH - x) / LENGTH - STRIP / 8.0)
        for peak in (row.solid_least, row.beam_least):
            assert peak is not None
            assert (peak.value, peak.at) == (pytest.approx(exact, rel=2e-3), x)
        assert row.key.case == "crossing"
        assert row.solid_least is not None and row.solid_least.other == pytest.approx(exact, rel=2e-3)


def test_reactions_swap_ends_and_nothing_is_suspicious() -> None:
    found = judged()
    rows = {r.key.place: r for r in found.envelopes
            if r.key.quantity == "reaction_force" and r.key.component == "z"}
    for support, near, far in (("wall", 40.0, 360.0), ("far", 360.0, 40.0)):
        row = rows[support]
        assert row.solid_greatest is not None and row.solid_least is not None
        assert (row.solid_greatest.at, row.solid_least.at) == (near, far)
        assert row.solid_greatest.value == pytest.approx(-2.0 * FORCE * 0.9, rel=1e-3)
        assert row.words == {"load check": 5}
    assert not [p for p in found.pairs if p.judgement == "suspicious"]
    assert not [r for r in found.envelopes if r.judgement == "suspicious"]


def test_a_result_holds_of_single_positions_only_what_is_worth_it() -> None:
    found = judged()
    single = [p for p in found.pairs if "@" in p.key.case]
    assert all(p.judgement in ("suspicious", "explained") for p in single)
    assert len(single) <= 9 and len([p for p in found.pairs if p.key.case == "parked"]) > 300
    (travel,) = found.travels
    assert (travel.positions, travel.axles, travel.contact, travel.load) == (POSITIONS, (0.0,), STRIP, "axle")
    assert travel.governing in (120.0, 200.0, 280.0)
    assert kept_cases(solved()[0], found.travels) == {"parked", f"crossing@{travel.governing:g}"}
    assert declared_factors(solved()[0].cases[0]) == ("crossing", {"axle": 2.0})


def test_a_fault_at_one_position_alone_is_found_there() -> None:
    part, solid, _ = solved()
    strips = tuple(dataclasses.replace(s, centres=(s.centres[0] + 12.0,)) if s.name == "axle@280" else s
                   for s in part.loads)  # type: ignore[union-attr]
    found = judge(part, cut_solid(), mesh(), solid, solve_beam(dataclasses.replace(part, loads=strips)))
    bad = [r for r in found.envelopes if r.judgement == "suspicious"]
    assert bad and {r.worst_at for r in bad} == {280.0}
    assert {p.key.case for p in found.pairs if p.judgement == "suspicious"} == {"crossing@280"}
    moment = next(r for r in bad if r.key.quantity == "section_moment" and r.key.component == "My")
    assert moment.words["suspicious"] == 1 and sum(moment.words.values()) == 5


def test_limits_go_over_all_positions() -> None:
    names = tuple(f"crossing@{x:g}" for x in POSITIONS)
    limits = (Limit("sag", "deflection", 0.2, cases=names), Limit("sag_parked", "deflection", 0.3, cases=("parked",)),
              Limit("strength", "yield_factor", 1.5))
    sag, parked, strength = judged(limits=limits).limits
    # F L^3 / (48 E I), Gere & Goodno; the shear of a bar of 20 to 1 adds 0.7 %
    exact = 2.0 * -FORCE * LENGTH**3 / (48.0 * 210000.0 * 10.0 * DEPTH**3 / 12.0)
    assert (sag.verdict, sag.case) == ("met", "crossing@200")
    assert sag.found == pytest.approx(exact, rel=0.01)
    assert parked.found == pytest.approx(0.5 * exact, rel=0.01)
    assert strength.verdict == "met"  # also where an axle stands too near a support to extrapolate


def test_an_axle_disturbs_only_what_is_near_it_and_only_in_its_case() -> None:
    ctx = Context(solved()[0], mesh())
    assert ctx.disturbed_by(200.0, "crossing@200") == ("load axle@200",)
    assert ctx.disturbed_by(200.0, "crossing@280") == ()
    assert ctx.disturbed_by(280.0 - STRIP / 2 - DEPTH + 0.1, "crossing@280") == ("load axle@280",)
    assert ctx.disturbed_by(280.0 - STRIP / 2 - DEPTH - 0.1, "crossing@280") == ()


def test_checks_of_the_solid_are_told_once_with_the_worst_position() -> None:
    found = judged()
    names = [c.name for c in found.checks]
    assert len(names) == len(set(names)) and not any("@" in name for name in names)
    of_crossing = [c for c in found.checks if c.name.startswith("case crossing")]
    assert of_crossing and all(c.text.startswith("worst of the positions, ") for c in of_crossing)


def test_extremes_of_made_up_pairs() -> None:
    part = crossing()
    key = FigureKey("crossing@40", "arm.end", "displacement", "z")

    def pair(case: str, solid: float, beam: float | None, word: str, band: float = 1.0) -> Pair:
        difference = solid - beam if beam is not None else None
        return Pair(key._replace(case=case), solid, beam, "mm", difference, 9.0, band, (), word)  # type: ignore[arg-type]

    pairs = [pair("crossing@40", 1.0, 1.1, "agrees"), pair("crossing@120", -3.0, -2.0, "explained"),
             pair("crossing@200", 5.0, 4.5, "explained", band=0.2), pair("crossing@280", 5.0, 4.9, "agrees"),
             pair("parked", 7.0, 7.0, "agrees")]
    (row,) = envelopes(part, pairs)
    assert row.solid_greatest is not None and row.solid_least is not None and row.beam_greatest is not None
    assert (row.solid_greatest.value, row.solid_greatest.at, row.solid_greatest.other) == (5.0, 200.0, 4.5)
    assert (row.solid_least.value, row.solid_least.at) == (-3.0, 120.0)
    assert (row.beam_greatest.value, row.beam_greatest.at, row.beam_greatest.other) == (4.9, 280.0, 5.0)
    assert (row.judgement, row.worst_at, row.words) == ("explained", 200.0, {"agrees": 2, "explained": 2})
    assert kept(part, pairs) == (pairs[2], pairs[4])  # 0.5 of 0.2 uses more than 1 of 1


def test_fifty_positions_are_judged_in_seconds() -> None:
    part, solid, beam = solved()
    names = [f"crossing@{x}" for x in range(60)]
    cases = tuple(Case(n, {"axle@200": 1.0}, Travel("crossing", "axle", float(x))) for x, n in enumerate(names))

    def copies(figures: tuple[Figure, ...]) -> tuple[Figure, ...]:
        one = [f for f in figures if f.key.case == "parked"]
        return tuple(dataclasses.replace(f, key=f.key._replace(case=n)) for n in names for f in one)

    many = dataclasses.replace(part, cases=cases)
    solid = dataclasses.replace(solid, figures=copies(solid.figures), peaks=(), case_stress=(), denting=())
    beam = dataclasses.replace(beam, figures=copies(beam.figures), causes=())
    began = time.process_time()
    found = judge(many, cut_solid(), mesh(), solid, beam)
    assert len(found.envelopes) > 300
    assert time.process_time() - began < 5.0


def test_the_energy_of_a_position_is_measured_against_that_of_the_worst_one() -> None:
    """Beside a support only what is local to the strip is left, which beam theory does not have."""
    part = crossing()
    sizes = {case.name: 0.01 if number == 0 else 1.0 for number, case in enumerate(part.cases)}
    solid = [Figure(FigureKey(name, "", "strain_energy", ""), size, "N mm") for name, size in sizes.items()]
    beam = [dataclasses.replace(figure, value=0.6 * figure.value if number == 0 else figure.value)
            for number, figure in enumerate(solid)]
    first = pair_figures(Context(part, mesh()), table(solid), table(beam), {}, {})[0]
    assert first.judgement == "agrees"
    off = [dataclasses.replace(figure, value=0.6) if figure.key.case == part.cases[1].name else figure
           for figure in beam]
    second = pair_figures(Context(part, mesh()), table(solid), table(off), {}, {})[1]
    assert second.judgement == "suspicious"
