"""Memory of a solver before it is started."""

from __future__ import annotations

from fem.solid.block_matrix import BlockMatrix
from fem.solid.factor import TooLarge
from geometry.budget import Budget

_FACTOR_BYTES = 100.0
"""Bytes of a factor in single precision over unknowns^(4/3), the growth of a nested dissection in space (A. George
1973; Lipton, Rose and Tarjan 1979; from memory). Measured on linear elements, bulky: 85 at 55 488 unknowns."""
FACTORED = 30_000
"""Unknowns of the linear level up to which it is factored; above it is solved by aggregates, a twelfth of its size."""
AT_ONCE = 8
"""Right-hand sides that are iterated together; more are taken in turns."""


def multigrid_memory(K: BlockMatrix, coarse_unknowns: int, columns: int = AT_ONCE) -> float:
    """MiB that the iterative solver will take beside the matrix K itself, with `columns` right-hand sides at once."""
    n, blocks = K.indptr.size - 1, K.indices.size
    single = 36 * blocks
    inverses = 4 * 36 * n
    vectors = n * columns * (8 * 24 + 4 * 12 + 4 * 24)
    factored = coarse_unknowns if coarse_unknowns <= FACTORED else coarse_unknowns / 6
    coarse = 1200 * coarse_unknowns + _FACTOR_BYTES * factored ** (4 / 3)
    return float(single + inverses + vectors + coarse) / 2**20


def refuse_multigrid(K: BlockMatrix, coarse_unknowns: int, budget: Budget) -> None:
    """Raises `TooLarge` with the number when `multigrid_memory` is above the budget."""
    need = multigrid_memory(K, coarse_unknowns, 2)
    if need > budget.memory:
        raise TooLarge(
            f"The iterative solver needs about {need:.0f} MiB for {K.shape[0]} unknowns and the budget is "
            f"{budget.memory} MiB. Raise the memory, or ask for a coarser accuracy."
        )
