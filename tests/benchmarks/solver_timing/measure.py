"""What is measured in the child: peak memory, the memory's bandwidth, samples of an answer."""

from __future__ import annotations

import resource
import time
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
SAMPLE = 200
"""Nodes at which the answers are compared."""


class Clock:
    """Seconds on the wall, and of the processor by all threads of this process, since it was made."""

    def __init__(self) -> None:
        self._wall, self._processor = time.perf_counter(), time.process_time()

    def read(self) -> tuple[float, float]:
        return time.perf_counter() - self._wall, time.process_time() - self._processor


class PeakMemory:
    """Most resident memory since it was made, above what there was then, MiB.

    On Linux the system's mark is set back first, so that what was needed earlier (imports, a mesh being read) does not
    count; elsewhere it is the peak of the whole process less what was resident.
    """

    def __init__(self) -> None:
        try:
            with open("/proc/self/clear_refs", "w", encoding="ascii") as file:
                file.write("5")
        except OSError:
            pass
        self.before = self._status("VmRSS:") or self._peak()

    @staticmethod
    def _status(word: str) -> float:
        try:
            with open("/proc/self/status", encoding="ascii") as file:
                return next(float(line.split()[1]) / 1024 for line in file if line.startswith(word))
        except (OSError, StopIteration):
            return 0.0

    def _peak(self) -> float:
        return self._status("VmHWM:") or resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024

    def now(self) -> float:
        """MiB so far."""
        return self._peak() - self.before


def triad_rate(threads: int, length: int = 8_000_000) -> float:
    """Bytes per second that `threads` threads move in a = b + s c (24 bytes an entry), the best of several tries.

    Pieces of 16 000 entries stay in the cache between the product and the sum, so each vector passes memory once.
    """
    piece = 16_000
    b, c, a = np.ones(length), np.ones(length), np.zeros(length)

    def run(part: slice) -> None:
        work = np.empty(piece)
        for start in range(part.start, part.stop, piece):
            stop = min(start + piece, part.stop)
            room = work[: stop - start]
            np.multiply(c[start:stop], 3.0, out=room)
            np.add(b[start:stop], room, out=a[start:stop])

    edges = np.linspace(0, length, threads + 1).astype(int)
    parts = [slice(int(i), int(j)) for i, j in zip(edges, edges[1:], strict=False)]
    best = np.inf
    with ThreadPoolExecutor(threads) as pool:
        for _ in range(7):
            begun = time.perf_counter()
            list(pool.map(run, parts))
            best = min(best, time.perf_counter() - begun)
    return 24.0 * length / best


def answer(u: Array, end_nodes: NDArray[np.int64]) -> dict[str, Any]:
    """Facts of displacements u (3, n), mm: the mean at the end's nodes, the largest, and a sample of all."""
    nodes = np.linspace(0, u.shape[1] - 1, SAMPLE).astype(int)
    return {
        "tip": u[:, end_nodes].mean(axis=1).tolist(),
        "largest": float(np.abs(u).max()),
        "sample": u[:, nodes].ravel().tolist(),
    }
