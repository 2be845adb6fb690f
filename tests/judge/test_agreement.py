"""The rules of the join: words, scales, what is not compared."""

from __future__ import annotations

import dataclasses

import pytest
from bar import LENGTH, TIP, WALL, bar, mesh, sound

from fem.figure import Figure, FigureKey
from geometry.part import Case, Cut, Support, TemperatureLoad
from studies.check.result import Cause
from studies.judge.agreement import pair_figures, table
from studies.judge.context import Context

KEY = FigureKey("lifting", "arm.end", "displacement", "z")


def _pair(solid: float, beam: float, cause: tuple[Cause, float] | None = None) -> str:
    ctx = Context(bar(), mesh())
    causes = {KEY: [cause]} if cause else {}
    (pair,) = pair_figures(ctx, table([Figure(KEY, solid, "mm")]), table([Figure(KEY, beam, "mm")]), {}, causes)
    return pair.judgement


def test_words() -> None:
    assert _pair(-1.0, -1.001) == "agrees"
    assert _pair(-1.0, -1.2) == "suspicious"
    assert _pair(-1.0, -1.2, (Cause("why", 0.2), 0.0)) == "explained"
    assert _pair(-1.0, -1.2, (Cause("why, with the wrong sign", -0.2), 0.0)) == "suspicious"
    assert _pair(-1.0, -1.2, (Cause("why, too small", 0.1), 0.0)) == "suspicious"


def test_a_figure_given_twice_is_an_error() -> None:
    with pytest.raises(ValueError, match="two figures"):
        table([Figure(KEY, 1.0, "mm"), Figure(KEY, 1.0, "mm")])


def test_a_figure_of_one_model_only_is_kept_and_says_so() -> None:
    ctx = Context(bar(), mesh())
    (only,) = pair_figures(ctx, {}, table([Figure(KEY, 1.0, "mm")]), {}, {})
    assert (only.judgement, only.solid, only.beam) == ("no beam value", None, 1.0)


def test_differences_are_scaled_by_the_largest_of_the_case() -> None:
    part, _, m, solid, beam = sound()
    pairs = pair_figures(Context(part, m), table(solid.figures), table(beam.figures), {}, {})
    scales = {p.scale for p in pairs if p.key.quantity == "displacement" and p.key.case == "lifting"}
    assert len(scales) == 1
    (scale,) = scales
    # tip of a cantilever, both directions: P L^3 / 3 E I (Gere & Goodno, appendix of beam deflections)
    z = 100 * LENGTH**3 / (3 * 210000 * 10 * 20**3 / 12)
    y = 10 * LENGTH**3 / (3 * 210000 * 20 * 10**3 / 12)
    assert scale == pytest.approx((z**2 + y**2) ** 0.5, rel=0.005)


def test_stress_near_the_wall_is_not_compared() -> None:
    part, _, m, solid, beam = sound()
    pairs = pair_figures(Context(part, m), table(solid.figures), table(beam.figures), {}, {})
    stress = {p.key.place: p.judgement for p in pairs if p.key.quantity == "nominal_stress"}
    assert stress["arm@0"] == "no beam value"
    assert stress["arm@200"] == "agrees"


ROLLER = Support("roller", "arm.end", {"z": 0.0}, coupling="average")
PIN = Support("pin", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0, "rx": 0.0, "rz": 0.0}, coupling="average")


@pytest.mark.parametrize(("supports", "determinate"), [
    ((WALL,), True), ((WALL, ROLLER), False), ((PIN, ROLLER), True),
    ((dataclasses.replace(PIN, held={"x": 0.0, "y": 0.0, "z": 0.0}), ROLLER), False),
])
def test_determinate_parts_are_told_from_the_others(supports: tuple[Support, ...], determinate: bool) -> None:
    assert Context(bar(supports=supports, loads=(TIP,)), mesh()).determinate is determinate


