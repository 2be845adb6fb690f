"""The run folder: whole or not there.

Everything is written to a hidden sibling, which takes the folder's name in one step at the end.
"""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from geometry.problem import RunError

RESULT = "result.json"


def refuse_existing(out: Path, replace: bool) -> None:
    """Raise `RunError` when `out` may not be written. Asked before the work, not after it."""
    if out.parent.exists() and not out.parent.is_dir():
        raise RunError("write", f"{out.parent} is a file, not a folder: choose another --out")
    if not out.parent.is_dir():
        raise RunError("write", f"the folder {out.parent} does not exist: make it, or choose another --out")
    if not out.exists() and not out.is_symlink():
        _scratch(out, ".partial").rmdir()  # a folder that cannot be written in is told now
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
    room = _scratch(out, ".partial")
    try:
        yield room
        room.chmod(0o755)
        _put_in_place(room, out, replace)
    except OSError as error:
        raise RunError("write", f"cannot write the run folder {out}: {error.strerror or error}") from error
    finally:
        shutil.rmtree(room, ignore_errors=True)


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
