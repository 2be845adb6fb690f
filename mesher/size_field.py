"""The size field on a regular grid: smallest over all seeds of (size + slope times distance)."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

MOST_GRID_POINTS = 400_000


@dataclass(frozen=True, slots=True)
class SizeField:
    """Sizes (nx, ny, nz) at ``origin + spacing * (i, j, k)``, mm; linear between the points."""

    origin: Floats
    spacing: float
    values: NDArray[np.floating[Any]]

    def at(self, points: Floats) -> Floats:
        """(n,) sizes at points (n, 3), mm; the nearest grid value outside."""
        place = (points - self.origin) / self.spacing
        low = np.clip(np.floor(place).astype(np.int64), 0, np.array(self.values.shape) - 2)
        t = np.clip(place - low, 0.0, 1.0)
        total = np.zeros(len(points))
        for corner in product((0, 1), repeat=3):
            weight = np.prod(np.where(corner, t, 1 - t), axis=1)
            total += weight * self.values[tuple((low + corner).T)]
        return total

    def write(self, path: Path) -> None:
        """As the binary file of gmsh's ``Structured`` field."""
        with open(path, "wb") as file:
            file.write(np.asarray(self.origin, dtype="<f8").tobytes())
            file.write(np.full(3, self.spacing, dtype="<f8").tobytes())
            file.write(np.array(self.values.shape, dtype="<i4").tobytes())
            file.write(np.ascontiguousarray(self.values, dtype="<f8").tobytes())


def build_field(low: Floats, high: Floats, bulk: float, slope: float, points: Floats, sizes: Floats) -> SizeField:
    """Field over the box from `low` to `high` (3,), mm.

    Parameters
    ----------
    bulk, slope
        See `mesher.sizes.Sizes`.
    points, sizes
        (n, 3) seeds, mm, and the size each asks for, mm.
    """
    finest = min(float(sizes.min()), bulk) if len(sizes) else bulk
    spacing = max(finest, float(np.prod(high - low + 2 * finest) / MOST_GRID_POINTS) ** (1 / 3))
    origin = low - 1.5 * spacing
    shape = np.ceil((high + 1.5 * spacing - origin) / spacing).astype(int) + 1
    values = np.full(shape, bulk, dtype=np.float32)  # seven digits are plenty, and it takes half the time
    if len(sizes):
        cell = np.floor((points - origin) / spacing).astype(np.int64)
        for corner in product((0, 1), repeat=3):
            node = cell + corner
            away = np.linalg.norm(origin + node * spacing - points, axis=1)
            # Between grid points the field is their mean: less the mean distance, it hits the seed's size there.
            value = sizes + slope * np.maximum(away - 0.6 * spacing, 0.0)
            np.minimum.at(values, tuple(node.T), value)
        _spread(values[_within_reach(cell, shape, (bulk - finest) / (slope * spacing))], slope * spacing)
    return SizeField(origin, spacing, values)


def _within_reach(cells: NDArray[np.int64], shape: NDArray[np.int64], reach: float) -> tuple[slice, ...]:
    """The box of grid points that seeds in `cells` (n, 3) can lower, at most `reach` spacings away."""
    margin = int(np.ceil(reach)) + 1
    low, high = cells.min(axis=0) - margin, cells.max(axis=0) + 2 + margin
    return tuple(slice(max(int(a), 0), min(int(b), int(n))) for a, b, n in zip(low, high, shape, strict=True))


def _spread(values: NDArray[np.floating[Any]], step: float) -> None:
    """Limit the growth between neighbouring grid points (all 26) to `step` times their distance; in place.

    The shortest way between two points of the grid goes along at most three of the 13 directions, all within
    the box between the two, in any order. So one pass over the directions is enough when each is walked to any
    distance: in hops of 1, 2, 4, ... points, of which every distance is a sum. A second pass changes nothing (a
    test holds it).
    """
    reach = float(np.ptp(values)) / step
    for direction in product((-1, 0, 1), repeat=3):
        if direction <= (0, 0, 0):
            continue
        length = float(np.linalg.norm(direction))
        room = min(n - 1 for n, d in zip(values.shape, direction, strict=True) if d)
        hop = 1
        while hop <= room and (hop - 1) * length < reach:  # the hops so far, together, do not reach as far as a rise
            shift = tuple(hop * d for d in direction)
            here = tuple(slice(max(s, 0), min(s, 0) or None) for s in shift)
            there = tuple(slice(max(-s, 0), min(-s, 0) or None) for s in shift)
            rise = step * hop * length
            # From the values before the hop: in place, one walk would feed the next.
            raised = values[there] + rise
            np.minimum(values[there], values[here] + rise, out=values[there])
            np.minimum(values[here], raised, out=values[here])
            hop *= 2
