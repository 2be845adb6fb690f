"""The owner's side of a template process: started when first wanted, started anew when it was lost."""

from __future__ import annotations

import atexit
import os
import socket
import subprocess
import sys
import threading
from collections.abc import Callable, Mapping
from itertools import count
from pathlib import Path
from typing import Any

from geometry.process.job import Job
from geometry.process.lent import LentTemplate
from geometry.process.submit import kill_client, submit


class Template:
    """A process that has loaded `module` (see `geometry.process.template`) and copies itself for every job.

    Any thread may use it, and jobs may run side by side. It ends with this process, with `close`, and never by itself.

    Parameters
    ----------
    folder
        This process's own, with what its jobs leave behind: removed by the template when this process has ended without
        doing so.
    """

    def __init__(self, module: str, folder: str | Path = "") -> None:
        self.module, self._folder = module, str(folder)
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
                [sys.executable, "-P", "-m", "geometry.process.template", self.module, self._folder],
                stdin=theirs.fileno(), stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
                env={**os.environ, **single, "PYTHONPATH": path}, start_new_session=True,
            )
        self._control = ours
        return ours, self._process

    def submit(self, job: Mapping[str, Any], cancelled: Callable[[], bool] = lambda: False, client: str = "") -> Job:
        """Start a job and wait until its process is there, or until `cancelled`.

        Raises
        ------
        TemplateFailure
            The template ended or did not answer (the next call starts it anew), or the call was cancelled.
        """
        return submit(self.module, client, next(self._numbers), job, self._send, cancelled)

    def _send(self, message: bytes, handles: list[int]) -> tuple[socket.socket, Callable[[], int | None]]:
        with self._lock:
            control, process = self._start()
            socket.send_fds(control, [message], handles)
        return control, process.poll

    def lend(self) -> tuple[socket.socket, Callable[[], int | None]]:
        """A copy of this end of the socket for a process of one's own (see `LentTemplate`), and how the template that
        it leads to has ended, None while it lives. Starts the template when it is not there."""
        with self._lock:
            control, process = self._start()
            return control.dup(), process.poll

    def kill_client(self, client: str) -> None:
        """End every job of a client."""
        with self._lock:
            if self._control is not None:
                kill_client(self._control, client)

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


_shared: dict[str, Template] = {}
_lent: dict[str, LentTemplate] = {}
_sharing = threading.Lock()


def shared_template(module: str) -> Template | LentTemplate:
    """This process's template for `module`, so that a sweep loads each kernel once."""
    with _sharing:
        if module in _lent:
            return _lent[module]
        if module not in _shared:
            _shared[module] = Template(module)
        return _shared[module]


def share_lent(template: LentTemplate) -> None:
    """Let this process, which is a job itself, use a template that was lent to it as its own for that module."""
    with _sharing:
        _lent[template.module] = template


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
