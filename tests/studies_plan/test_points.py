"""Which points a plan has: grid, one at a time, Latin hypercube, Sobol sequence, stock lists, steps."""

from __future__ import annotations

import itertools
import tomllib
from collections import Counter

import pytest

from geometry.problem import SpecError
from geometry.spec.read import part_from_data
from studies.vary.plan import LeftOut, plan_from_data, plan_from_text

DEPTHS = 'root_depth = { from = "56 mm", to = "72 mm", steps = 4 }\n'


def test_a_grid_is_every_combination_and_the_last_thing_varied_changes_fastest(plan):
    made = plan(f'[vary]\n{DEPTHS}tip_depth = ["34 mm", "35 mm", "38 mm"]\n'
                '"members.arm.section.flange" = ["6 mm", "8 mm"]')
    wanted = list(itertools.product((56, 60, 64, 68, 72), (34, 35, 38), (6, 8)))
    assert made.count() == len(wanted) == 30
    found = list(made.variants())
    assert [tuple(v.numbers.values()) for v in found] == [tuple(map(float, w)) for w in wanted]
    assert [v.number for v in found] == list(range(1, 31))
    assert [v.key for v in made.variants()] == [v.key for v in found]


def test_values_reach_the_part_by_name_and_by_path(plan):
    made = plan('[vary]\ntip_depth = ["36 mm"]\n"members.arm.holes[1].diameter" = ["9 mm"]\n'
                '"loads.camera.force[3]" = ["-200 N"]\n"supports.wall.hold" = [["x", "y", "z"]]\n'
                'accuracy = ["3 %"]\n"members.arm.roll" = ["10 deg"]')
    (variant,) = made.variants()
    part = part_from_data(variant.data)
    (arm,) = part.members
    assert arm.stations[-1].dims["depth"] == 36.0
    assert arm.cuts[0].depth == 9.0
    assert part.loads[0].force == (0.0, 0.0, -200.0)
    assert set(part.supports[0].held) == {"x", "y", "z"}
    assert part.accuracy == 0.03
    assert arm.roll == pytest.approx(10 * 3.141592653589793 / 180)
    assert variant.numbers["loads.camera.force[3]"] == -200.0
    assert "supports.wall.hold" not in variant.numbers


def test_a_path_may_have_a_name_of_the_plans_own(plan):
    made = plan('[vary]\nflange = { path = "members.arm.section.flange", from = "6 mm", to = "8 mm", step = "1 mm" }\n'
                '[constraints]\nthick = "flange > 6 mm"\n[aim]\nleast = "mass / (1 kg) + flange / (10 mm)"')
    assert [v.values["flange"] for v in made.variants()] == ["7 mm", "8 mm"]
    assert made.aim.value({"mass": 1e-3}, {"flange": 7.0}) == pytest.approx(1.7)


def test_the_part_itself_is_not_changed_by_its_variants(plan):
    made = plan('[vary]\n"members.arm.holes[1].diameter" = ["9 mm", "10 mm"]')
    list(made.variants())
    assert made.part_data["members"]["arm"]["holes"][0]["diameter"] == "bore"


def test_steps_are_written_in_the_unit_of_the_plan(plan):
    made = plan('[vary]\nroot_depth = { from = "4.8 cm", to = "7.2 cm", steps = 4 }')
    assert made.varied["root_depth"].values == ("4.8 cm", "5.4 cm", "6 cm", "6.6 cm", "7.2 cm")
    assert made.varied["root_depth"].numbers == (48.0, 54.0, 60.0, 66.0, 72.0)


def test_one_at_a_time_moves_each_from_the_part_alone(plan):
    made = plan(f'[vary]\n{DEPTHS}bore = ["12 mm", "14 mm", "13 mm"]\n[sampling]\nmethod = "one at a time"')
    points = [tuple(v.numbers.values()) for v in made.variants()]
    assert made.count() == 7
    assert points[0] == (60.0, 14.0)
    assert points[1:] == [(56.0, 14.0), (64.0, 14.0), (68.0, 14.0), (72.0, 14.0), (60.0, 12.0), (60.0, 13.0)]


