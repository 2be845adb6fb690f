"""Worker threads over child processes on this machine."""

from __future__ import annotations

import os
import queue
import subprocess
import sys
import threading
from collections.abc import Callable, Sequence
from contextlib import suppress
from pathlib import Path

from studies.vary.run.backend import Hear
from studies.vary.work import Host, Order


def compile_kernels(tell: Callable[[str], None]) -> None:
    """Compile the solver's kernels where that has not been done on this machine, in a process of its own: a minute,
    once, and told before it begins. Where it fails the first variants compile them."""
    from fem.solid.kernels.cache import is_warm

    if is_warm():
        return
    tell("preparing the solver's kernels: about a minute, once")
    root = str(Path(__file__).resolve().parents[3])
    path = os.pathsep.join(p for p in (root, os.environ.get("PYTHONPATH", "")) if p)
    with suppress(subprocess.TimeoutExpired):
        subprocess.run([sys.executable, "-c", "from fem.solid.kernels.warm import warm_up; warm_up(lambda text: None)"],
                       env={**os.environ, "PYTHONPATH": path}, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
                       timeout=600, check=False)


class LocalBackend:
    """A `Backend` of `workers` threads, each with one group at a time in the host's child processes."""

    writes_here = True

    def __init__(self, workers: int, memory: int) -> None:
        self.slots = workers
        self._host = Host(workers, memory)
        self._host.__enter__()
        self._waiting: queue.SimpleQueue[tuple[Sequence[Order], Hear] | None] = queue.SimpleQueue()
        self._closed = False
        self._threads = [threading.Thread(target=self._work, name=f"worker {k + 1}", daemon=True)
                         for k in range(workers)]
        for thread in self._threads:
            thread.start()

    def submit(self, orders: Sequence[Order], hear: Hear) -> None:
        """See `Backend`."""
        self._waiting.put((orders, hear))

    def _work(self) -> None:
        while (item := self._waiting.get()) is not None:
            orders, hear = item
            told = 0
            try:
                for told, end in enumerate(self._host.evaluate_group(orders), 1):
                    if not self._closed:
                        hear(told - 1, end)
            except BaseException as error:  # noqa: BLE001 - the driver raises it in its own thread
                for place in range(told, len(orders)):
                    if not self._closed:
                        hear(place, error)

    def close(self) -> None:
        """See `Backend`."""
        self._closed = True
        for _ in self._threads:
            self._waiting.put(None)
        self._host.__exit__(None, None, None)
        for thread in self._threads:
            thread.join(10.0)
