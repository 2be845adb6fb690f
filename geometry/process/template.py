"""The template process: ``python -m geometry.process.template MODULE [FOLDER]``.

MODULE has ``prepare()``, which loads what every job needs, and ``serve(order, data)``, which does one job: `order` is
what the caller asked for (JSON), `data` a stream socket to the caller. The template itself has one thread and does
nothing but wait, so that a copy of it is a sound process.

Standard input is a socket of messages from the owner, or from a process that it lent its end to: ``start`` (with the
job's data socket and the pipe for what becomes of it), ``kill`` and ``kill client`` (all jobs of one such process). Its
end means that the owner is gone; then every job is ended, the owner's FOLDER removed, and the template ends too.
"""

from __future__ import annotations

import contextlib
import ctypes
import gc
import json
import os
import select
import signal
import socket
import sys
import traceback
from dataclasses import dataclass, field
from importlib import import_module
from types import ModuleType
from typing import Any

LONGEST_MESSAGE = 1 << 16
NUMBER = 8
"""Bytes of a number in the status pipe: the process id at once; at the end the exit status, and the microseconds of
processor time that the job took."""


@dataclass(slots=True)
class _Jobs:
    """Jobs under way: client and number -> process id, and the pipe that hears of its end."""

    running: dict[tuple[str, int], tuple[int, int]] = field(default_factory=dict)

    def kill(self, client: str, number: int | None) -> None:
        """End one job of a client, or with None all of them."""
        for (whose, which), (pid, _) in self.running.items():
            if whose == client and number in (None, which):
                _kill_session(pid)

    def reap(self) -> None:
        """Tell the ends of those that have ended. What a job has started and left behind is killed."""
        for name, (pid, status) in list(self.running.items()):
            if os.waitid(os.P_PID, pid, os.WEXITED | os.WNOHANG | os.WNOWAIT) is None:
                continue
            _kill_session(pid)  # before the process is reaped: until then its number is nobody else's
            _, code, used = os.wait4(pid, 0)
            del self.running[name]
            numbers = os.waitstatus_to_exitcode(code), round(1e6 * (used.ru_utime + used.ru_stime))
            with contextlib.suppress(OSError):  # nobody may be listening any more
                os.write(status, b"".join(n.to_bytes(NUMBER, "big", signed=True) for n in numbers))
            os.close(status)

    def end(self) -> None:
        for pid, _ in self.running.values():
            _kill_session(pid)


def _kill_session(pid: int) -> None:
    for kill in (os.killpg, os.kill):  # the second one where the job has not opened its session yet
        with contextlib.suppress(ProcessLookupError, PermissionError):
            kill(pid, signal.SIGKILL)


def main(name: str, folder: str = "") -> int:
    control = socket.socket(fileno=os.dup(0))
    nothing = os.open(os.devnull, os.O_RDWR)
    os.dup2(nothing, 0)
    module = import_module(name)
    with contextlib.suppress(Exception):  # a job will meet the same fault again, and tell it
        module.prepare()
    gc.collect()
    gc.freeze()  # or the first collection in a job would write to, and so copy, every page of what is loaded
    woken, wake = os.pipe()
    for end in (woken, wake):
        os.set_blocking(end, False)
    signal.signal(signal.SIGCHLD, lambda *_: None)
    signal.set_wakeup_fd(wake, warn_on_full_buffer=False)
    jobs = _Jobs()
    while True:
        ready, _, _ = select.select([control.fileno(), woken], [], [])
        if woken in ready:
            with contextlib.suppress(BlockingIOError):
                os.read(woken, 4096)
            jobs.reap()
        if control.fileno() in ready:
            message, handles, _, _ = socket.recv_fds(control, LONGEST_MESSAGE, 2)
            if not message:
                jobs.end()
                _remove(folder)
                return 0
            order: dict[str, Any] = json.loads(message)
            if order["do"] == "kill":
                jobs.kill(order["client"], order["number"])
            elif order["do"] == "kill client":
                jobs.kill(order["client"], None)
            else:
                data, status = handles
                _start(module, order, data, status, jobs, (control.fileno(), woken, wake))


def _start(module: ModuleType, order: dict[str, Any], data: int, status: int, jobs: _Jobs, own: tuple[int, ...]
           ) -> None:
    template = os.getpid()
    pid = os.fork()
    if pid == 0:
        code = 70
        try:
            signal.set_wakeup_fd(-1)
            signal.signal(signal.SIGCHLD, signal.SIG_DFL)
            for handle in (*own, status, *(s for _, s in jobs.running.values())):
                os.close(handle)
            os.setsid()
            _end_with(template)
            with socket.socket(fileno=data) as stream:
                code = module.serve(order["job"], stream)
            sys.stdout.flush()
        except BaseException:  # noqa: BLE001 - nothing may return into the template's own loop
            traceback.print_exc()
        finally:
            os._exit(code)  # no teardown: the kernels' destructors have nothing left to do, and can crash
    os.close(data)
    jobs.running[order["client"], order["number"]] = (pid, status)
    with contextlib.suppress(OSError):
        os.write(status, pid.to_bytes(NUMBER, "big", signed=True))


def _remove(folder: str) -> None:
    """Remove the owner's folder, also while jobs that are just being ended still write to it."""
    if not folder:
        return
    import shutil
    import time

    for _ in range(50):
        shutil.rmtree(folder, ignore_errors=True)
        if not os.path.exists(folder):
            return
        time.sleep(0.02)


def _end_with(parent: int) -> None:
    """End when the template does, also while a kernel holds the interpreter's lock."""
    if sys.platform == "linux":
        ctypes.CDLL(None).prctl(1, signal.SIGKILL)  # 1: PR_SET_PDEATHSIG
    if os.getppid() != parent:
        os._exit(70)


if __name__ == "__main__":
    os._exit(main(*sys.argv[1:3]))
