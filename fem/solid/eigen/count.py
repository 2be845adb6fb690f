"""How many eigenvalues lie below a shift: the inertia of a bordered matrix (Sylvester's law)."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.eigen.motions import NO_SPRINGS, Motions
from fem.solid.factor import SymmetricFactor, TooLarge
from fem.solid.shape import Array
from geometry.budget import Budget

COUNT_LIMIT = 100_000
"""Unknowns up to which modes are counted by a factor where the solver is iterative. Beyond, the factor would take
several times as long as everything else, and random vectors look for a missed one instead (`sounding`), which is sure
but for a stated chance."""

APART = 2e-3
"""Least relative gap behind which eigenvalues are counted."""


@dataclass(frozen=True, slots=True)
class LowRank:
    """A part sum_i weight_i b_i b_i^T of a matrix, rows b (r, f), weight (r,) of either sign."""

    rows: Array
    weight: Array


def negative_count(
    upper: sp.csr_matrix,
    low: LowRank,
    rows: Array,
    budget: Budget,
    springs: NDArray[np.int64] = NO_SPRINGS,
    beside_factor: bool = False,
) -> int:
    """Number of negative directions of a matrix + low rank on the motions with rows y = 0.

    `upper` is the upper triangle (f, f) of the matrix. Where the rows alone hold the part, the matrix by itself is
    singular: it gets springs on a few unknowns, which a low-rank part takes out again.

    The low-rank part and the rows stand as a border: matrix - B^T D^-1 B is what elimination of the border leaves, with
    D = -1 / weight for the low-rank part; the rows have D = 0, and each of them makes one negative and one positive
    pivot of its own. Inertias of a factor and of its Schur complement add up (E. V. Haynsworth, Linear Algebra Appl. 1
    (1968) 73).

    `beside_factor`: a direct solver holds a factor of the same pattern at the same time.

    Raises
    ------
    TooLarge
        When the factor, with the one beside it, does not fit the memory of the budget.
    SolveError
        When the matrix is singular.
    """
    if springs.size:
        upper, low = _sprung(upper, low, springs)
    factor = _factor(upper, budget, beside_factor)
    try:
        negative = factor.negative
        kept = low.weight != 0
        border = np.vstack([low.rows[kept], rows])
        if not border.shape[0]:
            return negative
        D = np.r_[-1.0 / low.weight[kept], np.zeros(rows.shape[0])]
        S = np.diag(D) - border @ factor.solve(border.T)
    finally:
        factor.close()
    scale = 1.0 / np.sqrt(np.maximum(np.abs(np.diag(S)), 1e-300))
    S = S * scale * scale[:, None]
    return negative + int((np.linalg.eigvalsh((S + S.T) / 2) < 0).sum()) - rows.shape[0] - int((D < 0).sum())


def _factor(upper: sp.csr_matrix, budget: Budget, beside_factor: bool) -> SymmetricFactor:
    if not beside_factor:
        return SymmetricFactor(upper, budget, upper=True)
    try:
        return SymmetricFactor(upper, replace(budget, memory=budget.memory // 2), upper=True)
    except TooLarge as error:
        raise TooLarge(
            f"the factor of {upper.shape[0]} unknowns that counts and that of the solver beside it do not fit the "
            f"budget of {budget.memory} MiB together"
        ) from error


def _sprung(
    upper: sp.csr_matrix, low: LowRank, springs: NDArray[np.int64]
) -> tuple[sp.csr_matrix, LowRank]:
    diagonal = upper.diagonal()
    stiffness = float(np.median(np.abs(diagonal)))
    added = np.zeros(upper.shape[0])
    added[springs] = stiffness
    out = np.zeros((springs.size, upper.shape[0]))
    out[np.arange(springs.size), springs] = 1.0
    more = LowRank(np.vstack([low.rows, out]), np.r_[low.weight, np.full(springs.size, -stiffness)])
    return sp.csr_matrix(upper + sp.diags(added)), more


def separated(values: Array, wanted: int) -> tuple[int, float] | None:
    """Where to count: how many of the rising positive values lie below a shift, at least `wanted`, and the shift.

    None when the last ones stand so close together that the next one may be one of them.
    """
    gaps = np.diff(values) / values[:-1]
    apart = np.flatnonzero(gaps[wanted - 1 :] > APART)
    if not apart.size:
        return None
    below = wanted + int(apart[0])
    return below, float(values[below - 1]) * (1.0 + min(float(gaps[below - 1]) / 3.0, 0.01))


def too_large(motions: Motions) -> str:
    """Why the modes are not counted; empty when they are."""
    if motions.direct or motions.free <= COUNT_LIMIT:
        return ""
    return f"not counted by a factor, which would take several times as long as the {motions.solver} solver's search"
