"""Vectors to begin with: smooth fields along the part's longest direction, in random mixture, and a few rough ones."""

from __future__ import annotations

import numpy as np
from numpy.polynomial import legendre

from fem.solid.shape import Array
from fem.solid.solver.elimination import Elimination

ROUGH = 2
DEGREE = 8


def start_fields(nodes: Array, count: int, seed: int) -> Array:
    """(3 n, count) fields: rows 3 node + direction.

    All of them mix every polynomial to degree DEGREE along the part times 1 and the coordinates across it, so that no
    symmetry is left out; the last ROUGH are random at every node.
    """
    rng = np.random.default_rng(seed)
    extent = np.ptp(nodes, axis=1)
    order = np.argsort(-extent)
    x = 2.0 * (nodes - nodes.min(axis=1)[:, None]) / extent[:, None] - 1.0
    along = legendre.legvander(x[order[0]], DEGREE)  # (n, DEGREE + 1)
    across = np.array([np.ones(x.shape[1]), x[order[1]], x[order[2]]])
    smooth = count - min(ROUGH, count)
    weights = rng.standard_normal((3, 3, DEGREE + 1, count)) / (1.0 + np.arange(DEGREE + 1))[:, None] ** 2
    out = np.empty((nodes.shape[1], 3, count))
    for i in range(3):
        out[:, i] = sum(across[j][:, None] * (along @ weights[i, j]) for j in range(3))
    out[:, :, smooth:] = rng.standard_normal((nodes.shape[1], 3, count - smooth))
    return out.reshape(-1, count)


def held_fields(elimination: Elimination, nodes: Array, count: int, seed: int) -> Array:
    """(3 n, count) the fields as motions u = T y."""
    size = np.asarray(elimination.T.power(2).sum(axis=0)).ravel()
    return elimination.expand(elimination.gather(start_fields(nodes, count, seed)) / size[:, None])
