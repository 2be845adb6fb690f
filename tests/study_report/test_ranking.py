"""Which variant is chosen and why, against a search through all of them by hand."""

from __future__ import annotations

import dataclasses
from types import ModuleType

import numpy as np
import pytest

from studies.report.study.answer import answer
from studies.report.study.counts import alike, count
from studies.report.study.data import StudyData
from studies.report.study.page import top_of
from studies.report.study.ranking import at_most, at_the_edge, best_front, governing, neighbours, rank
from studies.vary.outcome import Held, Outcome


def only(data: StudyData, *numbers: int) -> StudyData:
    return dataclasses.replace(data, rows=tuple(row for row in data.rows if row.number in numbers))


def test_the_chosen_one_is_the_lightest_that_meets_all(samples: ModuleType) -> None:
    data = samples.grid()
    good = [(row.outcome.figures["mass"].solid, row.number) for row in data.rows
            if row.outcome.status == "finished" and row.outcome.figures["deflection"].solid <= 0.21
            and row.outcome.figures["stress"].solid <= 7.6]
    found = rank(data)
    assert len(found.meeting) == len(good) == 32
    assert found.chosen is not None and found.chosen.number == min(good)[1]
    masses = [row.aim for row in found.meeting]
    assert all(b >= a * (1 - 1e-4) for a, b in zip(masses, masses[1:], strict=False))
    assert {row.number for row in found.meeting + found.misses} == set(range(1, 61)) - {12, 33}


def test_equal_masses_are_ordered_by_what_is_left(samples: ModuleType) -> None:
    """Arms of 72/26 and 66/32 mm weigh the same but for rounding; the deeper root bends less."""
    numbers = [row.number for row in rank(samples.grid()).meeting]
    assert numbers.index(49) < numbers.index(41)
    left = {row.number: governing(row.outcome).margin for row in samples.grid().rows if row.number in (41, 49)}
    assert left[49] > left[41]


def test_a_suspicious_variant_is_passed_over_and_told(samples: ModuleType) -> None:
    data = samples.grid()
    first = rank(data).chosen
    doubt = dataclasses.replace(first.outcome, judgement="suspicious", fine=False, suspicions=("mass: 1, 2 t",))
    rows = tuple(dataclasses.replace(row, outcome=doubt) if row.number == first.number else row for row in data.rows)
    data = dataclasses.replace(data, rows=rows)
    found = rank(data)
    assert found.chosen is not None and found.chosen.number != first.number
    assert [row.number for row in found.passed_over] == [first.number]
    assert f"Passed over: variant {first.number} meets every limit" in " ".join(top_of(data).reasons)


def test_the_headline_names_variant_mass_limit_and_margin(samples: ModuleType) -> None:
    top = top_of(samples.grid())
    assert top.headline == "Variant 37 is the lightest of the 31 variants that meet every limit: 0.4316 kg."
    assert top.reasons[0] == "Deflection governs: 0.1942 mm, at most 0.21 mm allowed, 7.5 % left."
    assert "tip_depth 26 mm the least and web 4 mm the least" in top.reasons[1]
    assert top.command == "haunch again camera_arm_plan.study 37"
    assert top.steps_text == "The one lighter neighbour fails a limit: deflection."


def test_neighbours_differ_by_one_step_of_one_value(samples: ModuleType) -> None:
    data = samples.grid()
    row = next(row for row in data.rows if row.number == 30)  # 60, 32, 5: in the middle of everything
    found = neighbours(data, row)
    assert len(found) == 6
    steps = {"root_depth": 6.0, "tip_depth": 6.0}
    for name, other in found:
        changed = {n for n in row.numbers if row.numbers[n] != other.numbers[n]}
        assert changed == {name}
        assert abs(row.numbers[name] - other.numbers[name]) == pytest.approx(steps.get(name, 1.0))
    assert at_the_edge(data, row) == []
    assert neighbours(samples.sampled(40), row) == []


def test_none_meets(samples: ModuleType) -> None:
    data = samples.grid({"deflection": 0.05, "stress": 2.0})
    found = rank(data)
    short = [max(row.outcome.figures["deflection"].solid / 0.05, row.outcome.figures["stress"].solid / 2.0)
             for row in found.misses]
    assert found.chosen is None and len(short) == 58
    assert short == sorted(short)
    top = top_of(data)
    assert top.headline == "None of the 58 variants that ran meets every limit."
    assert top.row is not None and top.row.number == found.misses[0].number
    assert "). Deflection is missed: " in top.reasons[0] and "missed by" in top.reasons[0]


def test_not_established_is_not_met_and_comes_after_near_misses(samples: ModuleType) -> None:
    near = samples.row(1, {"web": 4.0}, samples.outcome("1", {"mass": 1e-3, "deflection": 0.22}, {"deflection": 0.21}))
    held = Held("deflection", "deflection", 0.21, 0.1, "mm", "not established", 0.5, "it is suspicious there")
    unknown = samples.row(2, {"web": 5.0}, dataclasses.replace(near.outcome, key="2", limits=(held,)))
    far = samples.row(3, {"web": 6.0}, samples.outcome("3", {"mass": 1e-3, "deflection": 0.6}, {"deflection": 0.21}))
    data = dataclasses.replace(samples.grid(), rows=(unknown, far, near))
    assert [row.number for row in rank(data).misses] == [1, 2, 3]
    assert top_of(only(data, 2)).reasons[1] == "Its limit deflection is not established: it is suspicious there."


