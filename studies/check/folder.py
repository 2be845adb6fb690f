"""The run folder: whole or not there.

Everything is written to a folder in a hidden sibling, which takes the run folder's name in one step at the end. A
process that is killed leaves its sibling behind; the next run to the same folder removes it.
"""

from __future__ import annotations

import fcntl
import os
import re
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from geometry.problem import RunError

RESULT = "result.json"
SUFFIX, MARK, RUN = ".partial", "haunch-unfinished", "run"
"""Of the hidden sibling; a file in it that its process holds locked while it lives; the run folder to be, in it."""


def refuse_existing(out: Path, replace: bool) -> None:
    """Raise `RunError` when `out` may not be written. Asked before the work, not after it."""
    if out.parent.exists() and not out.parent.is_dir():
        raise RunError("write", f"{out.parent} is a file, not a folder: choose another --out")
    if not out.parent.is_dir():
        raise RunError("write", f"the folder {out.parent} does not exist: make it, or choose another --out")
    if not out.exists() and not out.is_symlink():
        _scratch(out, SUFFIX).rmdir()  # a folder that cannot be written in is told now
        return
    finished = out.is_dir() and (out / RESULT).is_file()
    empty = out.is_dir() and not any(out.iterdir())
    if not finished and not empty:
        raise RunError("write", f"{out} exists and is not a run folder, so it is never replaced: choose another --out")
    if finished and not replace:
        raise RunError("write", f"the run folder {out} exists already, and a finished run is not overwritten unasked.\n"
                                f"  1. keep both: --out {_free_name(out)}\n"
                                "  2. overwrite it: --replace\n"
                                f"  3. look at it: haunch show {out}")


def _free_name(out: Path) -> Path:
    number = 2
    while (candidate := out.with_name(f"{out.stem}-{number}{out.suffix}")).exists():
        number += 1
    return candidate


@contextmanager
def run_folder(out: Path, replace: bool) -> Iterator[Path]:
    """A temporary folder beside `out` that becomes `out` when the block ends well, and vanishes otherwise."""
    scratch = _scratch(out, SUFFIX)
    mark = -1
    try:
        mark = _marked(scratch)
        room = scratch / RUN
        room.mkdir()
        yield room
        room.chmod(0o755)
        _put_in_place(room, out, replace)
    except OSError as error:
        raise RunError("write", f"cannot write the run folder {out}: {error.strerror or error}") from error
    finally:
        shutil.rmtree(scratch, ignore_errors=True)
        if mark >= 0:
            os.close(mark)


def _marked(scratch: Path) -> int:
    """Put the mark in a folder; returns its descriptor, whose lock the system gives up when this process ends."""
    early = scratch / f"{MARK}.new"
    mark = os.open(early, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o600)
    with suppress(OSError):  # a file system without locks
        fcntl.flock(mark, fcntl.LOCK_EX | fcntl.LOCK_NB)
        early.rename(scratch / MARK)  # never to be seen unlocked while this process lives
    return mark


def remove_stale(out: Path) -> list[Path]:
    """Remove what killed runs to the same folder left beside it; returns the folders removed.

    Only what is surely such a remainder: the hidden name that a run gives, the mark in it and nothing else but the
    run, and no process that still holds the mark.
    """
    name = re.compile(rf"\.{re.escape(out.name[:100])}\.[a-z0-9_]{{8}}{re.escape(SUFFIX)}")
    found = [p for p in out.parent.iterdir() if name.fullmatch(p.name)] if out.parent.is_dir() else []
    stale = [p for p in sorted(found) if _is_stale(p)]
    for folder in stale:
        shutil.rmtree(folder, ignore_errors=True)
    return [p for p in stale if not p.exists()]


def _is_stale(scratch: Path) -> bool:
    try:
        if scratch.is_symlink() or not scratch.is_dir() or {p.name for p in scratch.iterdir()} - {MARK, RUN}:
            return False
        mark = os.open(scratch / MARK, os.O_RDONLY | os.O_NOFOLLOW)
    except OSError:
        return False
    try:
        fcntl.flock(mark, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False  # another run is writing it now
    finally:
        os.close(mark)
    return True


def _scratch(out: Path, suffix: str) -> Path:
    """A new hidden folder beside `out`."""
    try:
        return Path(tempfile.mkdtemp(prefix=f".{out.name[:100]}.", suffix=suffix, dir=out.parent))
    except OSError as error:
        raise RunError("write", f"cannot write in {out.parent}: {error.strerror}; choose another --out") from error


def _put_in_place(room: Path, out: Path, replace: bool) -> None:
    refuse_existing(out, replace)  # somebody else may have made it meanwhile
    if not out.exists():
        room.rename(out)
        return
    old = Path(tempfile.mkdtemp(prefix=f".{out.name}.", suffix=".old", dir=out.parent))
    try:
        out.rename(old / "run")
        try:
            room.rename(out)
        except BaseException:
            (old / "run").rename(out)
            raise
    finally:
        shutil.rmtree(old, ignore_errors=True)
