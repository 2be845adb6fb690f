"""Ranges of work in a few threads, with results that do not depend on their number.

The ranges are fixed by the size of the problem alone. A kernel either writes only to rows of its own range, or gives
a sum that is added up in the order of the ranges; so one thread and ten give the same bits.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from functools import cache
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

T = TypeVar("T")
Range = tuple[int, int]
CHUNKS = 16
"""Ranges of work that writes to its own rows: enough that two to eight threads end together."""


@cache
def _pool(workers: int) -> ThreadPoolExecutor:
    return ThreadPoolExecutor(workers, thread_name_prefix="haunch-kernel")


def ranges(size: int, count: int = CHUNKS) -> list[Range]:
    """At most `count` ranges of about equal length that cover 0 to `size`; empty ones are left out."""
    edges = [size * k // count for k in range(count + 1)]
    return [(a, b) for a, b in itertools.pairwise(edges) if b > a]


def weighted_ranges(starts: NDArray[np.int32], count: int) -> list[Range]:
    """Ranges of rows with about equal numbers of entries; `starts` (rows + 1,) is a CSR row pointer."""
    rows = starts.size - 1
    inner = np.searchsorted(starts, np.linspace(0, int(starts[-1]), count + 1)[1:-1]).tolist()
    edges = [0, *sorted(min(edge, rows) for edge in inner), rows]
    return [(a, b) for a, b in itertools.pairwise(edges) if b > a]


def run(work: Callable[[int, int], T], parts: Sequence[Range], threads: int) -> list[T]:
    """``work(start, stop)`` of every range, in `threads` threads; results in the order of the ranges.

    The calling thread works too, and takes back what no other thread has begun, so that calls may be nested.
    """
    if threads <= 1 or len(parts) <= 1:
        return [work(*part) for part in parts]
    results: list[T | None] = [None] * len(parts)
    tickets = itertools.count()  # next() is one step of the interpreter: no lock is needed

    def serve() -> None:
        while (ticket := next(tickets)) < len(parts):
            results[ticket] = work(*parts[ticket])

    workers = min(threads, len(parts)) - 1
    helpers: list[Future[None]] = [_pool(workers).submit(serve) for _ in range(workers)]
    try:
        serve()
    finally:
        begun = [helper for helper in helpers if not helper.cancel()]
        errors = [helper.exception() for helper in begun]
    for error in errors:
        if error is not None:
            raise error
    return results  # type: ignore[return-value]  # every ticket was served
