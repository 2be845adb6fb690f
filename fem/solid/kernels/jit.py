"""The decorator of the compiled loops."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numba

from fem.solid.kernels.cache import folder_of


def kernel(function: Callable[..., Any]) -> Any:
    """Compile at the first call and keep the machine code, where a folder can be written (see `cache`).

    Releases the interpreter's lock. Multiply and add may be contracted; nothing else may be reordered. A division by
    zero gives infinity or NaN.
    """
    folder = folder_of(Path(function.__code__.co_filename))
    before = numba.config.CACHE_DIR
    try:
        numba.config.CACHE_DIR = str(folder or "")
        return numba.njit(
            function, nogil=True, cache=folder is not None, fastmath={"contract"}, error_model="numpy"
        )
    finally:
        numba.config.CACHE_DIR = before
