"""Faults that the tests provoke in a child process, to see that a chain of attempts survives them."""

from __future__ import annotations

import os
import signal
import subprocess
import time
from typing import Any


def provoke(job: dict[str, Any]) -> tuple[dict[str, Any], dict[str, Any]]:
    """Hang, crash, eat memory, or fail, as ``job["task"]`` says; anything else is an unknown task."""
    fault = job["task"]
    if fault == "fault:hang":
        while True:
            time.sleep(0.1)
    if fault == "fault:hang with grandchild":
        with subprocess.Popen(["sleep", job["sleep"]]) as grandchild:
            os.write(2, f"grandchild {grandchild.pid}\n".encode())
            grandchild.wait()
    if fault == "fault:crash":
        os.abort()
    if fault == "fault:killed":
        os.kill(os.getpid(), signal.SIGKILL)
    if fault == "fault:memory":
        hoard = []
        while True:
            hoard.append(bytearray(b"x") * (8 * 2**20))
            time.sleep(0.002)
    if fault == "fault:log":
        os.write(2, b"Error   : the kernel said so\n")
        raise RuntimeError("provoked")
    raise ValueError(f"unknown task {fault!r}")