def test_only_suspicious_ones_meet(samples: ModuleType) -> None:
    data = samples.grid()
    rows = tuple(dataclasses.replace(row, outcome=dataclasses.replace(row.outcome, judgement="suspicious"))
                 for row in data.rows if row.outcome.status == "finished")
    top = top_of(dataclasses.replace(data, rows=rows))
    assert top.headline.startswith("Only suspicious variants meet every limit (variants 37, 49, 41, 53, 45 and 27 mor")
    assert rank(dataclasses.replace(data, rows=rows)).chosen is None


def test_all_failed_and_nothing_run(samples: ModuleType) -> None:
    data = only(samples.grid(), 12, 33)
    assert top_of(data).headline.startswith("All 2 variants that ran failed")
    assert top_of(data).row is None
    waiting = tuple(dataclasses.replace(row, outcome=None, aim=None) for row in data.rows)
    assert top_of(dataclasses.replace(data, rows=waiting)).headline == "Nothing has run yet."


def test_without_limits_that_is_said(samples: ModuleType) -> None:
    top = top_of(samples.grid({}))
    assert "no limits were set" in top.headline
    assert top.reasons[0] == "No limits were set, so nothing says whether it is strong or stiff enough."


def test_more_may_be_better(samples: ModuleType) -> None:
    rows = tuple(samples.row(i, {"web": float(i)}, samples.outcome(str(i), {"mass": 1e-3, "frequency": 10.0 * i},
                                                                   {"frequency": 15.0}), aim="frequency")
                 for i in range(1, 6))
    data = dataclasses.replace(samples.grid(), rows=rows, aim="frequency", aim_unit="Hz", most=True)
    top = top_of(data)
    assert top.headline == ("Variant 5 is the one with the greatest frequency of the 4 variants that meet every limit: "
                            "50 Hz.")
    assert top.reasons[0].startswith("Frequency governs: 50 Hz, at least 15 Hz asked")


def test_unfinished_studies_say_that_the_answer_may_change(samples: ModuleType) -> None:
    data = samples.grid()
    rows = tuple(dataclasses.replace(row, outcome=None, aim=None) if row.number > 40 else row for row in data.rows)
    assert top_of(dataclasses.replace(data, rows=rows)).warnings == (
        "20 of 60 points have not run yet. What is said here may change.",)


def test_parts_as_made_are_counted(samples: ModuleType) -> None:
    """Of ten good parts out of ten no fewer than 0.025^(1/10) = 69.2 % are good at 95 % confidence: 100 %, 69 %."""
    data = dataclasses.replace(only(samples.grid(), *range(50, 60)), sampling="as made")
    top = top_of(data)
    assert top.headline == "10 of 10 parts as made meet every limit."
    assert top.reasons[0].startswith("That is 100 %; with 95 % confidence between 69 % and 100 % of all parts")


@pytest.mark.parametrize(("given", "found", "quantity", "margin", "most"), [
    (0.5, 0.4, "deflection", 0.2, True), (0.5, 0.6, "deflection", -0.2, True), (1.5, 1.8, "yield_factor", 0.2, False),
    (1.5, 1.2, "yield_factor", -0.2, False), (0.5, 0.5, "deflection", 0.0, True), (20.0, 20.0, "frequency", 0.0, False),
    (0.5, -0.4, "displacement", 0.2, True), (1.5, None, "yield_factor (nominal basis)", None, False),
])
def test_the_sense_of_a_limit(given: float, found: float | None, quantity: str, margin: float | None,
                              most: bool) -> None:
    assert at_most(Held("x", quantity, given, found, "1", "met", margin)) is most


def test_best_front_against_all_pairs() -> None:
    points = [tuple(p) for p in np.random.default_rng(3).integers(0, 12, (200, 2)).astype(float)]
    front = best_front(points, (lambda x: x, lambda y: -y))
    beaten = [any((x2 <= x and y2 >= y) and (x2 < x or y2 > y) for x2, y2 in points) for x, y in points]
    assert {points[i] for i in front} == {p for p, b in zip(points, beaten, strict=True) if not b}
    assert len({points[i] for i in front}) == len(front)


def test_reasons_that_differ_in_numbers_are_one(samples: ModuleType) -> None:
    found = count(samples.grid())
    assert [(reason.count, reason.stage, reason.numbers) for reason in found.failures] == [(2, "mesh", (12, 33))]
    assert [(reason.count, reason.text) for reason in found.suspicions] == [(3, "displacement z at arm.end")]
    assert alike("took 3.1 s at arm@18") == alike("took 47 s at arm@18") != alike("took 3.1 s at arm@36")
    assert found.judgements == {"agrees": 0, "explained": 55, "suspicious": 3}
    assert (found.points, found.finished, found.failed, found.waiting) == (60, 58, 2, 0)
    by_limit = {limit.name: (limit.met, limit.missed) for limit in found.by_limit}
    assert by_limit == {"deflection": (32, 26), "stress": (38, 20)}


def test_points_of_equal_content_count_once_as_variants(samples: ModuleType) -> None:
    data = samples.grid()
    twin = dataclasses.replace(data.rows[0], number=99)
    assert count(dataclasses.replace(data, rows=(*data.rows, twin))).repeated == 1


def test_a_failed_outcome_has_no_answer(samples: ModuleType) -> None:
    data = only(samples.grid(), 12)
    assert isinstance(data.rows[0].outcome, Outcome)
    assert answer(data, rank(data), count(data)).headline.startswith("The only variant failed")
