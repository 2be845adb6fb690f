"""The decorator of the compiled loops."""

from __future__ import annotations

import io
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any

import numba
from numba.core.caching import FunctionCache, IndexDataCacheFile

from fem.solid.kernels.cache import folder_of, sealed, whole


class _Files(IndexDataCacheFile):
    """Files with a checksum: a damaged one counts as one that is not there, and is written again."""

    def _load_index(self) -> Any:
        return super()._load_index() if whole(Path(self._index_path)) else {}

    def _load_data(self, name: str) -> Any:
        if not whole(Path(self._data_path(name))):
            raise FileNotFoundError(name)  # which numba takes for a reason to compile
        return super()._load_data(name)

    @contextmanager
    def _open_for_write(self, filepath: str) -> Iterator[io.BytesIO]:
        with super()._open_for_write(filepath) as file:
            data = io.BytesIO()
            yield data
            file.write(sealed(data.getvalue()))


class _Kept(FunctionCache):
    """numba's own, which reads a damaged file as it stands and ends the run where the disk is full."""

    def __init__(self, function: Callable[..., Any]) -> None:
        super().__init__(function)
        here = self._impl
        self._cache_file = _Files(self.cache_path, here.filename_base, here.locator.get_source_stamp())

    def save_overload(self, sig: Any, data: Any) -> None:
        with suppress(OSError):
            super().save_overload(sig, data)


def kernel(function: Callable[..., Any]) -> Any:
    """Compile at the first call and keep the machine code, where a folder can be written (see `cache`).

    Releases the interpreter's lock. Multiply and add may be contracted; nothing else may be reordered. A division by
    zero gives infinity or NaN.
    """
    folder = folder_of(Path(function.__code__.co_filename))
    before = numba.config.CACHE_DIR
    try:
        numba.config.CACHE_DIR = str(folder or "")
        compiled = numba.njit(function, nogil=True, fastmath={"contract"}, error_model="numpy")
        if folder is not None:
            compiled._cache = _Kept(function)
        return compiled
    finally:
        numba.config.CACHE_DIR = before
