"""A slip behind the spec, in one model only, is flagged; a sound bar is not."""

from __future__ import annotations

import dataclasses

import pytest
from bar import CASES, TIP, WALL, WEIGHT, bar, cut_solid, mesh, sound

from fem.beam import solve_beam
from geometry.part import Case, Part, RegionLoad, Section, Support
from studies.judge import judge


def test_a_sound_bar_is_not_cried_down() -> None:
    judged = judge(*sound())
    assert not [p for p in judged.pairs if p.judgement == "suspicious"]
    assert all(c.ok for c in judged.checks), [c for c in judged.checks if not c.ok]
    compared = [p for p in judged.pairs if p.judgement in ("agrees", "explained", "load check")]
    assert len(compared) > 200  # the join did not silently come out empty


def test_a_slender_compact_bar_agrees_within_one_per_cent() -> None:
    judged = judge(*sound())
    tip = [p for p in judged.pairs if p.key.place == "arm.end" and p.key.quantity == "displacement"]
    assert len(tip) == 6
    for pair in tip:
        assert pair.difference is not None
        assert abs(pair.difference) < 0.01 * pair.scale
        assert pair.band < 0.015 * pair.scale  # nor is the band so wide that it could not see 2 %


def _material(part: Part, **changed: float) -> Part:
    return dataclasses.replace(part, material=dataclasses.replace(part.material, **changed))


def _section(part: Part, **dims: float) -> Part:
    member = dataclasses.replace(part.members[0], section=Section("rectangle", dims))
    return dataclasses.replace(part, members=(member,))


def _load(part: Part, load: RegionLoad) -> Part:
    return dataclasses.replace(part, loads=(load, WEIGHT))


FAULTS = {
    "modulus ten times": lambda p: _material(p, E=2.1e6),
    "modulus 5 % off": lambda p: _material(p, E=1.05 * 210000),
    "section turned by 90 degrees": lambda p: _section(p, depth=10.0, width=20.0),
    "depth 3 % off": lambda p: _section(p, depth=20.6, width=10.0),
    "load doubled": lambda p: _load(p, RegionLoad("tip", "arm.end", force=(0.0, 20.0, -200.0))),
    "load reversed": lambda p: _load(p, RegionLoad("tip", "arm.end", force=(0.0, -10.0, 100.0))),
    "load along the other axis": lambda p: _load(p, RegionLoad("tip", "arm.end", force=(0.0, -100.0, 10.0))),
    "load dropped": lambda p: dataclasses.replace(p, cases=(Case("lifting", {}), CASES[1])),
    "a moment that was not declared": lambda p: _load(
        p, RegionLoad("tip", "arm.end", force=TIP.force, moment=(0.0, 0.0, 2000.0))),
    "weight times g": lambda p: dataclasses.replace(
        p, cases=(CASES[0], Case("lifting_with_weight", {"tip": 1.0, "self_weight": 9.81}))),
    "density of the wrong unit": lambda p: _material(p, density=7.85e-6),
    "fixed at the other end too": lambda p: dataclasses.replace(
        p, supports=(WALL, Support("far", "arm.end", {"z": 0.0}, coupling="average"))),
}


@pytest.mark.parametrize("fault", FAULTS)
def test_a_fault_in_the_beam_alone_is_flagged(fault: str) -> None:
    part, named, m, solid, _ = sound()
    beam = solve_beam(FAULTS[fault](bar()))
    judged = judge(part, named, m, solid, beam)
    flagged = [p for p in judged.pairs if p.judgement == "suspicious"]
    assert flagged, f"{fault} passed unseen"
    assert all(p.look_at for p in flagged)


def test_slices_that_differ_from_the_beam_are_flagged() -> None:
    part, _, m, solid, beam = sound()
    judged = judge(part, cut_solid(width=10.05), m, solid, beam)
    bad = [c.name for c in judged.checks if not c.ok and "slices" in c.name]
    assert len(bad) == 3  # area and both second moments
    assert mesh().volume == pytest.approx(part.members[0].section.dims["depth"] * 10.0 * 400.0)


def test_a_spurious_twist_in_one_model_does_not_widen_its_own_band() -> None:
    part, named, m, solid, beam = sound()
    twisted = dataclasses.replace(beam, figures=tuple(
        dataclasses.replace(f, value=1.0) if f.key.quantity == "rotation" and f.key.component == "x" else f
        for f in beam.figures))
    bands = [{p.key: p.band for p in judge(part, named, m, solid, b).pairs if p.key.quantity == "displacement"}
             for b in (beam, twisted)]
    assert bands[0] == pytest.approx(bands[1])
