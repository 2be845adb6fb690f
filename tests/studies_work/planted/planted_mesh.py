"""The real mesh template; the length of a part plants a fault."""

import errno
import os
import signal
import time

import mesher._worker as real
from mesher._worker import prepare, serve

__all__ = ["CRASHES", "CRASHES_ONCE", "FULL", "WAITS", "prepare", "serve"]
CRASHES, CRASHES_ONCE, WAITS, FULL = 61.0, 62.0, 63.0, 64.0
"""Lengths, mm: every attempt crashes; the first attempt crashes; never ends; finds the disk full."""
_HXT = 10
_do = real._do


def _planted(job, room):
    length = round(job.get("extent", 0.0), 6) if job["task"] == "solid" else 0.0
    first = bool(length) and job["options"]["Mesh.Algorithm3D"] == _HXT and job["options"]["Mesh.Algorithm"] == 6
    if length == CRASHES or (length == CRASHES_ONCE and first):
        os.kill(os.getpid(), signal.SIGSEGV)
    if length == WAITS:
        time.sleep(600)
    if length == FULL:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
    return _do(job, room)


real._do = _planted
