"""One job in a copy of a template process, seen from the caller."""

from __future__ import annotations

import os
import select
import socket
import time
from collections.abc import Callable
from contextlib import suppress

from geometry.endings import ended_from_outside
from geometry.process.template import NUMBER


class TemplateFailure(Exception):
    """The template process did not start a job; `code` is how it ended (None: it did not answer in time)."""

    def __init__(self, message: str, code: int | None) -> None:
        super().__init__(message)
        self.code = code


class Job:
    """A job under way. Use as a context manager: leaving it ends the job's process and all that it started.

    Attributes
    ----------
    pid
        Process id.
    data
        Stream socket to the job; at its end the job is over or has closed it.
    seconds
        Processor time that it took, known after its end (0 where it ended with its template).
    """

    def __init__(self, pid: int, data: socket.socket, status: int, kill: Callable[[], None],
                 template_ended: Callable[[], int | None]) -> None:
        self.pid, self.data, self.seconds = pid, data, 0.0
        self._status, self._kill, self._template_ended = status, kill, template_ended
        self._code: int | None = None
        self._closed_early = False

    def __enter__(self) -> Job:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def wait(self, seconds: float) -> int | None:
        """Exit status (-signal when ended by one), or None when the job is still at work after `seconds`."""
        if self._code is None and select.select([self._status], [], [], max(seconds, 0.0))[0]:
            told = os.read(self._status, 2 * NUMBER)
            if len(told) == 2 * NUMBER:
                self._code = int.from_bytes(told[:NUMBER], "big", signed=True)
                self.seconds = 1e-6 * int.from_bytes(told[NUMBER:], "big")
            else:  # the template is gone and has taken the job along
                self._code = self._with_template()
        return self._code

    def _with_template(self) -> int:
        deadline = time.monotonic() + 5.0
        while (code := self._template_ended()) is None and time.monotonic() < deadline:
            time.sleep(0.01)
        return code if code is not None and code != 0 else -9

    def ended_by(self) -> str:
        """The signal by which it was ended from outside, not by `close`; empty where it was not."""
        return "" if self._code is None or self._closed_early else ended_from_outside(self._code)

    def resident(self) -> float:
        """Resident memory of the job, MiB; 0 where the system does not tell."""
        try:
            with open(f"/proc/{self.pid}/statm", encoding="ascii") as stat:
                return int(stat.read().split()[1]) * os.sysconf("SC_PAGE_SIZE") / 2**20
        except (OSError, IndexError, ValueError):
            return 0.0

    def close(self) -> None:
        """End the job in any case."""
        if self._status < 0:
            return
        with suppress(OSError):
            self.data.close()
        if self.wait(0.0) is None:
            self._closed_early = True
            self._kill()
            self.wait(10.0)
        os.close(self._status)
        self._status = -1
