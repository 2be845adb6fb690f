"""Constraints: comparisons in the spec's own arithmetic."""

from __future__ import annotations

import pytest

from studies.vary.plan import LeftOut

VARY = '[vary]\nroot_depth = ["56 mm", "60 mm", "64 mm"]\nbore = ["8 mm", "10 mm"]\n'
VALUES = [(r, b) for r in (56, 60, 64) for b in (8, 10)]


@pytest.mark.parametrize(("text", "holds"), [
    ("bore <= root_depth - 50 mm", lambda r, b: b <= r - 50),
    ("bore < root_depth - 50 mm", lambda r, b: b < r - 50),
    ("root_depth >= 6 * bore", lambda r, b: r >= 6 * b),
    ("root_depth > 6 * bore", lambda r, b: r > 6 * b),
    ("bore == root_depth - 50 mm", lambda r, b: b == r - 50),
    ("50 mm < root_depth <= 60 mm", lambda r, b: 50 < r <= 60),
    ("root_depth ≥ 60 mm", lambda r, b: r >= 60),
    ("max(root_depth / bore, 7) <= 7", lambda r, b: r / b <= 7),
    ("(root_depth - tip_depth) / reach <= 8 %", lambda r, b: (r - 32) / 360 <= 0.08),
])
def test_only_points_that_hold_are_variants(plan, text, holds):
    made = plan(f'{VARY}[constraints]\nrule = "{text}"')
    wanted = [pair for pair in VALUES if holds(*pair)]
    assert 0 < len(wanted) < len(VALUES)
    assert [tuple(v.numbers.values()) for v in made.variants()] == wanted
    out = made.left_out()
    left = [tuple(int(value.split()[0]) for value in p.values.values()) for p in out]
    assert left == [pair for pair in VALUES if pair not in wanted]
    assert {p.rule for p in out} == {"constraints.rule"}


def test_the_reason_names_both_sides_with_their_numbers(plan):
    made = plan(f'{VARY}[constraints]\nrule = "bore <= root_depth / 6"')
    (first, *_) = [p for p in made.points() if isinstance(p, LeftOut)]
    assert first.reason == "bore <= root_depth / 6: 10 mm is not <= 9.33333 mm"


def test_sides_that_are_equal_but_for_rounding_are_equal(plan):
    # 0.1 + 0.2 is not 0.3 in binary arithmetic.
    made = plan('[vary]\nbore = ["0.3 cm"]\n[constraints]\na = "bore == 0.1 cm + 0.2 cm"\n'
                'b = "0.1 cm + 0.2 cm <= bore"')
    assert len(list(made.variants())) == 1
    strict = plan('[vary]\nbore = ["0.3 cm", "0.4 cm"]\n[constraints]\na = "bore > 0.1 cm + 0.2 cm"')
    assert [v.values["bore"] for v in strict.variants()] == ["0.4 cm"]


def test_arithmetic_that_fails_at_a_point_leaves_it_out(plan):
    made = plan('[vary]\nbore = ["8 mm", "10 mm"]\n[constraints]\na = "root_depth / (bore - 10 mm) < 100"')
    (out,) = made.left_out()
    assert out.number == 2 and "divides by zero" in out.reason


def test_parameters_that_follow_from_what_is_varied_count_with_their_new_value(plan, examples):
    from studies.vary.plan import plan_from_data

    data = dict(plan(VARY).part_data)
    data["parameters"] = {**data["parameters"], "half": "root_depth / 2"}
    made = plan_from_data({"part": data, "vary": {"root_depth": ["56 mm", "64 mm"]},
                           "constraints": {"a": "half > 30 mm"}}, examples)
    assert [v.values["root_depth"] for v in made.variants()] == ["64 mm"]
