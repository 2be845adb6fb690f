"""MKL PARDISO for symmetric matrices: the only place that touches MKL.

It is given the upper triangle (a full matrix with a symmetric type takes the process down), with the columns sorted
in each row and no row empty.
"""

from __future__ import annotations

import ctypes
import glob
import os
import sys
from functools import cache
from typing import Any

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from geometry.problem import SolveError

POSITIVE, INDEFINITE = 2, -2
"""Types of matrix: Cholesky, or L D L^T with Bunch-Kaufman pivots."""


@cache
def library() -> Any:
    """The loaded MKL, found by pypardiso; None without it."""
    os.environ.setdefault("KMP_BLOCKTIME", "0")  # or idle threads spin for 0.2 s and take the processor from others
    try:
        from pypardiso import PyPardisoSolver

        # the wrapper searches every folder below sys.prefix unless it is told; the package puts MKL here
        found = sorted(glob.glob(f"{glob.escape(sys.prefix)}/lib/libmkl_rt.so*"))
        told = os.environ.get("PYPARDISO_MKL_RT")
        if found and told is None:
            os.environ["PYPARDISO_MKL_RT"] = found[-1]
        try:
            return PyPardisoSolver(mtype=POSITIVE, size_limit_storage=0).libmkl
        finally:
            if found and told is None:
                del os.environ["PYPARDISO_MKL_RT"]
    except (ImportError, OSError, AttributeError):
        return None


class NotPositive(Exception):
    """The matrix has a pivot that is not positive."""


class Pardiso:
    """Analysis and factor of the upper triangle (n, n) of a symmetric matrix.

    Parameters
    ----------
    kind
        `POSITIVE` or `INDEFINITE`.
    single
        Factor and solve in single precision.

    Raises
    ------
    NotPositive
        When a pivot is not positive (kind `POSITIVE`), or the factor fails.
    SolveError
        When memory runs out.
    """

    def __init__(self, upper: sp.csr_matrix, threads: int, kind: int = POSITIVE, single: bool = False) -> None:
        self.size = upper.shape[0]
        self._lib = library()
        self._threads, self._kind = threads, kind
        self._dtype = np.dtype(np.float32 if single else np.float64)
        self._data = np.ascontiguousarray(upper.data, dtype=self._dtype)
        self._starts = np.ascontiguousarray(upper.indptr, dtype=np.int32)
        self._columns = np.ascontiguousarray(upper.indices, dtype=np.int32)
        self._pt = np.zeros(64, dtype=np.int64)
        self.iparm = np.zeros(64, dtype=np.int32)
        self.iparm[0], self.iparm[1] = 1, 2  # own settings, nested dissection
        self.iparm[27], self.iparm[34] = int(single), 1  # precision; indices begin at 0
        if kind == POSITIVE:
            # the rows of a node are alike: stored and ordered as blocks, they take half the analysis and less memory
            self.iparm[23], self.iparm[36] = 1, -80
        else:
            self.iparm[9], self.iparm[10], self.iparm[12], self.iparm[20] = 8, 1, 1, 1

    def analyse(self) -> float:
        """Ordering and symbolic factor; gives the MiB that the numerical factor will take at its peak."""
        self._call(11, self._nothing(), self._nothing())
        return max(int(self.iparm[14]), int(self.iparm[15]) + int(self.iparm[16])) / 1024

    def factorise(self) -> None:
        self._call(22, self._nothing(), self._nothing())

    def solve(self, rhs: NDArray[Any]) -> NDArray[Any]:
        """(n, k) solutions of right-hand sides (n, k), in the factor's precision."""
        b = np.asfortranarray(rhs, dtype=self._dtype)
        x = np.empty_like(b, order="F")
        self._call(33, b, x)
        return x

    def close(self) -> None:
        """Give the memory back."""
        if self._pt.any():
            self._call(-1, self._nothing(), self._nothing())
            self._pt[:] = 0

    def _nothing(self) -> NDArray[Any]:
        return np.zeros((1, 1), dtype=self._dtype, order="F")

    def _call(self, phase: int, b: NDArray[Any], x: NDArray[Any]) -> None:
        def number(value: int) -> Any:
            return ctypes.byref(ctypes.c_int32(value))

        def pointer(array: NDArray[Any]) -> Any:
            return ctypes.c_void_p(array.ctypes.data)

        self._lib.MKL_Set_Num_Threads(ctypes.c_int(self._threads))
        error = ctypes.c_int32(0)
        call = ctypes.CFUNCTYPE(None, *[ctypes.c_void_p] * 16)(("pardiso", self._lib))
        call(
            pointer(self._pt), number(1), number(1), number(self._kind), number(phase), number(self.size),
            pointer(self._data), pointer(self._starts), pointer(self._columns), pointer(np.zeros(1, dtype=np.int32)),
            number(x.shape[1]), pointer(self.iparm), number(0), pointer(b), pointer(x), ctypes.byref(error),
        )  # fmt: skip
        if error.value in (-4, -7):
            self.close()
            raise NotPositive
        if error.value == -2:
            self.close()
            raise SolveError(f"The direct solver ran out of memory with {self.size} unknowns. Use a coarser accuracy.")
        if error.value:
            raise SolveError(f"The direct solver stopped in phase {phase} with code {error.value}.")
