"""Sending a job to a template, over its owner's end of the socket or a lent copy of it."""

from __future__ import annotations

import json
import os
import select
import socket
import time
from collections.abc import Callable, Mapping
from contextlib import suppress
from typing import Any

from geometry.process.job import Job, TemplateFailure
from geometry.process.template import LONGEST_MESSAGE, NUMBER

SLOWEST_START = 300.0
"""Seconds for a template to load its kernel, on a busy machine with cold disks."""

Ended = Callable[[], int | None]
"""How the template ended, None while it lives."""


def submit(module: str, client: str, number: int, job: Mapping[str, Any],
           send: Callable[[bytes, list[int]], tuple[socket.socket, Ended]], cancelled: Callable[[], bool]) -> Job:
    """Start a job and wait until its process is there, or until `cancelled`.

    Parameters
    ----------
    client, number
        Together the name of the job at the template.
    send
        Sends a message with descriptors, and gives the socket by which the job can be ended.

    Raises
    ------
    TemplateFailure
        The template ended or did not answer, or the call was cancelled.
    """
    message = json.dumps({"do": "start", "client": client, "number": number, "job": dict(job)}).encode()
    if len(message) > LONGEST_MESSAGE:
        raise ValueError(f"a job's order has {len(message)} bytes, at most {LONGEST_MESSAGE}: send it as data")
    data, theirs = socket.socketpair(socket.AF_UNIX, socket.SOCK_STREAM)
    status, told = os.pipe()
    control = None
    try:
        with theirs:
            try:
                control, ended = send(message, [theirs.fileno(), told])
            finally:
                os.close(told)
        pid = _pid(status, ended, cancelled)
    except BaseException as error:
        if control is not None:
            kill(control, client, number)  # it may be started yet
        data.close()
        os.close(status)
        if isinstance(error, OSError):
            raise TemplateFailure(f"the process for {module} could not be used ({error})", None) from error
        raise
    return Job(pid, data, status, lambda: kill(control, client, number), ended)


def kill(control: socket.socket, client: str, number: int) -> None:
    """End one job."""
    with suppress(OSError):  # gone, and the job with it
        control.send(json.dumps({"do": "kill", "client": client, "number": number}).encode())


def kill_client(control: socket.socket, client: str) -> None:
    """End every job of a client."""
    with suppress(OSError):
        control.send(json.dumps({"do": "kill client", "client": client}).encode())


def _pid(status: int, ended: Ended, cancelled: Callable[[], bool]) -> int:
    deadline = time.monotonic() + SLOWEST_START
    while not select.select([status], [], [], 0.05)[0]:
        if cancelled():
            raise TemplateFailure("cancelled", None)
        if time.monotonic() > deadline:
            raise TemplateFailure(f"a kernel was not loaded within {SLOWEST_START:g} s", None)
    told = os.read(status, NUMBER)
    if len(told) < NUMBER:
        deadline = time.monotonic() + 5.0
        while ended() is None and time.monotonic() < deadline:
            time.sleep(0.01)
        raise TemplateFailure("the process that loads a kernel has ended", ended())
    return int.from_bytes(told, "big", signed=True)
