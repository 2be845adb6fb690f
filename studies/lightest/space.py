"""The values that may be chosen, as points that a search can count, compare and step between."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

Point = tuple[float, ...]
"""One number for each dimension: the value itself where any of a range may be taken, else its place in the list."""

FINE = 100_000
"""Steps of a range of which any value may be taken: its numbers stay short to write."""

STEP = 0.01
"""The next value of such a range, as a share of it."""

LOG_FROM = 1.05
"""Ratio of greatest to least value from which on a positive dimension is seen by its logarithm: figures of parts are
products of powers of dimensions, or nearly."""


@dataclass(frozen=True)
class Dimension:
    """One thing to be chosen.

    Attributes
    ----------
    name
        What it is called.
    numbers
        The numbers that may be taken, ascending; empty for a range and for words.
    low, high
        Of a range of which any value may be taken.
    words
        How many choices there are that are no numbers; 0 for numbers.
    """

    name: str
    numbers: tuple[float, ...] = ()
    low: float = 0.0
    high: float = 0.0
    words: int = 0

    @property
    def free(self) -> bool:
        """Any value between `low` and `high` may be taken."""
        return not self.numbers and not self.words

    @property
    def size(self) -> int:
        """How many values there are; of a range, how many it is divided into."""
        return self.words or len(self.numbers) or FINE + 1

    def at(self, share: float) -> float:
        """The coordinate at a share, 0 to 1, of the range or the list."""
        if not self.free:
            return float(min(int(share * self.size), self.size - 1))
        return self.snapped(self.low + share * (self.high - self.low))

    def snapped(self, number: float) -> float:
        """A number of the range, one of about `FINE`."""
        digits = 5 - math.floor(math.log10(self.high - self.low))
        return float(min(max(round(number, digits), self.low), self.high))

    def number(self, coordinate: float) -> float:
        """The number that a coordinate stands for; of words their place."""
        return self.numbers[int(coordinate)] if self.numbers else coordinate

    def beside(self, coordinate: float) -> list[float]:
        """The next values: one down and one up, or of words all others."""
        if self.words:
            return [float(k) for k in range(self.words) if k != coordinate]
        if self.numbers:
            return [c for c in (coordinate - 1.0, coordinate + 1.0) if 0.0 <= c < self.size]
        step = STEP * (self.high - self.low)
        return [c for c in map(self.snapped, (coordinate - step, coordinate + step)) if c != coordinate]

    @cached_property
    def _scale(self) -> tuple[bool, float, float]:
        """Whether it is seen by its logarithm, and the ends then."""
        low, high = (self.numbers[0], self.numbers[-1]) if self.numbers else (self.low, self.high)
        logs = low > 0.0 and high / low > LOG_FROM
        return (True, math.log(low), math.log(high)) if logs else (False, low, high)

    def seen(self, coordinates: np.ndarray) -> np.ndarray:
        """(points, columns) what a surrogate sees: numbers from -1/2 to 1/2; of words a column each (of two, one)."""
        if self.words:
            columns = np.eye(self.words)[coordinates.astype(int)]
            return (columns[:, :1] if self.words == 2 else columns / math.sqrt(2.0)) - 0.5
        numbers = np.asarray(self.numbers)[coordinates.astype(int)] if self.numbers else coordinates
        logs, low, high = self._scale
        spread = (np.log(numbers) if logs else numbers) - low
        return (spread / (high - low) if high > low else spread)[:, None] - 0.5


@dataclass(frozen=True)
class Space:
    """All that may be chosen."""

    dimensions: tuple[Dimension, ...]

    @property
    def size(self) -> int:
        """How many points there are."""
        return math.prod(one.size for one in self.dimensions)

    def all(self) -> Iterator[Point]:
        """Every point, of a space in which all is listed."""
        return itertools.product(*(map(float, range(one.size)) for one in self.dimensions))

    def at(self, shares: Sequence[float]) -> Point:
        """The point at shares, 0 to below 1, of every dimension."""
        return tuple(one.at(share) for one, share in zip(self.dimensions, shares, strict=True))

    def numbers(self, point: Point) -> dict[str, float]:
        """Name -> number, or of words the place."""
        return {one.name: one.number(c) for one, c in zip(self.dimensions, point, strict=True)}

    def beside(self, point: Point) -> list[tuple[int, Point]]:
        """The neighbours, each with the dimension that differs."""
        return [(k, (*point[:k], value, *point[k + 1:])) for k, one in enumerate(self.dimensions)
                for value in one.beside(point[k])]

    def seen(self, points: Sequence[Point]) -> np.ndarray:
        """(points, columns) what a surrogate sees of them."""
        table = np.asarray(points, dtype=float).reshape(len(points), len(self.dimensions))
        return np.hstack([one.seen(table[:, k]) for k, one in enumerate(self.dimensions)])

    def spread(self, seed: int) -> Iterator[Point]:
        """Points spread evenly, without end: a scrambled Sobol sequence snapped to what may be taken."""
        from scipy.stats import qmc

        sequence = qmc.Sobol(len(self.dimensions), scramble=True, rng=seed)
        while True:
            for shares in sequence.random_base2(6) if sequence.num_generated == 0 else sequence.random(64):
                yield self.at(shares)

    def near(self, point: Point, reach: float, count: int, rng: np.random.Generator) -> list[Point]:
        """Points at random about one, `reach` as a share of each range; listed values move by a step at least."""
        found = []
        for _ in range(count):
            moved = rng.random(len(point)) < max(0.5, 1.0 / len(point))
            offsets = rng.normal(size=len(point))
            found.append(tuple(_moved(one, c, reach * z, rng) if move else c for one, c, z, move in
                               zip(self.dimensions, point, offsets, moved, strict=True)))
        return found


def _moved(one: Dimension, coordinate: float, offset: float, rng: np.random.Generator) -> float:
    if one.words:
        return float(rng.integers(one.words))
    if one.free:
        return one.snapped(coordinate + offset * (one.high - one.low))
    steps = math.copysign(max(1.0, round(abs(offset) * one.size)), offset)
    return float(min(max(coordinate + steps, 0.0), one.size - 1.0))
