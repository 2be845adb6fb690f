"""Factors of symmetric sparse matrices: MKL PARDISO where it is installed, else SciPy's sparse LU in symmetric mode."""

from __future__ import annotations

from typing import Protocol

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spla
from scipy.sparse.csgraph import reverse_cuthill_mckee

from fem.solid import pardiso
from fem.solid.pardiso import INDEFINITE, POSITIVE, NotPositive, Pardiso
from fem.solid.shape import Array
from geometry.budget import Budget
from geometry.problem import SolveError

__all__ = [
    "Cholesky",
    "NotPositive",
    "SymmetricFactor",
    "TooLarge",
    "lu_memory",
    "pardiso_available",
    "upper_triangle",
    "whole",
]

RESIDUAL_ALLOWED = 1e-6
GAUGE_ALLOWED = 1e-4
"""Error of the displacements themselves (of a known field, or left by the residual): a tenth of the tightest accuracy
that a spec may ask for. A bar of length over depth 600 has 8e-6 from rounding alone."""


class TooLarge(SolveError):
    """The memory of the budget would not suffice; the message says how much it takes."""


FACTOR_ALLOWED = 1e-2
"""Error of a known vector that a factor L D L^T may give back: what is left then tells the signs of the pivots. A
shift that is 1e-10 of an eigenvalue away from it leaves about 1e-4."""
_SINGULAR = "A shifted matrix is singular to working precision: the shift lies on an eigenvalue. Shift it a little."


def pardiso_available() -> bool:
    """Whether pypardiso and MKL can be loaded."""
    return pardiso.library() is not None


def _backend(name: str) -> str:
    if name == "auto":
        return "pardiso" if pardiso_available() else "lu"
    return name


def upper_triangle(matrix: sp.csr_matrix) -> sp.csr_matrix:
    """Upper triangle, its columns sorted in each row as PARDISO wants them."""
    matrix.sort_indices()
    rows = np.repeat(np.arange(matrix.shape[0], dtype=matrix.indices.dtype), np.diff(matrix.indptr))
    kept = matrix.indices >= rows
    starts = np.concatenate([[0], np.cumsum(kept)])[matrix.indptr].astype(np.int32)
    return sp.csr_matrix((matrix.data[kept], matrix.indices[kept], starts), shape=matrix.shape)


def whole(upper: sp.csr_matrix) -> sp.csr_matrix:
    """The symmetric matrix of an upper triangle."""
    return sp.csr_matrix(upper + sp.triu(upper, 1).T)


class _Factor(Protocol):
    negative: int

    def solve(self, rhs: Array) -> Array: ...

    def close(self) -> None: ...


class Cholesky:
    """Factor of a symmetric positive definite matrix (n, n) in CSR form: the whole of it, or with `upper` its upper
    triangle with sorted columns.

    Parameters
    ----------
    single
        Factor in single precision (PARDISO; the LU keeps to double).

    Raises
    ------
    NotPositive
        When a pivot is not positive.
    SolveError
        When the factor would not fit the memory of the budget.
    """

    def __init__(
        self, matrix: sp.csr_matrix, budget: Budget, backend: str = "auto", upper: bool = False, single: bool = False
    ) -> None:
        self.backend = _backend(backend)
        self.size = matrix.shape[0]
        if not (matrix.diagonal() > 0).all():
            raise NotPositive
        self._factor: _Factor
        if self.backend == "pardiso":
            self._factor = _Mkl(matrix if upper else upper_triangle(matrix), budget, POSITIVE, single)
        else:
            self._factor = _Lu(whole(matrix) if upper else matrix, budget)
            if self._factor.negative:
                raise NotPositive

    def solve(self, rhs: Array) -> Array:
        """(n, k) solutions of all right-hand sides (n, k)."""
        return self._factor.solve(np.asarray(rhs, dtype=float).reshape(self.size, -1))

    def close(self) -> None:
        """Give the factor's memory back."""
        self._factor.close()


