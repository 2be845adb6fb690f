"""Dense products in one thread.

Both models make thousands of small dense products. NumPy and SciPy hand each of them to all cores, whose threads then
spin while they wait for one another: the beam model of a rail under a travelling load took 7.3 s of processor time so,
and 3.6 s in one thread, on two cores. What is worth several threads has them from `Budget` (MKL's factor, the compiled
kernels), not from here.
"""

from __future__ import annotations

from contextlib import AbstractContextManager
from typing import Any


def dense_products_in_one_thread() -> AbstractContextManager[Any]:
    """While it is left open, OpenBLAS works in one thread; MKL is left alone. Covers the libraries that are loaded."""
    from threadpoolctl import ThreadpoolController

    limit: AbstractContextManager[Any] = ThreadpoolController().select(internal_api="openblas").limit(limits=1)
    return limit
