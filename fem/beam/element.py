"""Transfer matrices of short lengths of the member.

The equations of `fem.beam.law` are integrated by Magnus' method with two Gauss points (order 4; S. Blanes,
F. Casas, J. A. Oteo and J. Ros, Phys. Rep. 470 (2009) 151-238): exact where the section is constant, distributed
loads and restrained warping included.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from fem.beam.law import LineProperties, system_matrices

Array = NDArray[np.float64]
GAUSS = 0.5 + np.array([-0.5, 0.5]) / np.sqrt(3.0)


def transfer_matrices(
    ends: Array, properties: Callable[[Array], LineProperties], E: float, G: float, warping: bool
) -> Array:
    """Transfer matrix of each length.

    Parameters
    ----------
    ends
        (m, 2) start and end of each length, mm.
    properties
        Gives the properties at given points; `points` come as one flat array, length by length, two each.

    Returns
    -------
    (m, 2n + 13, 2n + 13) matrices that carry the state of `system_matrices` from start to end.
    """
    h = ends[:, 1] - ends[:, 0]
    points = ends[:, :1] + h[:, None] * GAUSS
    p = properties(points.ravel())
    A = system_matrices(p, E, G, warping).reshape(len(h), 2, *(2 * [2 * (7 if warping else 6) + 13]))
    scale = _scale(h, E * p.area.reshape(-1, 2).mean(axis=1), warping)
    A = A * (h[:, None, None] * scale[:, None, :] / scale[:, :, None])[:, None]
    a, b = A[:, 0], A[:, 1]
    M = exponentials(0.5 * (a + b) + np.sqrt(3.0) / 12.0 * (b @ a - a @ b))
    return M * scale[:, :, None] / scale[:, None, :]


def _scale(h: Array, EA: Array, warping: bool) -> Array:
    """(m, 2n + 13) sizes of the state's entries: exponentials of badly scaled matrices lose digits."""
    one = np.ones_like(h)
    d = [h] * 3 + [one] * 3 + ([1.0 / h] if warping else [])
    f = [EA] * 3 + [EA * h] * 3 + ([EA * h**2] if warping else [])
    load = [EA / h] * 3 + [EA] * 3
    growth = [q / h for q in load]
    return np.stack(d + f + load + growth + [one], axis=1)


def exponentials(A: Array) -> Array:
    """(m, n, n) exponentials of many small matrices at once: Taylor series of order 18 with scaling and squaring.

    All share one scaling, chosen so that the largest 1-norm is at most 1/2; the rest of the series is then below
    rounding error. The series is summed in three blocks of six powers: seven products instead of seventeen (M. S.
    Paterson and L. J. Stockmeyer, SIAM J. Comput. 2 (1973) 60-66).
    """
    size = float(np.abs(A).sum(axis=1).max())
    halvings = max(0, int(np.ceil(np.log2(size / 0.5)))) if size > 0.0 else 0
    powers = [A / 2.0**halvings]
    for k in range(1, 6):
        powers.append(powers[k // 2] @ powers[k - 1 - k // 2])
    inner = np.arange(A.shape[-1])
    M = powers[5] / math.factorial(18)
    for first in (12, 6, 0):
        for k, power in enumerate(powers[:5], first + 1):
            M += power / math.factorial(k)
        M[:, inner, inner] += 1.0 / math.factorial(first)
        if first:
            M = M @ powers[5]
    for _ in range(halvings):
        M = M @ M
    return M
