"""Kept figures by name, limits with their margins, suspicions in words: on figures made up by hand."""

from __future__ import annotations

import dataclasses
import math
from types import SimpleNamespace
from typing import Any

import pytest
from work_helpers import bar

from fem.figure import Figure, FigureKey
from fem.solid.result import CaseStress, Denting
from geometry.part import Case, Travel
from geometry.spec.read import part_from_data
from studies.check.result import LimitVerdict, Pair
from studies.check.studied import ModePair
from studies.check.words import JudgementWord
from studies.judge import Judgement
from studies.vary.outcome import Held, Kept
from studies.vary.work.figures import Figures, headline, not_there, parse
from studies.vary.work.limits import held, margin
from studies.vary.work.words import MOST, suspicions

PART = dataclasses.replace(part_from_data(bar()), cases=(
    Case("a", {"tip": 1.0}), Case("b", {"tip": 1.0}), Case("over@10", {}, Travel("over", "w", 10.0))))
U: dict[tuple[str, str], tuple[float, float, float]] = {
    ("a", "bar.end"): (0.0, 3.0, -4.0), ("b", "bar.end"): (0.0, 0.0, -4.5), ("over@10", "bar.end"): (0.0, 0.0, 2.0),
    ("a", "bar@30"): (1.0, 0.0, -1.0),
}
STRESS = {("a", "bar@0", "xx@top"): 90.0, ("a", "bar@0", "xx@bottom"): -95.0, ("b", "bar@30", "xx@top"): 20.0}
NOTCH = {("a", "bar.hole", "xx@upper"): -140.0, ("b", "bar.hole", "xx@lower"): 120.0,
         ("a", "bar.step@40", "xx@top"): 150.0}


def _figures(scale: float) -> tuple[Figure, ...]:
    found = [Figure(FigureKey(case, place, "displacement", axis), scale * value, "mm")
             for (case, place), vector in U.items() for axis, value in zip("xyz", vector, strict=True)]
    found += [Figure(FigureKey(case, place, "nominal_stress", component, "member"), scale * value, "MPa")
              for (case, place, component), value in STRESS.items()]
    found += [Figure(FigureKey(case, place, "notch_stress", component, "member"), scale * value, "MPa")
              for (case, place, component), value in NOTCH.items()]
    found += [Figure(FigureKey("a", "wall", "reaction_force", axis), scale * v, "N")
              for axis, v in zip("xyz", (30.0, 0.0, -40.0), strict=True)]
    return (*found, Figure(FigureKey("", "", "mass", ""), scale * 2.0, "t"))


def _pair(key: FigureKey, word: JudgementWord, solid: float = 1.0, beam: float = 2.0) -> Pair:
    return Pair(key, solid, beam, "mm", solid - beam, 1.0, 0.1, (), word)


def _mode(quantity: Any, name: str, case: str, solid: float | None, beam: float | None, word: JudgementWord
          ) -> ModePair:
    unit = "Hz" if quantity == "natural_frequency" else "1"
    return ModePair(FigureKey(case, "", quantity, name), solid, beam, unit, "", "", None, None, (), None, word)


def make(words: dict[FigureKey, JudgementWord] | None = None, **given: Any) -> Figures:
    """The figures of two made-up models, the beam's 0.9 times the solid's."""
    solid: Any = SimpleNamespace(figures=_figures(1.0), mass=2.0, case_stress=(
        CaseStress("a", 100.0, 300.0, 2.35, 0.8), CaseStress("b", 80.0, 500.0, 2.94, 0.5)),
        denting=(Denting("a", "bar.end", 0.01), Denting("b", "bar.end", -0.02)))
    beam: Any = SimpleNamespace(figures=_figures(0.9))
    every = {figure.key: "agrees" for figure in solid.figures if not figure.key.case.startswith("over")}
    every |= words or {}  # type: ignore[arg-type]
    pairs = tuple(_pair(key, word) for key, word in every.items())  # type: ignore[arg-type]
    modes = (_mode("natural_frequency", "mode 1", "", 50.0, 51.0, "agrees"),
             _mode("natural_frequency", "mode 2", "", 70.0, None, "no beam value"),
             _mode("buckling_factor", "mode 1", "a", -1.5, -1.4, "agrees"),
             _mode("buckling_factor", "mode 2", "a", 6.0, 6.1, "explained"),
             _mode("buckling_factor", "mode 1", "b", 4.0, 3.9, "agrees"))
    return Figures(PART, solid, beam, Judgement(pairs, (), (), (), (), modes), **given)


