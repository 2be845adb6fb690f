"""Which vibration or buckling shape of the solid is which of the beam, by the motion of the sections."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import linear_sum_assignment

Array = NDArray[np.float64]

TOGETHER = 0.02
"""Modes whose values differ by less than this may be turned into one another by next to nothing (a square or round
section has pairs of exactly equal ones): only the span of their shapes means anything. Set by trial."""

LEAST = 0.5
"""Least correlation for two shapes to be called the same at all."""


@dataclass(frozen=True, slots=True)
class Match:
    """Indices of a shape in each model's list (None: it has none) and their correlation, 0 to 1."""

    solid: int | None
    beam: int | None
    correlation: float | None = None


def correlations(solid: Array, beam: Array) -> Array:
    """(s, b) modal assurance criterion of shapes (s, stations, 6) and (b, stations, 6): square of the cosine between
    them, with trapezoidal weights along the member (Allemang and Brown 1982, from memory)."""
    return _squares(_unit(solid) @ _unit(beam).T)


def _unit(shapes: Array) -> Array:
    """(m, 6 stations) shapes of unit norm."""
    weights = np.ones(shapes.shape[1])
    weights[[0, -1]] = 0.5
    flat = (shapes * np.sqrt(weights)[:, None]).reshape(len(shapes), -1)
    return np.asarray(flat / np.maximum(np.linalg.norm(flat, axis=1, keepdims=True), 1e-300))


def _squares(cosines: Array) -> Array:
    return np.clip(cosines**2, 0.0, 1.0)


def _in_span(shapes: Array, others: Array, values: Array) -> Array:
    """(m, k) how much of each of `shapes` lies in the span of each of `others` with those of nearly its value."""
    one, basis = _unit(shapes), _unit(others)
    found = np.empty((len(shapes), len(others)))
    for j, value in enumerate(values):
        near = np.abs(values - value) <= TOGETHER * abs(value)
        vectors, sizes, _ = np.linalg.svd(basis[near].T, full_matrices=False)
        span = vectors[:, sizes > 1e-6 * sizes[0]] if sizes[0] > 0 else vectors[:, :0]
        found[:, j] = np.square(one @ span).sum(axis=1)
    return np.clip(found, 0.0, 1.0)


def match(solid: Array, beam: Array, solid_values: Sequence[float], beam_values: Sequence[float]) -> list[Match]:
    """Pair the shapes so that the sum of the fourth powers of their correlations is greatest.

    Parameters
    ----------
    solid, beam
        (s, stations, 6), (b, stations, 6) motions of the sections in one set of axes, rotations as lengths.
    solid_values, beam_values
        Frequencies or factors; shapes of different sign of the factor are never the same.

    Returns
    -------
    list of Match
        In the solid's order, then the beam's shapes that have no partner.

    Notes
    -----
    Two shapes count as the same by the larger of two shares: of the solid's shape in the span of the beam's shapes with
    nearly the same value, and the other way round. Within such a group the shapes' own correlation decides, and where
    that says nothing the order of the values.
    """
    count = (len(solid_values), len(beam_values))
    if 0 in count:
        return [Match(i, None) for i in range(count[0])] + [Match(None, j) for j in range(count[1])]
    a, b = np.asarray(solid_values, float), np.asarray(beam_values, float)
    own = correlations(solid, beam)
    share = np.maximum(_in_span(solid, beam, b), _in_span(beam, solid, a).T)
    apart = np.abs(np.log(np.maximum(np.abs(a)[:, None], 1e-300) / np.maximum(np.abs(b)[None, :], 1e-300)))
    # A power, so that one good pair is worth more than two poor ones.
    score = share**4 + 0.05 * own - 0.02 * np.minimum(apart, 5.0)
    possible = (share >= LEAST) & (np.sign(a)[:, None] == np.sign(b)[None, :])
    rows, columns = linear_sum_assignment(np.where(possible, score, 0.0), maximize=True)
    of_solid = {int(i): int(j) for i, j in zip(rows, columns, strict=True) if possible[i, j]}
    found = [Match(i, of_solid[i], float(share[i, of_solid[i]])) if i in of_solid else Match(i, None)
             for i in range(count[0])]
    return found + [Match(None, j) for j in range(count[1]) if j not in of_solid.values()]
