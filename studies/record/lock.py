"""One driver a record: a lock beside it that the system gives up when its process ends, however it ends."""

from __future__ import annotations

import fcntl
import json
import os
import socket
import weakref
from datetime import datetime
from pathlib import Path

from studies.record.errors import RecordError, RecordHeldError

SUFFIX = ".lock"


class Lock:
    """The right to write the record `path`; held from `Lock(path)` to `release`.

    Raises `RecordHeldError` when another driver has it (in this process or another one), with its number, machine and
    time, and `RecordError` when there is no room or right for the lock file.
    """

    def __init__(self, path: Path) -> None:
        self.path = path.with_name(path.name + SUFFIX)
        self.descriptor = -1
        try:
            while not self._taken(path):
                pass
        except OSError as error:
            raise RecordError(f"cannot write beside the record {path}: {error.strerror}; make the folder "
                              f"{path.parent} writable, or choose another --record") from error
        _LOCKS.add(self)

    def _taken(self, record: Path) -> bool:
        """Open and lock the file; False when it was removed by its last holder meanwhile."""
        descriptor = os.open(self.path, os.O_RDWR | os.O_CREAT | os.O_NOFOLLOW, 0o644)
        try:
            fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
            ours, there = os.fstat(descriptor), self.path.stat()
            if (ours.st_ino, ours.st_dev) != (there.st_ino, there.st_dev):
                os.close(descriptor)
                return False
            holder = {"pid": os.getpid(), "host": socket.gethostname(),
                      "since": datetime.now().astimezone().isoformat(" ", "seconds")}
            os.ftruncate(descriptor, 0)
            os.pwrite(descriptor, json.dumps(holder).encode(), 0)
        except BlockingIOError as error:
            told = _holder(descriptor)
            os.close(descriptor)
            raise RecordHeldError(f"the record {record} is being written by another driver ({told}), and one record "
                                  "has one driver. Wait for it, stop it, or give this study a --record of its own"
                                  ) from error
        except FileNotFoundError:
            os.close(descriptor)
            return False
        except OSError:
            os.close(descriptor)
            raise
        self.descriptor = descriptor
        return True

    def release(self) -> None:
        """Give the lock up and remove its file."""
        if self.descriptor >= 0:
            self.path.unlink(missing_ok=True)  # while still held: nobody else's file is removed
            os.close(self.descriptor)
            self.descriptor = -1

    def _let_go_in_child(self) -> None:
        """A forked child shares the lock, and would keep it when its parent has died."""
        if self.descriptor >= 0:
            os.close(self.descriptor)
            self.descriptor = -1


def _holder(descriptor: int) -> str:
    try:
        found = json.loads(os.pread(descriptor, 4096, 0))
        return f"process {found['pid']} on {found['host']}, since {found['since']}"
    except (OSError, ValueError, KeyError, TypeError):
        return "just started"


_LOCKS: weakref.WeakSet[Lock] = weakref.WeakSet()


def _after_fork() -> None:
    for lock in list(_LOCKS):
        lock._let_go_in_child()


os.register_at_fork(after_in_child=_after_fork)
