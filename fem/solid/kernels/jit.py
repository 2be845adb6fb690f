"""The decorator of the compiled loops, and where their machine code is kept between runs.

numba keeps it in the ``__pycache__`` beside the source. Where that cannot be written (an installation that belongs to
somebody else) a folder of the user's is named before numba is imported; where neither can be written the code is
compiled in every run.
"""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

HERE = Path(__file__).parent


def writable(folder: Path) -> bool:
    """Whether a file can be made in `folder`, which is made itself if need be."""
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


def cache_folder() -> Path | None:
    """The folder that numba will use; None where no folder can be written."""
    named = os.environ.get("NUMBA_CACHE_DIR")
    if named:
        return Path(named) if writable(Path(named)) else None
    beside = HERE / "__pycache__"
    if writable(beside):
        return beside
    try:
        mine = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache") / "haunch"
    except RuntimeError:  # no home
        return None
    return mine if writable(mine) else None


FOLDER = cache_folder()
if FOLDER is not None and FOLDER.parent != HERE:
    os.environ.setdefault("NUMBA_CACHE_DIR", str(FOLDER))

import numba  # noqa: E402  (reads NUMBA_CACHE_DIR)


def kernel(function: Callable[..., Any]) -> Any:
    """Compile at the first call; releases the interpreter's lock. Multiply and add may be contracted, nothing else."""
    return numba.njit(function, nogil=True, cache=FOLDER is not None, fastmath={"contract"}, error_model="numpy")
