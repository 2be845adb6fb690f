"""Limits: met, missed, not established."""

from __future__ import annotations

import dataclasses

import pytest
from bar import bar, sound

from fem.beam import solve_beam
from geometry.part import Limit, Material
from studies.check.result import LimitVerdict
from studies.judge import judge


def _verdict(limit: Limit) -> LimitVerdict:
    part, named, m, solid, beam = sound()
    part = dataclasses.replace(part, limits=(limit,))
    (verdict,) = judge(part, named, m, solid, beam).limits
    return verdict


def test_deflection_is_met_or_missed_at_the_governing_case_and_place() -> None:
    loose, tight = _verdict(Limit("sag", "deflection", 5.0)), _verdict(Limit("sag", "deflection", 1.0))
    assert (loose.verdict, tight.verdict) == ("met", "missed")
    assert (loose.case, loose.place) == ("lifting_with_weight", "arm.end")


def test_a_component_has_its_sign_and_only_its_size_is_limited() -> None:
    verdict = _verdict(Limit("sag", "displacement", 1.0, at="arm.end", component="z"))
    assert verdict.verdict == "missed"
    assert verdict.found is not None and verdict.found < 0


def test_the_clamped_root_cannot_pass_on_a_local_basis() -> None:
    assert _verdict(Limit("strength", "yield_factor", 1.0, basis="local")).verdict == "not established"


def test_the_edge_basis_finds_the_beam_stress_at_the_clamped_root() -> None:
    verdict = _verdict(Limit("strength", "stress", 500.0, basis="edge", cases=("lifting",)))
    # corner of the root, flexure formula in both planes (Gere & Goodno): 100 * 400 / (10 * 20**2 / 6)
    # + 10 * 400 / (20 * 10**2 / 6) = 60 + 12 MPa
    assert verdict.verdict == "met"
    assert verdict.found == pytest.approx(72.0, rel=0.01)


def test_relative_displacement_reaction_and_mass() -> None:
    between = _verdict(Limit("gap", "relative_displacement", 9.0, at="arm.end", relative_to="middle"))
    assert between.found is not None and between.found > 0
    assert _verdict(Limit("pull", "reaction", 50.0, at="wall")).verdict == "missed"
    mass = _verdict(Limit("mass", "mass", 1.0))
    assert mass.found == pytest.approx(10 * 20 * 400 * 7.85e-9)


def test_a_limit_that_rests_on_a_suspicious_figure_is_not_established() -> None:
    part, named, m, solid, _ = sound()
    stiff: Material = dataclasses.replace(part.material, E=3e5)
    beam = solve_beam(dataclasses.replace(bar(), material=stiff))
    part = dataclasses.replace(part, limits=(Limit("sag", "deflection", 5.0),))
    (verdict,) = judge(part, named, m, solid, beam).limits
    assert verdict.verdict == "not established"
    assert "disagree" in verdict.reason
