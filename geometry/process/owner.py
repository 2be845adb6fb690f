"""The owner's side of a template process: started when first wanted, started anew when it was lost."""

from __future__ import annotations

import atexit
import json
import os
import select
import socket
import subprocess
import sys
import threading
import time
from collections.abc import Callable, Mapping
from contextlib import suppress
from itertools import count
from pathlib import Path
from typing import Any

from geometry.process.job import Job, TemplateFailure
from geometry.process.template import LONGEST_MESSAGE, NUMBER

SLOWEST_START = 300.0
"""Seconds for a template to load its kernel, on a busy machine with cold disks."""


class Template:
    """A process that has loaded `module` (see `geometry.process.template`) and copies itself for every job.

    Any thread may use it, and jobs may run side by side. It ends with this process, with `close`, and never by itself.
    """

    def __init__(self, module: str) -> None:
        self.module = module
        self._lock = threading.Lock()
        self._process: subprocess.Popen[bytes] | None = None
        self._control: socket.socket | None = None
        self._numbers = count(1)

    @property
    def pid(self) -> int | None:
        """Process id of the template; None when it is not there."""
        return None if self._process is None or self._process.poll() is not None else self._process.pid

    def start(self) -> None:
        """Begin to load it, without waiting. Does nothing when it is there."""
        with self._lock:
            self._start()

    def _start(self) -> tuple[socket.socket, subprocess.Popen[bytes]]:
        if self._control is not None and self._process is not None and self._process.poll() is None:
            return self._control, self._process
        self._end()
        ours, theirs = socket.socketpair(socket.AF_UNIX, socket.SOCK_SEQPACKET)
        root = str(Path(__file__).resolve().parents[2])
        path = os.pathsep.join(p for p in (root, os.environ.get("PYTHONPATH", "")) if p)
        # One thread: parallel mesh algorithms do not give the same mesh twice, and only a process of one thread
        # can be copied safely.
        single = dict.fromkeys(("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"), "1")
        with theirs:
            self._process = subprocess.Popen(
                [sys.executable, "-P", "-m", "geometry.process.template", self.module],
                stdin=theirs.fileno(), stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
                env={**os.environ, **single, "PYTHONPATH": path}, start_new_session=True,
            )
        self._control = ours
        return ours, self._process

    def submit(self, job: Mapping[str, Any], cancelled: Callable[[], bool] = lambda: False) -> Job:
        """Start a job and wait until its process is there, or until `cancelled`.

        Raises
        ------
        TemplateFailure
            The template ended or did not answer (the next call starts it anew), or the call was cancelled.
        """
        number = next(self._numbers)
        message = json.dumps({"do": "start", "number": number, "job": dict(job)}).encode()
        if len(message) > LONGEST_MESSAGE:
            raise ValueError(f"a job's order has {len(message)} bytes, at most {LONGEST_MESSAGE}: send it as data")
        data, theirs = socket.socketpair(socket.AF_UNIX, socket.SOCK_STREAM)
        status, told = os.pipe()
        control = None
        try:
            with theirs:
                try:
                    with self._lock:
                        control, process = self._start()
                        socket.send_fds(control, [message], [theirs.fileno(), told])
                finally:
                    os.close(told)
            pid = _pid(status, process, cancelled)
        except BaseException as error:
            if control is not None:
                self._kill(control, number)  # it may be started yet
            data.close()
            os.close(status)
            if isinstance(error, OSError):
                raise TemplateFailure(f"the process for {self.module} could not be used ({error})", None) from error
            raise
        return Job(pid, data, status, lambda: self._kill(control, number), process.poll)

    def _kill(self, control: socket.socket, number: int) -> None:
        with suppress(OSError):  # gone, and the job with it
            control.send(json.dumps({"do": "kill", "number": number}).encode())

    def close(self) -> None:
        """End the template and its jobs; the next job starts it anew."""
        with self._lock:
            self._end()

    def _end(self) -> None:
        if self._control is not None:
            self._control.close()
        if self._process is not None:
            self._process.kill()  # its jobs are ended by the system together with it
            self._process.wait()
        self._control = self._process = None

    def _forget(self) -> None:
        """In a copy of this process: the template is the original's. An open end here would keep it alive."""
        if self._control is not None:
            self._control.close()
        self._lock = threading.Lock()
        self._control = self._process = None


def _pid(status: int, process: subprocess.Popen[bytes], cancelled: Callable[[], bool]) -> int:
    deadline = time.monotonic() + SLOWEST_START
    while not select.select([status], [], [], 0.05)[0]:
        if cancelled():
            raise TemplateFailure("cancelled", None)
        if time.monotonic() > deadline:
            raise TemplateFailure(f"a kernel was not loaded within {SLOWEST_START:g} s", None)
    told = os.read(status, NUMBER)
    if len(told) < NUMBER:
        with suppress(subprocess.TimeoutExpired):
            process.wait(5.0)
        raise TemplateFailure("the process that loads a kernel has ended", process.returncode)
    return int.from_bytes(told, "big", signed=True)


_shared: dict[str, Template] = {}
_sharing = threading.Lock()


def shared_template(module: str) -> Template:
    """This process's template for `module`, so that a sweep loads each kernel once."""
    with _sharing:
        if module not in _shared:
            _shared[module] = Template(module)
        return _shared[module]


@atexit.register
def close_all() -> None:
    """End every shared template."""
    for template in list(_shared.values()):
        template.close()


def _forget_all() -> None:
    global _sharing
    _sharing = threading.Lock()
    for template in _shared.values():
        template._forget()


os.register_at_fork(after_in_child=_forget_all)
