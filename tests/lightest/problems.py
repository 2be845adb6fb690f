"""Three problems with evaluators in closed form; the fineness of each grid is fixed here, before any search."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import islice, product

import numpy as np
from scipy.integrate import quad
from scipy.optimize import minimize_scalar

from studies.lightest import Dimension, Solved, Space
from studies.lightest.space import Point

E, DENSITY = 210_000.0, 7.85e-9  # steel; N/mm^2, t/mm^3
PLATES = (4.0, 5.0, 6.0, 8.0, 10.0, 12.0, 15.0, 20.0)


@dataclass
class Closed:
    """An evaluator in closed form that counts its solves.

    `model` gives the aim and the share used of each limit at (numbers by name); `cheap`: the aim needs no solve.
    """

    space: Space
    model: Callable[[Mapping[str, float]], tuple[float, dict[str, float]]]
    cheap: bool = True
    solves: list[Point] = field(default_factory=list)

    def at(self, point: Point) -> Solved:
        aim, used = self.model(self.space.numbers(point))
        return Solved(point, aim, used)

    def allowed(self, point: Point) -> bool:
        return True

    def aim_before(self, point: Point) -> float | None:
        return self.model(self.space.numbers(point))[0] if self.cheap else None

    def solve(self, points: Sequence[Point]) -> list[Solved]:
        assert not set(points) & set(self.solves), "solved twice"
        self.solves += points
        return [self.at(point) for point in points]


@dataclass(frozen=True)
class Problem:
    """A space, its model, the grid to be beaten, and the least aim."""

    name: str
    space: Space
    model: Callable[[Mapping[str, float]], tuple[float, dict[str, float]]]
    grid: int
    best: float

    def evaluator(self, cheap: bool = True) -> Closed:
        return Closed(self.space, self.model, cheap)

    def sobol(self, count: int, seed: int) -> float:
        """Least aim that meets the limits in a Sobol sample of so many different points; infinite without one."""
        points: dict[Point, None] = {}
        for point in self.space.spread(seed):
            points[point] = None
            if len(points) == count:
                break
        solved = [self.evaluator().at(point) for point in points]
        return min((one.aim for one in solved if one.meets), default=math.inf)


# 1. The best linear taper of a cantilever of rectangular section: tip load, given width, limit on the tip's deflection.

REACH, WIDTH, LOAD, SAG = 500.0, 12.0, 600.0, 3.0
TAPER_STEPS = 40  # of each depth: 41 x 41 = 1681 points


def flexibility(ratio: float) -> float:
    """Tip deflection of a linear taper over F L^3 / (E I_root), for the ratio r of tip to root depth: the integral over
    s = 0..1 of s^2 / (r + (1 - r) s)^3. Euler-Bernoulli; in closed form by t = r + (1 - r) s."""
    r = ratio
    if abs(1.0 - r) < 1e-3:
        return quad(lambda s: s**2 / (r + (1.0 - r) * s) ** 3, 0.0, 1.0)[0]
    return (-math.log(r) - 2.0 * (1.0 - r) + (1.0 - r * r) / 2.0) / (1.0 - r) ** 3


def taper(numbers: Mapping[str, float]) -> tuple[float, dict[str, float]]:
    root, tip = numbers["root"], numbers["tip"]
    mass = DENSITY * WIDTH * REACH * (root + tip) / 2.0
    sag = 12.0 * LOAD * REACH**3 / (E * WIDTH * root**3) * flexibility(tip / root)
    return mass, {"deflection": sag / SAG}


def best_taper() -> tuple[float, float]:
    """(mass, ratio) of the best: the depth that just meets the limit is proportional to the cube root of the
    flexibility, so that the ratio least in (1 + r) flexibility(r)^(1/3) is the best (golden section and parabolas)."""
    found = minimize_scalar(lambda r: (1.0 + r) * flexibility(r) ** (1.0 / 3.0), bounds=(0.05, 0.95), method="bounded",
                            options={"xatol": 1e-10})
    root = (12.0 * LOAD * REACH**3 / (E * WIDTH * SAG) * flexibility(found.x)) ** (1.0 / 3.0)
    return DENSITY * WIDTH * REACH * root * (1.0 + found.x) / 2.0, found.x


def tapered() -> Problem:
    space = Space((Dimension("root", low=30.0, high=80.0), Dimension("tip", low=8.0, high=60.0)))
    return Problem("taper", space, taper, (TAPER_STEPS + 1) ** 2, best_taper()[0])


# 2. An I-section of stock plates on two supports: deflection, stresses, frequency, and how slender its walls are.

SPAN, LINE = 3000.0, 12.0  # mm, N/mm
HEIGHTS = tuple(120.0 + 20.0 * k for k in range(10))
BREADTHS = tuple(60.0 + 10.0 * k for k in range(10))  # with the plates: 10 x 10 x 8 x 8 = 6400 points


def i_section(numbers: Mapping[str, float]) -> tuple[float, dict[str, float]]:
    h, b, w, f = (numbers[name] for name in ("height", "breadth", "web", "flange"))
    clear = h - 2.0 * f
    area = 2.0 * b * f + clear * w
    inertia = (b * h**3 - (b - w) * clear**3) / 12.0
    first = b * f * (h - f) / 2.0 + w * clear**2 / 8.0
    sag = 5.0 * LINE * SPAN**4 / (384.0 * E * inertia)
    bending, shear = LINE * SPAN**2 / 8.0 * h / 2.0 / inertia, LINE * SPAN / 2.0 * first / (inertia * w)
    frequency = math.pi / (2.0 * SPAN**2) * math.sqrt(E * inertia / (DENSITY * area + 2e-6))  # with 2 kg/m upon it
    return DENSITY * area * SPAN, {"deflection": sag / 4.0, "stress": bending / 140.0, "shear": shear / 30.0,
                                   "frequency": 75.0 / frequency, "flange": b / (2.0 * f) / 9.0,
                                   "web": clear / w / 42.0, "sideways": SPAN / b / 40.0}


def least_of(space: Space, model: Callable[[Mapping[str, float]], tuple[float, dict[str, float]]]) -> float:
    """The least aim of a listed space, by looking at every point."""
    every = Closed(space, model)
    return min(one.aim for one in map(every.at, space.all()) if one.meets)


def stock_i() -> Problem:
    space = Space((Dimension("height", HEIGHTS), Dimension("breadth", BREADTHS), Dimension("web", PLATES),
                   Dimension("flange", PLATES)))
    return Problem("stock I", space, i_section, space.size, least_of(space, i_section))


# 3. A box post with a choice of foot, shaken by a machine upon it: what is stiffer than its speed asks for meets the
# limits, and what is softer, but not what is between. The best of both feet differ by 0.1 %.

WALLS = tuple(2.0 + 0.5 * k for k in range(9))
SIDES = tuple(60.0 + 5.0 * k for k in range(21))  # with depth, width and two feet: 21 x 21 x 9 x 2 = 7938 points
POST, PUSH, MACHINE, SHAKING, SPEED, DAMPING = 2200.0, 700.0, 0.060, 25.0, 6.0, 0.03  # mm, N, t, N, Hz, -
BOLTED, WELDED, SWAY = 0.8, 1.5, 14.0


def box(numbers: Mapping[str, float]) -> tuple[float, dict[str, float]]:
    """The aim is a cost: mass in kg and the price of the foot. A bolted foot gives way as a spring."""
    d, b, t = numbers["depth"], numbers["width"], numbers["wall"]
    welded = numbers["foot"] == 1.0
    area = 2.0 * t * (d + b - 2.0 * t)
    inertia = (b * d**3 - (b - 2.0 * t) * (d - 2.0 * t) ** 3) / 12.0
    yields = POST**3 / (3.0 * E * inertia) + (0.0 if welded else POST**2 / (1.2e9 * (d / 100.0) ** 2))
    mass = DENSITY * area * POST
    ratio = SPEED * 2.0 * math.pi * math.sqrt((MACHINE + 0.24 * mass) * yields)
    shaken = SHAKING * yields / math.hypot(1.0 - ratio**2, 2.0 * DAMPING * ratio)
    stress = PUSH * POST * d / 2.0 / inertia
    buckling = 3.6 * E * (t / max(b, d)) ** 2
    return mass * 1e3 + (WELDED if welded else BOLTED), {
        "deflection": PUSH * yields / SWAY, "shaking": shaken / 0.8, "stress": stress / 120.0,
        "buckling": 2.0 * stress / buckling}


def box_post() -> Problem:
    space = Space((Dimension("depth", SIDES), Dimension("width", SIDES), Dimension("wall", WALLS),
                   Dimension("foot", words=2)))
    return Problem("box post", space, box, space.size, least_of(space, box))


PROBLEMS: dict[str, Callable[[], Problem]] = {"taper": tapered, "stock I": stock_i, "box post": box_post}


def grid_of_tapers() -> float:
    """Least mass on the grid of tapers, for the record: the search must be within 1 % of the optimum, not of this."""
    roots, tips = np.linspace(30.0, 80.0, TAPER_STEPS + 1), np.linspace(8.0, 60.0, TAPER_STEPS + 1)
    solved = [taper({"root": float(r), "tip": float(t)}) for r, t in islice(product(roots, tips), None)]
    return min(mass for mass, used in solved if used["deflection"] <= 1.0)
