"""Effects of varied values, against functions whose shares of variance are known."""

from __future__ import annotations

import dataclasses
from types import ModuleType

import numpy as np
import pytest

from studies.report.study.data import Axis
from studies.report.study.effects import effects
from studies.report.study.page import all_effects
from studies.report.study.readings import reading
from studies.report.study.words import clock, figure_words, percent


def full(*levels: int) -> list[np.ndarray]:
    return [axis.ravel().astype(float) for axis in np.meshgrid(*map(np.arange, levels), indexing="ij")]


def test_a_full_grid_gives_the_variances_of_its_levels() -> None:
    """y = 3 a + b with 5 and 3 levels: variances 9 x 2 and 1 x 2/3 (population); no other share."""
    a, b, c = full(5, 3, 2)
    found = effects([a, b, c], [True] * 3, 3 * a + b, "grid")
    assert [e.share for e in found.each] == pytest.approx([18 / (18 + 2 / 3), (2 / 3) / (18 + 2 / 3), 0.0], abs=1e-12)
    assert found.together == pytest.approx(0.0, abs=1e-12) and found.shared == pytest.approx(0.0, abs=1e-9)


def test_what_only_comes_together_is_told() -> None:
    """A product of values of mean nought: no main effect at all."""
    a, b = full(5, 5)
    found = effects([a, b], [True, True], (a - 2) * (b - 2), "grid")
    assert [e.share for e in found.each] == pytest.approx([0.0, 0.0], abs=1e-12)
    assert found.together == pytest.approx(1.0)


def test_a_value_is_not_credited_with_what_another_does() -> None:
    """Half the grid is missing, so that b goes with a; y depends on a alone, and b gets nothing."""
    a, b = full(6, 6)
    there = b <= a
    found = effects([a[there], b[there]], [True, True], a[there] ** 2, "grid")
    assert found.each[1].share == pytest.approx(0.0, abs=1e-12)
    assert found.each[0].share > 0.3
    assert found.shared == pytest.approx(1.0 - found.each[0].share)
    turned = effects([b[there], a[there]], [True, True], a[there] ** 2, "grid")
    assert [e.share for e in turned.each] == pytest.approx([0.0, found.each[0].share], abs=1e-12)


def test_words_have_effects_too() -> None:
    a, b = full(3, 4)
    found = effects([a, b], [False, True], np.array([5.0, 1.0, 3.0])[a.astype(int)], "grid")
    assert found.each[0].share == pytest.approx(1.0)
    assert found.each[0].means == (5.0, 1.0, 3.0) and found.each[0].rank is None


@pytest.mark.parametrize("sampling", ["latin hypercube", "sobol", "as made", "searched"])
def test_additive_curves_of_a_sample(samples: ModuleType, sampling: str) -> None:
    """mass = 3 a + 2 b + c over the unit cube: 9/14, 4/14, 1/14."""
    data = dataclasses.replace(samples.sampled(64, samples.additive, {}), sampling=sampling)
    found = all_effects(data)["mass"]
    assert found.kind == "curves"
    assert [e.share for e in found.each] == pytest.approx([9 / 14, 4 / 14, 1 / 14], abs=0.006)
    assert found.together == pytest.approx(0.0, abs=1e-9)
    assert all(abs(e.share - true) < e.give for e, true in zip(found.each, (9 / 14, 4 / 14, 1 / 14), strict=True))


def test_indices_without_a_model(samples: ModuleType) -> None:
    """T. Ishigami and T. Homma's function, no polynomial of low degree: 0.3139, 0.4424, 0 and 0.2437 together (from its
    closed form: V = 7^2/8 + 0.1 pi^4/5 + 0.1^2 pi^8/18 + 1/2)."""
    v1, v2 = 0.5 * (1 + 0.1 * np.pi**4 / 5) ** 2, 49 / 8
    total = 49 / 8 + 0.1 * np.pi**4 / 5 + 0.01 * np.pi**8 / 18 + 0.5
    found = all_effects(samples.sampled(1000, samples.ishigami, {}))["mass"]
    assert found.kind == "sampled"
    assert [e.share for e in found.each] == pytest.approx([v1 / total, v2 / total, 0.0], abs=0.05)
    assert found.together == pytest.approx(1 - (v1 + v2) / total, abs=0.08)
    assert all(0.01 < e.give < 0.08 for e in found.each)


def test_the_stated_interval_is_the_scatter(samples: ModuleType) -> None:
    """Half widths over ten samples against the scatter of the index itself."""
    found = [all_effects(samples.sampled(200, samples.ishigami, {}, seed))["mass"].each for seed in range(10)]
    scatter = 1.96 * np.std([[e.share for e in each] for each in found], axis=0)
    stated = np.mean([[e.give for e in each] for each in found], axis=0)
    assert np.all(stated[:2] > 0.6 * scatter[:2]) and np.all(stated[:2] < 2.0 * scatter[:2])


def test_few_points_give_rank_correlations_only(samples: ModuleType) -> None:
    found = all_effects(samples.sampled(20, samples.additive, {}))["mass"]
    assert found.kind == "correlation" and found.each[0].share is None
    assert found.each[0].rank > 0.6