def test_base_moves_the_start_of_one_at_a_time(plan):
    made = plan(f'[base]\nroot_depth = "64 mm"\nbore = "10 mm"\n[vary]\n{DEPTHS}[sampling]\nmethod = "one at a time"')
    points = [v.numbers["root_depth"] for v in made.variants()]
    assert points == [64.0, 56.0, 60.0, 68.0, 72.0]
    assert all(part_from_data(v.data).parameters["bore"] == 10.0 for v in made.variants())


RANGES = '[vary]\nroot_depth = { from = "56 mm", to = "72 mm" }\ntip_depth = { from = "35 mm", to = "40 mm" }\n'


def test_a_latin_hypercube_hits_each_of_n_slices_of_each_range_once(plan):
    made = plan(f'{RANGES}[sampling]\nmethod = "latin hypercube"\npoints = 25\nseed = 4')
    found = [v.numbers for v in made.variants()]
    assert len(found) == made.count() == 25
    for name, low, high in (("root_depth", 56.0, 72.0), ("tip_depth", 35.0, 40.0)):
        assert sorted(int((n[name] - low) / (high - low) * 25) for n in found) == list(range(25))


def test_a_sobol_sequence_of_a_power_of_two_fills_every_dyadic_box_evenly(plan):
    # A scrambled (0, m, 2) net in base 2: every box of 2^-a by 2^-b with a + b = m holds exactly one point.
    made = plan(f'{RANGES}[sampling]\nmethod = "sobol"\npoints = 32\nseed = 7')
    found = [((v.numbers["root_depth"] - 56.0) / 16.0, (v.numbers["tip_depth"] - 35.0) / 5.0) for v in made.variants()]
    assert made.notes == ()
    for a in range(6):
        boxes = Counter((int(x * 2**a), int(y * 2 ** (5 - a))) for x, y in found)
        assert set(boxes.values()) == {1} and len(boxes) == 32


@pytest.mark.parametrize("method", ["latin hypercube", "sobol"])
def test_the_seed_alone_decides_which_points(plan, method):
    def keys(seed):
        return [v.key for v in plan(f'{RANGES}[sampling]\nmethod = "{method}"\npoints = 16\nseed = {seed}').variants()]

    assert keys(1) == keys(1)
    assert not set(keys(1)) & set(keys(2))


def test_sampled_points_fall_on_steps_stock_sizes_and_listed_values(plan):
    made = plan('[vary]\nroot_depth = { from = "54 mm", to = "72 mm", step = "6 mm" }\n'
                'flange = { path = "members.arm.section.flange", stock = "plate", from = "5 mm", to = "8 mm" }\n'
                'bore = ["8 mm", "10 mm"]\n[sampling]\nmethod = "sobol"\npoints = 64')
    points = list(made.variants())
    counts = {name: Counter(v.numbers[name] for v in points) for name in made.varied}
    assert counts["root_depth"] == dict.fromkeys((54.0, 60.0, 66.0, 72.0), 16)
    assert set(counts["flange"]) == {5.0, 6.0, 8.0}
    assert counts["bore"] == {8.0: 32, 10.0: 32}
    twins = 64 - len({tuple(v.numbers.values()) for v in points})
    assert twins > 0 and any(f"{twins} of the 64 points" in note for note in made.notes)
    assert any("stock list plate" in note and "no source" in note for note in made.notes)


def test_a_number_of_sobol_points_that_is_no_power_of_two_is_told(plan):
    made = plan(f'{RANGES}[sampling]\nmethod = "sobol"\npoints = 40')
    assert made.count() == len(list(made.points())) == 40
    assert any("32 or 64" in note for note in made.notes)


def test_a_stock_list_of_the_plan_comes_before_the_built_in_one(plan):
    made = plan('[stock]\nplate = ["5.5 mm", "7.5 mm"]\n[vary]\n"members.arm.section.flange" = { stock = "plate" }')
    assert [v.numbers["members.arm.section.flange"] for v in made.variants()] == [5.5, 7.5]


def test_counts_may_be_varied_as_whole_numbers(plan):
    made = plan('[vary]\n"members.arm.holes[1].count" = { from = 1, to = 3, steps = 2 }\n'
                '[base]\nbore = "8 mm"\n"members.arm.holes[1].pitch" = "20 mm"')
    assert [len(part_from_data(v.data).members[0].cuts) for v in made.variants()] == [1, 2, 3]


