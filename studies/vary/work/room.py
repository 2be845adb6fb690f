"""The host's own folder for what its jobs keep for a moment. Those that killed hosts have left are removed."""

from __future__ import annotations

import fcntl
import os
import shutil
import tempfile
import time
from contextlib import suppress
from pathlib import Path

from geometry.problem import RunError

PREFIX, MARK = "haunch-study-", "in-use"
LEAST_FREE = 1 << 20
"""Bytes; a disk with less is called full."""
_YOUNG = 60.0
"""Seconds in which a folder may still be without its mark."""


class Room:
    """A folder with one in it for each job."""

    def __init__(self) -> None:
        remove_stale()
        try:
            self.path = Path(tempfile.mkdtemp(prefix=PREFIX))
            self._mark = os.open(self.path / MARK, os.O_WRONLY | os.O_CREAT, 0o600)
        except OSError as error:
            raise RunError("write", f"no temporary files can be written in {tempfile.gettempdir()} ({error.strerror}): "
                                    "free some space, or name another folder in TMPDIR") from error
        with suppress(OSError):  # a file system without locks
            fcntl.flock(self._mark, fcntl.LOCK_EX | fcntl.LOCK_NB)

    def close(self) -> None:
        """Remove everything."""
        remove(self.path)
        os.close(self._mark)


def is_full(path: Path | str) -> bool:
    """Whether the disk of a folder is full."""
    try:
        return shutil.disk_usage(path).free < LEAST_FREE
    except OSError:
        return False


def remove(path: Path) -> None:
    """Remove a folder, also while a process that is just being killed still writes to it."""
    for _ in range(50):
        shutil.rmtree(path, ignore_errors=True)
        if not path.exists():
            return
        time.sleep(0.02)


def remove_stale() -> None:
    """Remove this user's folders whose host has gone."""
    for path in Path(tempfile.gettempdir()).glob(f"{PREFIX}*"):
        with suppress(OSError):
            about = path.lstat()
            if path.is_symlink() or not path.is_dir() or about.st_uid != os.getuid():
                continue
            if not (path / MARK).exists():
                if time.time() - about.st_mtime > _YOUNG:
                    remove(path)
                continue
            mark = os.open(path / MARK, os.O_RDONLY | os.O_NOFOLLOW)
            try:
                fcntl.flock(mark, fcntl.LOCK_EX | fcntl.LOCK_NB)
                remove(path)
            finally:
                os.close(mark)
