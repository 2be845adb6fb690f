"""Nodal forces of loads and cases, kept as what the loads touch and made dense only for the cases that are worked on.

A travelling load is one load and one case a position: fifty of them on a large mesh would be fifty dense vectors each,
nearly all of them zeros.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.shape import Array

AT_ONCE = 7
"""Cases that are worked on together: with the known field that goes along they are what the iterative solver takes at
once, and arrays that are as long as the mesh stay few."""


def turns(cases: int) -> Iterator[slice]:
    """Slices of at most AT_ONCE cases."""
    for first in range(0, cases, AT_ONCE):
        yield slice(first, min(first + AT_ONCE, cases))


@dataclass(frozen=True, slots=True)
class NodalForces:
    """Forces of cases, N: sums of vectors (loads, 3 n) with factors (c, loads)."""

    vectors: sp.csr_matrix
    factors: Array

    def __len__(self) -> int:
        return self.factors.shape[0]

    def __getitem__(self, case: int) -> Array:
        """(n, 3) of one case."""
        return np.asarray(self.vectors.T @ self.factors[case]).reshape(-1, 3)

    def columns(self, cases: slice = slice(None)) -> Array:
        """(3 n, k) of some cases."""
        return np.asarray(self.vectors.T @ np.ascontiguousarray(self.factors[cases].T))

    def work(self, case: int, u: Array) -> float:
        """Of one case on the displacements u (3, n), N mm."""
        return float(self.factors[case] @ (self.vectors @ u.T.ravel()))


def rows_of(vectors: Iterable[tuple[NDArray[np.int64], Array]], size: int) -> sp.csr_matrix:
    """(k, 3 size) from the nodes (j,), each once, that every vector touches, and its forces (j, 3) there."""
    places, values, ends = [np.zeros(0, dtype=np.int64)], [np.zeros(0)], [0]
    for nodes, forces in vectors:
        places.append((3 * nodes[:, None] + np.arange(3)).ravel())
        values.append(np.array(forces, dtype=float).ravel())
        ends.append(ends[-1] + values[-1].size)
    shape = (len(ends) - 1, 3 * size)
    return sp.csr_matrix((np.concatenate(values), np.concatenate(places), np.array(ends)), shape=shape)
