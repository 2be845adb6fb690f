"""Modes of both models: what is predicted is explained, a slip in one of them is flagged."""

from __future__ import annotations

import dataclasses
import functools
import math
from collections.abc import Callable

import pytest
from bar import LENGTH, bar, cut_solid
from bar import mesh as bar_mesh
from solid_help import box_mesh, box_part

from fem.beam import BeamResult, solve_beam
from fem.solid import SolidResult, solve_solid
from geometry.budget import Budget
from geometry.part import Buckling, Case, Part, RegionLoad, RemotePoint, Support, Vibration
from mesher.named_mesh import NamedMesh
from studies.check.result import Pair
from studies.judge import Judgement, judge

WALL = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
PUSH = RegionLoad("push", "arm.end", force=(-1000.0, 0.0, 0.0))
CARRIED = RemotePoint("lamp", "arm.end", (LENGTH, 0.0, 0.0), "average", mass=3e-4)
BLADE = (400.0, 5.0, 40.0)


def standing(**more: object) -> Part:
    """The bar under a push along it, with a mass at its end."""
    given = {"loads": (PUSH, CARRIED), "cases": (Case("pressed", {"push": 1.0}),), **more}
    return dataclasses.replace(bar(**given), vibration=Vibration(3), buckling=(Buckling("pressed", modes=2),))


def blade() -> Part:
    """Loaded at its end on edge: it buckles sideways, and the clamp holds its warping."""
    down = RegionLoad("down", "arm.end", (0.0, 0.0, -100.0))
    return dataclasses.replace(box_part(*BLADE, [WALL], [down]), buckling=(Buckling("all", modes=1),))


@functools.cache
def solids() -> dict[str, tuple[Part, NamedMesh, SolidResult]]:
    flat = box_mesh(*BLADE, (80, 1, 8))
    return {name: (part, m, solve_solid(part, m, Budget(threads=1)))
            for name, part, m in (("bar", standing(), bar_mesh()), ("blade", blade(), flat))}


def judged(which: str, beam: BeamResult | None = None) -> Judgement:
    part, m, solid = solids()[which]
    size = (10.0, 20.0) if which == "bar" else BLADE[1:]
    return judge(part, cut_solid(*size), m, solid, beam or solve_beam(part))


def modes(judgement: Judgement) -> list[Pair]:
    return [p for p in judgement.pairs if p.key.quantity in ("natural_frequency", "buckling_factor")]


def flagged(judgement: Judgement) -> list[str]:
    return [f"{p.key.quantity} {p.key.component}" for p in modes(judgement) if p.judgement == "suspicious"]


def test_sound_modes_are_not_cried_down() -> None:
    found = modes(judged("bar"))
    assert [p.judgement for p in found] == ["agrees"] * len(found) and len(found) >= 5


def test_warping_at_the_clamp_explains_a_blade() -> None:
    found = modes(judged("blade"))
    assert {p.judgement for p in found} == {"explained"}
    for pair in found:
        assert pair.difference is not None and len(pair.causes) == 1
        assert pair.causes[0].predicted * pair.difference > 0.0
        assert any("left open by: a clamped" in r.text for r in pair.reasons)
        assert not any(r.text == "warping held at the ends" for r in pair.reasons)  # it is predicted, not allowed twice


@pytest.mark.parametrize("factor", [-1.0, 3.0])
def test_a_cause_of_the_wrong_sign_or_size_explains_nothing(factor: float) -> None:
    beam = solve_beam(solids()["blade"][0])
    wrong = tuple(dataclasses.replace(c, difference=factor * c.difference) if c.quantity == "buckling_factor" else c
                  for c in beam.causes)
    assert flagged(judged("blade", dataclasses.replace(beam, causes=wrong)))
    assert flagged(judged("blade", dataclasses.replace(beam, causes=())))


def _material(part: Part, **changed: float) -> Part:
    return dataclasses.replace(part, material=dataclasses.replace(part.material, **changed))


BEAMS: dict[str, Callable[[Part], Part]] = {
    "modulus 10 % off": lambda p: _material(p, E=1.1 * 210000.0),
    "density 10 % off": lambda p: _material(p, density=1.1 * 7.85e-9),
    "carried mass dropped": lambda p: dataclasses.replace(p, loads=(PUSH, dataclasses.replace(CARRIED, mass=0.0))),
    "load reversed": lambda p: dataclasses.replace(
        p, loads=(dataclasses.replace(PUSH, force=(1000.0, 0.0, 0.0)), CARRIED)),
    "held at the other end too": lambda p: dataclasses.replace(
        p, supports=(WALL, Support("far", "arm.end", {"y": 0.0}, coupling="average"))),
}


@pytest.mark.parametrize("fault", BEAMS)
def test_a_fault_in_the_beam_alone_is_flagged(fault: str) -> None:
    assert flagged(judged("bar", solve_beam(BEAMS[fault](standing())))), f"{fault} passed unseen"


@pytest.mark.parametrize("factor", [0.9, 1.1])
def test_what_is_predicted_hides_no_fault(factor: float) -> None:
    beam = solve_beam(_material(blade(), E=factor * 210000.0))
    assert flagged(judged("blade", beam))


def test_a_mode_that_one_model_misses_is_flagged() -> None:
    beam = solve_beam(standing())
    lost = dataclasses.replace(beam, vibration=(beam.vibration[0], *beam.vibration[2:]))
    assert flagged(judged("bar", lost)) == ["natural_frequency mode 2"]
    part, m, solid = solids()["bar"]
    lost_solid = dataclasses.replace(solid, vibration=(solid.vibration[0], *solid.vibration[2:]))
    assert flagged(judge(part, cut_solid(), m, lost_solid, beam)) == ["natural_frequency beam mode 2"]


def test_a_factor_beyond_all_strain_may_be_missing() -> None:
    """One model leaves it out as nonsense; at a factor that means something, a shape needs a partner."""
    part, m, solid = solids()["bar"]
    beam = solve_beam(part)
    energy = next(f.value for f in solid.figures if f.key.quantity == "strain_energy")
    whole = 1.0 / math.sqrt(2.0 * energy / (part.material.E * m.volume))  # the factor of a strain of one
    assert whole > 100.0 * solid.buckling[-1].value

    def lone(factor: float) -> list[str]:
        first = dataclasses.replace(beam.buckling[0], value=factor)
        some = dataclasses.replace(solid, buckling=(dataclasses.replace(solid.buckling[1], value=2.0 * whole),))
        return flagged(judge(part, cut_solid(), m, some, dataclasses.replace(beam, buckling=(first,))))

    assert lone(0.1 * whole) and not lone(whole)
    none = dataclasses.replace(solid, buckling=())
    nonsense = dataclasses.replace(beam, buckling=(dataclasses.replace(beam.buckling[0], value=whole),))
    assert not flagged(judge(part, cut_solid(), m, none, nonsense))
    assert flagged(judge(part, cut_solid(), m, none, beam))