def test_energy_of_a_heated_part_gripped_at_a_face_is_not_compared() -> None:
    part = bar(loads=(TIP, TemperatureLoad("sun", 30.0)),
               cases=(Case("hot", {"tip": 1.0, "sun": 1.0}), Case("cold", {"tip": 1.0})))
    ctx = Context(part, mesh())
    energy = [Figure(FigureKey(case, "", "strain_energy", ""), 5.0, "N mm") for case in ("hot", "cold")]
    beam = [dataclasses.replace(f, value=1.0) for f in energy]
    pairs = pair_figures(ctx, table(energy), table(beam), {}, {})
    assert [p.judgement for p in pairs] == ["no beam value", "suspicious"]


def test_what_is_left_where_a_heated_part_is_free_is_not_measured_against_itself() -> None:
    """A bar on one average support takes no force from warmth; E alpha dT A would be 210000 x 3.6e-4 x 200 N."""
    wall = Support("wall", "arm.start", dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0), coupling="average")
    part = bar(supports=(wall,), loads=(TIP, TemperatureLoad("sun", 30.0)),
               cases=(Case("hot", {"sun": 1.0}), Case("cold", {"tip": 1.0})))
    ctx = Context(part, mesh())
    kinds = [("section_force", "N", "N"), ("section_moment", "My", "N mm"), ("nominal_stress", "xx@top", "MPa"),
             ("strain_energy", "", "N mm")]
    at = {"strain_energy": ""}

    def judged(case: str, size: float) -> set[str]:
        solid = [Figure(FigureKey(case, at.get(q, "arm@200"), q, c), size, unit) for q, c, unit in kinds]
        beam = [dataclasses.replace(figure, value=0.0) for figure in solid]
        return {p.judgement for p in pair_figures(ctx, table(solid), table(beam), {}, {})}

    assert "suspicious" not in judged("hot", 1e-6)
    assert "suspicious" in judged("hot", 100.0)
    assert "suspicious" in judged("cold", 1e-6)


def test_a_heated_face_that_is_gripped_bulges_the_part() -> None:
    """Measured on a bar 20 by 12: 0.11 of the free strain times the larger side; ten times that is no bulge."""
    part = bar(loads=(TIP, TemperatureLoad("sun", 30.0)),
               cases=(Case("hot", {"sun": 1.0}), Case("cold", {"tip": 1.0})))
    ctx, bulge = Context(part, mesh()), 0.11 * part.material.expansion * 30.0 * 20.0

    def judged(case: str, size: float) -> str:
        key = FigureKey(case, "arm@20", "displacement", "x")
        (pair,) = pair_figures(ctx, table([Figure(key, size, "mm")]), table([Figure(key, 0.0, "mm")]), {}, {})
        return pair.judgement

    assert [judged("hot", bulge), judged("hot", 10.0 * bulge), judged("cold", bulge)] == \
        ["agrees", "suspicious", "suspicious"]


def test_a_notch_at_the_neutral_axis_is_measured_against_the_outer_fibre_beside_it() -> None:
    part = bar()
    hole = Cut("hole1", "hole", "hole", "z", "all", 203.0, 0.0, 4.0, 4.0)
    part = dataclasses.replace(part, members=(dataclasses.replace(part.members[0], cuts=(hole,)),))
    key = FigureKey("lifting", "arm.hole1", "notch_stress", "xx@upper")
    beam = [Figure(key, 0.0, "MPa")]
    beam += [Figure(FigureKey("lifting", place, "nominal_stress", "xx@top"), size, "MPa")
             for place, size in (("arm@200", 60.0), ("arm@20", 6000.0))]

    def judged(size: float) -> str:
        solid = [Figure(key, size, "MPa")]
        return pair_figures(Context(part, mesh()), table(solid), table(beam), {}, {})[0].judgement

    assert (judged(-0.75), judged(-15.0)) == ("agrees", "suspicious")
