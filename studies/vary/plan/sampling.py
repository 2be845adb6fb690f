"""Which points of the ranges become variants: grid, one at a time, Latin hypercube, Sobol sequence.

References
----------
M. D. McKay, R. J. Beckman, W. J. Conover, "A comparison of three methods for selecting values of input variables in
the analysis of output from a computer code", Technometrics 21 (1979) 239-245: the Latin hypercube.
I. M. Sobol', "On the distribution of points in a cube and the approximate evaluation of integrals", USSR
Computational Mathematics and Mathematical Physics 7 (1967) 86-112; scrambled as in A. B. Owen, "Scrambling Sobol' and
Niederreiter-Xing points", Journal of Complexity 14 (1998) 466-489.
"""

from __future__ import annotations

import itertools
import math
import warnings
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from studies.vary.plan.varied import Varied
from studies.vary.plan.words import Method

if TYPE_CHECKING:
    import numpy as np

Point = dict[str, Any]
"""What is varied -> its value as written."""


@dataclass(frozen=True)
class Sampling:
    """How points are taken: the method, how many (not of a grid), and the seed."""

    method: Method = "grid"
    points: int | None = None
    seed: int = 1


def count(varied: Mapping[str, Varied], sampling: Sampling) -> int:
    """How many points there are, without making them."""
    if sampling.method == "grid":
        return math.prod(len(one.values) for one in varied.values())
    if sampling.method == "one at a time":
        return 1 + sum(len(_others(one)) for one in varied.values())
    return sampling.points or 0


def points(varied: Mapping[str, Varied], sampling: Sampling) -> Iterator[Point]:
    """The points in their fixed order. Of a grid the last thing varied changes fastest."""
    names = tuple(varied)
    if sampling.method == "grid":
        for values in itertools.product(*(one.values for one in varied.values())):
            yield dict(zip(names, values, strict=True))
    elif sampling.method == "one at a time":
        base = {name: one.base for name, one in varied.items()}
        yield dict(base)
        for name, one in varied.items():
            for value in _others(one):
                yield {**base, name: value}
    else:
        for row in shares(len(names), sampling):
            yield {name: one.at(share) for (name, one), share in zip(varied.items(), row, strict=True)}


def _others(one: Varied) -> Sequence[Any]:
    """Values other than the base."""
    if one.base_number is None or not one.numeric:
        return [value for value in one.values if value != one.base]
    pairs = zip(one.values, one.numbers, strict=True)
    return [value for value, number in pairs if not math.isclose(number, one.base_number, rel_tol=1e-9)]


def shares(dimensions: int, sampling: Sampling) -> np.ndarray:
    """(points, dimensions) numbers from 0 to below 1, spread evenly."""
    from scipy.stats import qmc

    wanted = sampling.points or 0
    if sampling.method == "sobol":
        sequence = qmc.Sobol(dimensions, scramble=True, rng=sampling.seed)
        with warnings.catch_warnings():  # a number that is no power of two is told by the plan's notes
            warnings.simplefilter("ignore", UserWarning)
            return sequence.random(wanted)
    return qmc.LatinHypercube(dimensions, rng=sampling.seed).random(wanted)