@pytest.mark.parametrize(("name", "solid", "unit"), [
    ("deflection", 5.0, "mm"),  # 3, -4 in case a
    ("deflection in b", 4.5, "mm"),
    ("deflection in over", 2.0, "mm"),  # the positions of a travelling load
    ("displacement_z@bar.end", -4.5, "mm"),
    ("displacement_z@bar.end in a", -4.0, "mm"),
    ("displacement_z@end in a", -4.0, "mm"),
    ("displacement@bar@30", math.sqrt(2.0), "mm"),
    ("displacement_x", 1.0, "mm"),
    ("nominal_stress", 95.0, "MPa"),
    ("nominal_stress in b", 20.0, "MPa"),
    ("notch_stress", 150.0, "MPa"),
    ("stress@hole", 140.0, "MPa"),
    ("stress@bar.hole in b", 120.0, "MPa"),
    ("stress@step@40", 150.0, "MPa"),
    ("reaction", 50.0, "N"),
    ("reaction_force_z@wall", -40.0, "N"),
])
def test_the_largest_size_of_each_model(name: str, solid: float, unit: str) -> None:
    kept = make().figure(name)
    assert kept is not None and kept.unit == unit
    assert kept.solid == pytest.approx(solid, rel=1e-12) and kept.beam == pytest.approx(0.9 * solid, rel=1e-12)


def test_figures_of_one_model_modes_and_mass() -> None:
    figures = make()
    assert figures.figure("stress") == Kept(100.0, None, "MPa", "no beam value")
    assert figures.figure("yield_factor") == Kept(2.35, None, "1", "no beam value")
    assert figures.figure("yield_factor in b") == Kept(2.94, None, "1", "no beam value")
    assert figures.figure("denting") == Kept(-0.02, None, "mm", "no beam value")
    assert figures.figure("frequency") == Kept(50.0, 51.0, "Hz", "agrees")
    assert figures.figure("frequency_2") == Kept(70.0, None, "Hz", "no beam value")
    assert figures.figure("frequency_3") is None
    assert figures.figure("buckling_factor") == Kept(4.0, 3.9, "1", "agrees")
    assert figures.figure("buckling_factor in a") == Kept(6.0, 6.1, "1", "explained")
    assert figures.figure("mass") == Kept(2.0, 1.8, "t", "agrees")
    assert make(mass=(3.0, 2.9)).figure("mass") == Kept(3.0, 2.9, "t", "agrees")


def test_the_word_of_a_figure_is_the_worst_of_its_components() -> None:
    z, y = (FigureKey("a", "bar.end", "displacement", axis) for axis in "zy")
    words: list[JudgementWord] = []
    for found in ({z: "suspicious"}, {z: "explained"}, {y: "suspicious"}):
        kept = make(found).figure("deflection")  # type: ignore[arg-type]
        assert kept is not None
        words.append(kept.judgement)
    assert words == ["suspicious", "explained", "suspicious"]
    kept = make({y: "suspicious"}).figure("displacement_z@bar.end in a")
    assert kept is not None and kept.judgement == "agrees"


def test_a_suspicious_stress_of_the_case_casts_doubt_on_the_largest() -> None:
    top = FigureKey("a", "bar@0", "nominal_stress", "xx@top", "member")
    for name in ("stress", "yield_factor"):
        kept = make({top: "suspicious"}).figure(name)
        assert kept is not None and kept.judgement == "suspicious"
    kept = make({top: "suspicious"}).figure("stress in b")
    assert kept is not None and kept.judgement == "no beam value"