class SymmetricFactor:
    """L D L^T of a symmetric matrix (n, n), indefinite in general, in CSR form (whole, or with `upper` its upper
    triangle).

    Attributes
    ----------
    negative
        How many eigenvalues are below zero: the number of negative pivots (Sylvester's law of inertia).

    Raises
    ------
    SolveError
        When the matrix is singular to working precision (a known vector does not come back), or the factor would not
        fit the memory of the budget.
    """

    def __init__(self, matrix: sp.csr_matrix, budget: Budget, backend: str = "auto", upper: bool = False) -> None:
        self.backend = _backend(backend)
        self.size = matrix.shape[0]
        self._factor: _Factor
        try:
            if self.backend == "pardiso":
                self._factor = _Mkl(_filled(matrix if upper else upper_triangle(matrix)), budget, INDEFINITE, False)
            else:
                self._factor = _Lu(whole(matrix) if upper else matrix, budget)
        except NotPositive as error:
            raise SolveError(_SINGULAR) from error
        self.negative = self._factor.negative
        known = np.random.default_rng(budget.seed).normal(size=(self.size, 1))
        load = matrix @ known
        if upper:
            load += matrix.T @ known - matrix.diagonal()[:, None] * known
        off = np.linalg.norm(self.solve(load) - known) / np.linalg.norm(known)
        if not off <= FACTOR_ALLOWED:
            self.close()
            raise SolveError(f"{_SINGULAR} (A known vector comes back with an error of {off:.1e}.)")

    def solve(self, rhs: Array) -> Array:
        """(n, k) solutions of all right-hand sides (n, k)."""
        return self._factor.solve(np.asarray(rhs, dtype=float).reshape(self.size, -1))

    def close(self) -> None:
        """Give the factor's memory back."""
        self._factor.close()


def _filled(upper: sp.csr_matrix) -> sp.csr_matrix:
    """With every diagonal entry stored, as PARDISO wants an indefinite matrix."""
    if upper.diagonal().all():
        return upper
    rows = np.repeat(np.arange(upper.shape[0]), np.diff(upper.indptr))
    there = np.arange(upper.shape[0])
    filled = sp.csr_matrix(
        (np.r_[upper.data, np.zeros(there.size)], (np.r_[rows, there], np.r_[upper.indices, there])), shape=upper.shape
    )
    filled.sort_indices()
    return filled


class _Mkl:
    def __init__(self, upper: sp.csr_matrix, budget: Budget, kind: int, single: bool) -> None:
        self._solver = Pardiso(upper, budget.threads, kind, single)
        need = self._solver.analyse()
        if need > budget.memory:
            self.close()
            raise TooLarge(
                f"The factor of {upper.shape[0]} unknowns needs about {need:.0f} MiB and the budget is "
                f"{budget.memory} MiB. Raise the memory, or ask for a coarser accuracy."
            )
        self._solver.factorise()
        self.negative = int(self._solver.iparm[22]) if kind == INDEFINITE else 0

    def solve(self, rhs: Array) -> Array:
        return np.asarray(self._solver.solve(rhs), dtype=float, order="C")

    def close(self) -> None:
        self._solver.close()


_LU_BYTES, _LU_FACTOR = 24, 1.5
"""Bytes for each entry of L and U (8 and 4 of index, twice: the check of the pivots copies both), and what the entries
are at most over those in the envelope. Measured: blocks of 2700, 14 040 and 65 520 unknowns have 1.27, 1.15 and 1.04
times the envelope's entries and take 16, 229 and 2190 MiB (told: 25, 325, 3510); a slender bar of 31 500 unknowns has
1.41 times."""


def lu_memory(matrix: sp.csr_matrix) -> float:
    """MiB that `_Lu` will need, from the envelope of the matrix in reverse Cuthill-McKee order (A. George, J. W. Liu,
    Computer Solution of Large Sparse Positive Definite Systems, 1981: a bound of the fill in that order)."""
    n = matrix.shape[0]
    order = reverse_cuthill_mckee(matrix, symmetric_mode=True)
    place = np.empty(n, dtype=np.int64)
    place[order] = np.arange(n)
    first = np.arange(n)
    np.minimum.at(first, np.repeat(place, np.diff(matrix.indptr)), place[matrix.indices])
    entries = 2 * int((np.arange(n) - first + 1).sum())
    return _LU_BYTES * _LU_FACTOR * entries / 2**20


class _Lu:
    def __init__(self, matrix: sp.csr_matrix, budget: Budget) -> None:
        need = lu_memory(matrix)
        if need > budget.memory:
            raise TooLarge(
                f"The factor of {matrix.shape[0]} unknowns by SciPy's sparse LU needs about {need:.0f} MiB and the "
                f"budget is {budget.memory} MiB. Raise the memory, ask for a coarser accuracy, or install pypardiso "
                "(MKL), which needs far less."
            )
        try:
            self.factor = spla.splu(
                matrix.tocsc(), permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
            )
        except RuntimeError as error:
            raise NotPositive from error
        # with the diagonal as pivots, the signs on U's diagonal are the signs of the pivots
        pivots = self.factor.U.diagonal()
        if (pivots == 0).any() or not np.array_equal(self.factor.perm_r, self.factor.perm_c):
            raise NotPositive
        self.negative = int((pivots < 0).sum())

    def solve(self, rhs: Array) -> Array:
        return np.asarray(self.factor.solve(rhs))

    def close(self) -> None:
        del self.factor
