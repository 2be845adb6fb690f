"""Symmetric positive definite sparse systems: one factorisation, every right-hand side at once.

The only place that touches MKL PARDISO. It is given the upper triangle (a full matrix with ``mtype = 2`` takes
the process down). Without MKL the same calls go to scipy's sparse LU in symmetric mode.
"""

from __future__ import annotations

import copy
import ctypes
import glob
import os
import sys
from functools import cache
from typing import Any

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spla
from scipy.sparse.csgraph import reverse_cuthill_mckee

from fem.solid.shape import Array
from geometry.budget import Budget
from geometry.problem import SolveError

RESIDUAL_ALLOWED = 1e-6
GAUGE_ALLOWED = 1e-4
"""Error of the displacements themselves (of a known field, or left by the residual): a tenth of the tightest accuracy
that a spec may ask for. A bar of length over depth 600 has 8e-6 from rounding alone."""


class NotPositive(Exception):
    """The matrix has a pivot that is not positive."""


@cache
def _loaded_pardiso() -> Any:
    """A solver object with MKL loaded, to be copied: finding the library takes time. None without MKL."""
    os.environ.setdefault("KMP_BLOCKTIME", "0")  # or idle threads spin for 0.2 s and take the processor from others
    try:
        from pypardiso import PyPardisoSolver

        # the wrapper searches every folder below sys.prefix unless it is told; the package puts MKL here
        found = sorted(glob.glob(f"{glob.escape(sys.prefix)}/lib/libmkl_rt.so*"))
        told = os.environ.get("PYPARDISO_MKL_RT")
        if found and told is None:
            os.environ["PYPARDISO_MKL_RT"] = found[-1]
        try:
            return PyPardisoSolver(mtype=2, size_limit_storage=0)
        finally:
            if found and told is None:
                del os.environ["PYPARDISO_MKL_RT"]
    except (ImportError, OSError, AttributeError):
        return None


def _fresh_pardiso() -> Any:
    solver = copy.copy(_loaded_pardiso())
    solver.pt, solver.iparm = np.zeros_like(solver.pt), np.zeros_like(solver.iparm)
    return solver


def pardiso_available() -> bool:
    """Whether pypardiso and MKL can be loaded."""
    return _loaded_pardiso() is not None


class Cholesky:
    """Factor of a symmetric positive definite matrix (n, n) in CSR form: the whole of it, or with `upper` its upper
    triangle with sorted columns.

    Raises
    ------
    NotPositive
        When a pivot is not positive.
    SolveError
        When the factor would not fit the memory of the budget.
    """

    def __init__(self, matrix: sp.csr_matrix, budget: Budget, backend: str = "auto", upper: bool = False) -> None:
        if backend == "auto":
            backend = "pardiso" if pardiso_available() else "lu"
        self.backend = backend
        self.size = matrix.shape[0]
        if (matrix.diagonal() <= 0).any():
            raise NotPositive
        self._factor: _Pardiso | _Lu
        if backend == "pardiso":
            self._factor = _Pardiso(matrix if upper else upper_triangle(matrix), budget)
        else:
            self._factor = _Lu(whole(matrix) if upper else matrix, budget)

    def solve(self, rhs: Array) -> Array:
        """(n, k) solutions of all right-hand sides (n, k)."""
        return self._factor.solve(np.asarray(rhs, dtype=float).reshape(self.size, -1))

    def close(self) -> None:
        """Give the factor's memory back."""
        self._factor.close()


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


class _Pardiso:
    def __init__(self, upper: sp.csr_matrix, budget: Budget) -> None:
        self.upper = upper
        self.solver = _fresh_pardiso()
        self.solver.libmkl.MKL_Set_Num_Threads(ctypes.c_int(budget.threads))
        iparm = self.solver.iparm
        iparm[0], iparm[1] = 1, 2  # own settings, nested dissection
        # the three rows of a node are alike: stored and ordered as blocks, they take half the analysis and less memory
        iparm[23], iparm[36] = 1, -80
        empty = np.zeros((self.upper.shape[0], 1), order="F")
        self._call(11, empty)
        need = max(int(iparm[14]), int(iparm[15]) + int(iparm[16])) / 1024
        if need > budget.memory:
            self.close()
            raise SolveError(
                f"The factor of {self.upper.shape[0]} unknowns needs about {need:.0f} MiB and the budget is "
                f"{budget.memory} MiB. Raise the memory, or ask for a coarser accuracy."
            )
        self._call(22, empty)

    def _call(self, phase: int, rhs: Array) -> Array:
        self.solver.set_phase(phase)
        try:
            return np.asarray(self.solver._call_pardiso(self.upper, rhs))
        except Exception as error:  # the wrapper's only error type is not exported
            code = getattr(error, "value", None)
            if code in (-4, -7):
                self.close()
                raise NotPositive from error
            raise SolveError(f"The direct solver stopped in phase {phase} with code {code}.") from error

    def solve(self, rhs: Array) -> Array:
        return self._call(33, np.asfortranarray(rhs)).reshape(rhs.shape)

    def close(self) -> None:
        self.solver.free_memory(everything=True)


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
            raise SolveError(
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
        if (self.factor.U.diagonal() <= 0).any():
            raise NotPositive

    def solve(self, rhs: Array) -> Array:
        return np.asarray(self.factor.solve(rhs))

    def close(self) -> None:
        del self.factor
