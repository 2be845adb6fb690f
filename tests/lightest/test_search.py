"""The search against known optima and whole grids: within 1 % of the best, with at least five times fewer solves than
the grid, and better than a Sobol sample of as many points."""

from __future__ import annotations

import math
from statistics import median
from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad

from studies.lightest import Found, search

NAMES = ("taper", "stock I", "box post")
BUDGET = 60
WITHIN, FEWER = 0.01, 5


def run(problem: Any, seed: int, **more: Any) -> tuple[Found, int]:
    evaluator = problem.evaluator(**more)
    found = search(problem.space, evaluator, BUDGET, seed)
    assert len(evaluator.solves) == len(found.solved) <= BUDGET
    return found, len(evaluator.solves)


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


@pytest.mark.parametrize("name", NAMES)
def test_one_seed(problems, name):
    problem = problems.PROBLEMS[name]()
    found, solves = run(problem, 1)
    assert over(found, problem) <= WITHIN and FEWER * solves <= problem.grid
    assert found.best.aim < problem.sobol(solves, 1)


@pytest.mark.heavy
@pytest.mark.parametrize("name", NAMES)
def test_median_of_ten_seeds(problems, name):
    problem = problems.PROBLEMS[name]()
    runs = [run(problem, seed) for seed in range(1, 11)]
    overs = [over(found, problem) for found, _ in runs]
    solves = [count for _, count in runs]
    sobol = [problem.sobol(count, seed) / problem.best - 1.0 for seed, count in enumerate(solves, 1)]
    print(f"\n{name}: grid {problem.grid}, solves {median(solves):g} ({min(solves)} to {max(solves)}), over the best "
          f"{100 * median(overs):.3f} % (at most {100 * max(overs):.3f} %), Sobol {100 * median(sobol):.2f} %")
    assert median(overs) <= WITHIN and FEWER * median(solves) <= problem.grid
    assert median(overs) < median(sobol)