def test_words_in_a_sample(samples: ModuleType) -> None:
    """A wave of variance 1/2 beside a word of variance 0.49: its share is 0.49/0.99; that of an idle word is nought."""
    rng = np.random.default_rng(5)
    a, b, x = rng.integers(0, 4, 600).astype(float), rng.integers(0, 4, 600).astype(float), rng.random(600)
    y = np.sin(16 * np.pi * x) + np.array([-0.7, 0.7, -0.7, 0.7])[a.astype(int)]
    found = effects([a, b, x], [False, False, True], y, "latin hypercube")
    assert found.kind == "sampled"
    assert found.each[0].share == pytest.approx(0.49 / 0.99, abs=0.05)
    assert found.each[1].share < 0.01


def test_idle_words_of_many_levels_get_no_share() -> None:
    """Left as it is, the correlation ratio of a word of twelve levels would be 11/300 = 3.7 % by chance alone."""
    rng = np.random.default_rng(2)
    idle = [rng.integers(0, 12, 300).astype(float) for _ in range(8)]
    found = effects([*idle, rng.random(300)], [False] * 8 + [True], np.sin(50 * rng.random(300)), "sobol")
    assert found.kind == "sampled"
    assert np.mean([e.share for e in found.each[:8]]) < 0.012


def test_one_at_a_time_swings_about_the_base() -> None:
    a = np.array([2.0, 1.0, 3.0, 2.0, 2.0])
    b = np.array([5.0, 5.0, 5.0, 4.0, 7.0])
    found = effects([a, b], [True, True], 10 * a + b, "one at a time")
    assert found.base == 25.0
    assert [e.share for e in found.each] == pytest.approx([20 / 25, 3 / 25])
    assert found.each[1].centres == (4.0, 5.0, 7.0) and found.each[1].means == (24.0, 25.0, 27.0)


def test_variants_without_the_figure_are_dropped_and_counted() -> None:
    a, b = full(5, 3)
    y = 3 * a + b
    y[[2, 7]] = np.nan
    found = effects([a, b], [True, True], y, "grid")
    assert found == effects([a[np.isfinite(y)], b[np.isfinite(y)]], [True, True], y[np.isfinite(y)], "grid")
    assert found.count == 13 and found.each[0].share > 0.8
    sampled = effects([a, b], [True, True], y, "sobol")
    assert sampled.count == 13 and all(e.share is None or e.share >= 0 for e in sampled.each)
    assert abs(sampled.each[0].rank) > 0.9


@pytest.mark.parametrize("y", [[], [1.0], [2.0, 2.0, 2.0], [np.nan, 1.0]])
def test_nothing_to_compare(y: list[float]) -> None:
    found = effects([np.arange(len(y), dtype=float)], [True], np.array(y, dtype=float), "grid")
    assert found.kind == "none" and found.each[0].share is None


def test_a_figure_next_to_nothing_that_is_rounding_has_no_effects() -> None:
    y = 5.0 + 1e-13 * np.random.default_rng(1).random(40)
    assert effects([np.arange(40.0)], [True], y, "sobol").kind == "none"


def test_the_reading_says_what_moves_it_and_which_way(samples: ModuleType) -> None:
    data = samples.grid(spoil=False)
    masses = np.array([row.aim for row in data.rows]).reshape(5, 3, 4)
    share, means = masses.mean((0, 1)).var() / masses.var(), 1e3 * masses.mean((0, 1))
    text = reading(data, "mass", "t", all_effects(data)["mass"])
    assert text.startswith(f"web moves mass most ({100 * share:.0f} % of its variance): up from {means[0]:.4g} kg to "
                           f"{means[-1]:.4g} kg as it goes from 4 mm to 8 mm. Then root_depth (")
    stress = reading(data, "stress", "MPa", all_effects(data)["stress"])
    assert stress.startswith("root_depth moves stress most") and "down from" in stress
    assert "tip_depth hardly moves it." in stress


def test_the_reading_of_words_names_them() -> None:
    from studies.report.study.data import Row, StudyData

    axis = Axis("supports.wall.hold", numeric=False)
    rows = tuple(Row(i, {axis.name: word}, {}) for i, word in enumerate(("all", "pin"), 1))
    data = StudyData("t", "p", "r", "grid", (axis,), rows)
    found = effects([np.array([0.0, 1.0])], [False], np.array([1.0, 4.0]), "grid")
    assert reading(data, "deflection", "mm", found) == (
        "supports.wall.hold moves deflection most (100 % of its variance): least at all (1 mm), largest at pin (4 mm).")


@pytest.mark.parametrize(("share", "text"), [
    (0.6243, "62 %"), (1.0, "100 %"), (0.0995, "10 %"), (0.0263, "2.6 %"), (0.00312, "0.31 %"), (0.0002, "0.02 %"),
    (0.0, "0 %"), (12.3, "1230 %"), (-0.031, "-3.1 %"), (0.02, "2 %"),
])
def test_percents(share: float, text: str) -> None:
    assert percent(share) == text


def test_names_and_times_in_words() -> None:
    assert figure_words("displacement_z@arm.end") == "displacement z at arm.end"
    assert figure_words("yield_factor") == "yield factor"
    assert figure_words("stress@cable") == "stress at cable"
    assert [clock(s) for s in (48, 700, 27600)] == ["48 s", "12 min", "7 h 40 min"]
