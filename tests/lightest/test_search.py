"""The search against known optima and whole grids: within 1 % of the best, with at least five times fewer solves than
the grid, and better than a Sobol sample of as many points."""

from __future__ import annotations

import math
from statistics import median
from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad

from studies.lightest import Dimension, Found, Space, search

NAMES = ("taper", "stock I", "box post")
QUICK = {"taper": 1, "stock I": 1, "box post": 3}
WITHIN, FEWER = 0.01, 5


def over(found: Found, problem: Any) -> float:
    """How far above the best, as a share."""
    return math.inf if found.best is None else found.best.aim / problem.best - 1.0


def test_best_taper_is_that_of_quadrature_and_of_a_fine_look(problems):
    for ratio in (0.2, 0.5, 0.9995, 1.0):
        by_quadrature = quad(lambda s, r=ratio: s**2 / (r + (1.0 - r) * s) ** 3, 0.0, 1.0, epsabs=1e-13)[0]
        assert problems.flexibility(ratio) == pytest.approx(by_quadrature, rel=1e-7)
    mass, ratio = problems.best_taper()
    looked = [(1.0 + r) * problems.flexibility(r) ** (1.0 / 3.0) for r in np.linspace(0.1, 0.9, 4001)]
    assert ratio == pytest.approx(0.1 + 0.8 * int(np.argmin(looked)) / 4000, abs=3e-4)
    assert mass < problems.grid_of_tapers() < 1.03 * mass


@pytest.mark.parametrize("name", ["taper", pytest.param("stock I", marks=pytest.mark.heavy), "box post"])
def test_one_seed(searched, name):
    """The box post with a seed that ends in the wrong region when surrogates are believed without their error."""
    problem, evaluator, found = searched(name, QUICK[name])
    solves = len(evaluator.solves)
    assert over(found, problem) <= WITHIN and FEWER * solves <= problem.grid
    assert found.best.aim < problem.sobol(solves, QUICK[name])


@pytest.mark.heavy
@pytest.mark.parametrize("name", NAMES)
def test_median_of_ten_seeds(searched, name):
    runs = [searched(name, seed) for seed in range(1, 11)]
    problem = runs[0][0]
    overs = [over(found, problem) for _, _, found in runs]
    solves = [len(evaluator.solves) for _, evaluator, _ in runs]
    sobol = [problem.sobol(count, seed) / problem.best - 1.0 for seed, count in enumerate(solves, 1)]
    print(f"\n{name}: grid {problem.grid}, solves {median(solves):g} ({min(solves)} to {max(solves)}), over the best "
          f"{100 * median(overs):.3f} % (at most {100 * max(overs):.3f} %), Sobol {100 * median(sobol):.2f} %")
    assert median(overs) <= WITHIN and FEWER * median(solves) <= problem.grid
    assert max(overs) <= WITHIN  # more than is asked; without the error of the surrogates a seed ends 25 % above
    assert median(overs) < median(sobol)


@pytest.mark.parametrize("values", [(20.0,), (10.0, 20.0), (10.0, 20.0, 30.0)])
@pytest.mark.parametrize("cheap", [True, False])
def test_a_plan_with_fewer_variants_than_the_budget_is_solved_whole(problems, values, cheap):
    space = Space((Dimension("depth", values),))
    evaluator = problems.Closed(space, lambda of: (of["depth"], {"deflection": 15.0 / of["depth"]}), cheap)
    found = search(space, evaluator, budget=5, seed=1)
    assert found.best is not None and found.best.aim == 20.0