def test_names_that_are_none() -> None:
    for name in ("", "weight", "deflection_z2", "mass@bar.end", "mass in a", "frequency_0", "frequency_x",
                 "section_force", "section_force_x", "displacement_N", "buckling_factor_2", "stress_x",
                 "yield_factor@hole", "Deflection"):
        assert parse(name) is None, name
        assert make().figure(name) is None


def test_what_a_part_does_not_have_is_told() -> None:
    names = ["mass", "displacement_z@bar.end", "displacement_z@bar@12", "reaction@wall", "deflection in over"]
    assert not_there(PART, names) == []
    wrong = not_there(PART, ["weight", "reaction@door", "deflection in c", "frequency", "buckling_factor"])
    assert [name for name, _ in wrong] == ["weight", "reaction@door", "deflection in c", "frequency", "buckling_factor"]
    assert "wall" in wrong[1][1] and "over" in wrong[2][1]
    vibrating = part_from_data(bar(vibration={"modes": 2}))
    assert [name for name, _ in not_there(vibrating, ["frequency_2", "frequency_3"])] == ["frequency_3"]


def test_headline_figures() -> None:
    assert headline(PART) == ("mass", "deflection", "rotation", "stress", "yield_factor", "reaction")
    assert headline(part_from_data(bar(vibration={"modes": 2})))[-1] == "frequency"
    assert all(parse(name) for name in headline(PART))


@pytest.mark.parametrize(("quantity", "given", "found", "left"), [
    ("deflection", 2.0, 1.5, 0.25), ("displacement", 2.0, -1.5, 0.25), ("deflection", 2.0, 3.0, -0.5),
    ("stress (edge basis)", 100.0, 100.0, 0.0), ("yield_factor (edge basis)", 1.5, 3.0, 1.0),
    ("frequency", 40.0, 30.0, -0.25), ("buckling_factor", 3.0, None, None), ("deflection", 0.0, 1.0, None),
])
def test_margins(quantity: str, given: float, found: float | None, left: float | None) -> None:
    assert margin(quantity, given, found) == (None if left is None else pytest.approx(left))


def test_a_limit_on_the_mass_is_held_at_most_material() -> None:
    given = [LimitVerdict("m", "mass", 2.0, 1.9, "t", "", "", "met"),
             LimitVerdict("d", "deflection", 2.0, 1.0, "mm", "a", "", "met"),
             LimitVerdict("m2", "mass", 2.0, 1.9, "t", "", "", "not established", "disagree")]
    assert held(given)[0] == Held("m", "mass", 2.0, 1.9, "t", "met", pytest.approx(0.05))
    most = held(given, 2.2)
    assert [h.verdict for h in most] == ["missed", "met", "missed"]
    assert most[0].found == 2.2 and most[0].margin == pytest.approx(-0.1) and most[1].margin == 0.5
    assert [h.verdict for h in held(given, 1.95)] == ["met", "met", "not established"]


def test_suspicions_name_quantity_and_place_and_end() -> None:
    pairs = [_pair(FigureKey("a", f"bar@{k}", "displacement", "z"), "suspicious", 1.0 + k, 1.0) for k in range(50)]
    result: Any = SimpleNamespace(pairs=[*pairs, _pair(FigureKey("", "", "mass", ""), "agrees")], checks=(
        SimpleNamespace(name="balance", ok=False, value=0.2, allowed=1e-6), SimpleNamespace(name="fine", ok=True)))
    told = suspicions(result)
    assert len(told) == MOST + 1 and told[0] == "check balance: 0.2, allowed 1e-06"
    assert told[1] == "displacement z at bar@49 in case a: solid 50, beam 1 mm", "the worst first"
    assert told[-1] == "and 11 more: not listed"
