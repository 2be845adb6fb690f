"""A template that belongs to another process, which has lent a copy of its end of the socket."""

from __future__ import annotations

import select
import signal
import socket
import threading
from collections.abc import Callable, Mapping
from itertools import count
from typing import Any

from geometry.process.job import Job
from geometry.process.submit import submit


class LentTemplate:
    """Used as a `Template` is; the owner starts and ends the process, and can end all jobs of `client` at once.

    Attributes
    ----------
    jobs
        Every job that was started.
    """

    def __init__(self, module: str, control: socket.socket, client: str) -> None:
        self.module, self.client = module, client
        self.jobs: list[Job] = []
        self._control, self._lock, self._numbers = control, threading.Lock(), count(1)

    @property
    def lost(self) -> bool:
        """Whether the template has ended."""
        poll = select.poll()
        poll.register(self._control, 0)
        return bool(poll.poll(0))

    def start(self) -> None:
        """Nothing: the owner has."""

    def submit(self, job: Mapping[str, Any], cancelled: Callable[[], bool] = lambda: False) -> Job:
        """See `geometry.process.submit.submit`."""
        started = submit(self.module, self.client, next(self._numbers), job, self._send, cancelled)
        self.jobs.append(started)
        return started

    def _send(self, message: bytes, handles: list[int]) -> tuple[socket.socket, Callable[[], int | None]]:
        with self._lock:
            socket.send_fds(self._control, [message], handles)
        # The owner alone is told how it ended.
        return self._control, lambda: -signal.SIGKILL if self.lost else None
