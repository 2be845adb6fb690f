"""Worker threads over child processes on this machine."""

from __future__ import annotations

import queue
import threading
from collections.abc import Sequence

from studies.vary.run.backend import Hear
from studies.vary.work import Host, Order


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
