"""Faults that the tests provoke in a child process, to see that a chain of attempts survives them."""

from __future__ import annotations

import os
import subprocess
import time
from typing import Any


def provoke(fault: str) -> tuple[dict[str, Any], dict[str, Any]]:
    """Hang, hang with a grandchild, crash, eat memory, or fail; anything else is an unknown task."""
    if fault == "fault:hang":
        while True:
            time.sleep(0.1)
    if fault == "fault:hang in C":
        with subprocess.Popen(["sleep", "600"]) as grandchild:
            grandchild.wait()
    if fault == "fault:crash":
        os.abort()
    if fault == "fault:memory":
        hoard = []
        while True:
            hoard.append(bytes(8 * 2**20))
            time.sleep(0.002)
    if fault == "fault:log":
        os.write(2, b"Error   : the kernel said so\n")
        raise RuntimeError("provoked")
    raise ValueError(f"unknown task {fault!r}")