def test_any_values_within_the_ranges_make_a_variant(plan):
    made = plan(f'[vary]\n{DEPTHS}bore = ["12 mm", "14 mm"]')
    one = made.variant({"root_depth": 60.5, "bore": "12 mm"}, number=9)
    assert one.values == {"root_depth": "60.5 mm", "bore": "12 mm"}
    assert (one.number, one.numbers["root_depth"]) == (9, 60.5)
    assert made.variant({"root_depth": 60.0, "bore": 14.0}).key == list(made.variants())[3].key
    assert made.variant({"root_depth": "6.0 cm", "bore": 14.0}).key == list(made.variants())[3].key


@pytest.mark.parametrize("text", [
    f'[vary]\n{DEPTHS}bore = ["12 mm", "13 mm"]\n[sampling]\nmethod = "one at a time"',
    '[vary]\n"supports.wall.hold" = [["x", "y", "z"]]\n"members.arm.roll" = ["10 deg"]\n[sampling]\n'
    'method = "one at a time"',
    '[vary]\nroot_depth = { from = "56 mm", to = "72 mm" }\n[sampling]\nmethod = "sobol"\npoints = 8',
    '[sampling]\nmethod = "as made"\npoints = 8\n[tolerances]\nbore = "0.1 mm"',
])
def test_a_variant_is_made_again_from_its_values(plan, text):
    made = plan(text)
    for variant in made.variants():
        assert made.variant(variant.values, variant.number) == variant
        assert made.variant({**variant.values, **variant.numbers}, variant.number) == variant


@pytest.mark.parametrize(("values", "path", "allowed"), [
    ({"root_depth": "80 mm"}, "root_depth", "from 56 mm to 72 mm"),
    ({"root_depth": "60 N"}, "root_depth", "a length"),
    ({"bore": "13 mm"}, "bore", "one of 12 mm, 14 mm"),
    ({"bor": "13 mm"}, "bor", "root_depth, bore"),
    ({"tip": "root"}, "tip", "root_depth, bore"),
])
def test_values_outside_the_plan_are_refused(plan, values, path, allowed):
    with pytest.raises(SpecError) as error:
        plan(f'[vary]\n{DEPTHS}bore = ["12 mm", "14 mm"]').variant(values)
    assert error.value.problems[0].path == path
    assert allowed in error.value.problems[0].allowed


def test_points_that_are_no_part_are_left_out_and_say_why(plan):
    made = plan('[vary]\ntip_depth = ["32 mm", "26 mm", "20 mm"]')
    points = list(made.points())
    assert [p.number for p in points if isinstance(p, LeftOut)] == [2, 3] == [p.number for p in made.left_out()]
    assert "flat beside the root" in points[1].reason
    assert points[1].rule == "members.arm.stations (at 360 mm).root_radius"
    assert points[1].values == {"tip_depth": "26 mm"}
    assert [v.number for v in made.variants()] == [1]


def test_a_plan_made_of_plain_data_is_the_plan_of_the_text(plan, examples):
    text = plan(f'[vary]\n{DEPTHS}')
    data = {"part": "camera_arm.toml", "vary": {"root_depth": {"from": "56 mm", "to": "72 mm", "steps": 4}}}
    made = plan_from_data(data, examples)
    assert [v.key for v in made.variants()] == [v.key for v in text.variants()]
    assert made.key == text.key
    inline = plan_from_data({**data, "part": text.part_data}, examples)
    assert inline.key == text.key
    assert plan_from_text(made.text, examples).key == text.key
    again = plan_from_data({**tomllib.loads(inline.text), "part": tomllib.loads(inline.part_text)}, examples)
    assert again.key == text.key


def test_limits_of_the_plan_are_added_to_those_of_the_part_or_take_their_place(plan):
    made = plan('[vary]\nbore = ["12 mm"]\n[limits]\ndeflection = "0.2 mm"\n[limits.tip]\nquantity = "displacement"\n'
                'at = "arm.end"\ncomponent = "z"\nmax = "0.3 mm"')
    part = part_from_data(next(made.variants()).data)
    assert {limit.name: (limit.quantity, limit.value) for limit in part.limits} == {
        "deflection": ("deflection", 0.2), "yield_factor": ("yield_factor", 1.5), "tip": ("displacement", 0.3)}
