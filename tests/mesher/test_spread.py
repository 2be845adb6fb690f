"""Limited growth of the size field is a fixed point, and the lowest field above none of its seeds."""

from __future__ import annotations

from itertools import product

import numpy as np

from mesher.size_field import _spread


def _until_nothing_changes(values: np.ndarray, step: float) -> None:
    """The plain way: neighbour by neighbour, again and again."""
    while True:
        before = values.copy()
        for shift in (s for s in product((-1, 0, 1), repeat=3) if s > (0, 0, 0)):
            here = tuple(slice(max(s, 0), min(s, 0) or None) for s in shift)
            there = tuple(slice(max(-s, 0), min(-s, 0) or None) for s in shift)
            rise = step * float(np.linalg.norm(shift))
            np.minimum(values[here], values[there] + rise, out=values[here])
            np.minimum(values[there], values[here] + rise, out=values[there])
        if np.array_equal(before, values):
            return


def test_one_pass_equals_the_plain_way() -> None:
    rng = np.random.default_rng(3)
    for shape, step in (((23, 9, 14), 0.3), ((40, 3, 5), 0.05), ((4, 31, 31), 1.1)):
        values = np.full(shape, 10.0)
        values[tuple(rng.integers(0, n, 12) for n in shape)] = rng.uniform(0.1, 9.0, 12)
        plain = values.copy()
        _until_nothing_changes(plain, step)
        _spread(values, step)
        np.testing.assert_allclose(values, plain, rtol=1e-12)
        again = values.copy()
        _spread(again, step)
        np.testing.assert_allclose(again, values, rtol=1e-12)
