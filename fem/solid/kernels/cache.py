"""Where the machine code of the kernels is kept between runs, and whether it is there. Does not import numba.

numba looks only at the file of a function to see whether its code is stale, and misses a change in a kernel of another
file that is built into it. So each file of kernels has a folder of its own, named by the contents of the file and of
the files of kernels that it imports. Each kept file ends in a checksum: what a full disk or a loss of power left of one
would otherwise end every later run, or run as machine code.
"""

from __future__ import annotations

import hashlib
import os
import platform
import re
import shutil
import sys
import tempfile
import time
import zlib
from functools import cache
from importlib.metadata import version
from pathlib import Path

SOLID = Path(__file__).parent.parent
BESIDE = Path(__file__).parent / "__pycache__"
MARK = re.compile(rb"^@kernel\b", re.MULTILINE)
IMPORT = re.compile(rb"^from fem\.solid\.([\w.]+) import", re.MULTILINE)
_OLD = 86400.0
"""Seconds after which a folder of other contents is removed: nobody is writing to it any more."""


def writable(folder: Path) -> bool:
    """Whether a file can be made in `folder`, which is made itself if need be."""
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


def sealed(data: bytes) -> bytes:
    """What is written for `data`: pickle does not look at what comes after the end of an object."""
    return data + zlib.crc32(data).to_bytes(4, "little")


def whole(path: Path) -> bool:
    """Whether a file is there and is as it was written."""
    try:
        data = path.read_bytes()
    except OSError:
        return False
    return len(data) > 4 and zlib.crc32(memoryview(data)[:-4]).to_bytes(4, "little") == data[-4:]


@cache
def base_folder() -> Path | None:
    """NUMBA_CACHE_DIR where that is set, else beside the source, else in the user's cache; None: none can be written.

    What an installation that cannot be written brings along, compiled when it was set up, is copied to the user's.
    """
    named = os.environ.get("NUMBA_CACHE_DIR")
    if named:
        return Path(named) if writable(Path(named)) else None
    if writable(BESIDE):
        return BESIDE
    try:
        mine = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache") / "haunch"
    except RuntimeError:  # there is no home
        return None
    if not writable(mine):
        return None
    for brought in BESIDE.glob("kernels-*"):
        if not (mine / brought.name).exists():
            try:
                shutil.copytree(brought, mine / brought.name)
            except (OSError, shutil.Error):  # not readable, or another process is copying it too
                continue
    return mine


@cache
def sources() -> dict[Path, bytes]:
    """Contents of the files that define kernels."""
    files = ((path, path.read_bytes()) for path in sorted(SOLID.rglob("*.py")))
    return {path: text for path, text in files if MARK.search(text)}


@cache
def contents(path: Path) -> str:
    """Digest of a file of kernels and of those that it imports, directly or not."""
    seen: set[Path] = set()
    ahead = [path]
    while ahead:
        here = ahead.pop()
        if here in seen or here not in sources():
            continue
        seen.add(here)
        ahead += [SOLID / (name.decode().replace(".", "/") + ".py") for name in IMPORT.findall(sources()[here])]
    digest = hashlib.sha256(b"kept with a checksum")
    for each in sorted(seen):
        digest.update(str(each.relative_to(SOLID)).encode() + b"\0" + sources()[each])
    return digest.hexdigest()[:16]


def folder_of(path: Path) -> Path | None:
    """The folder for the code of the kernels in a file; None where none can be written."""
    base = base_folder()
    if base is None:
        return None
    folder = base / f"kernels-{path.stem}-{contents(path)}"
    if not folder.exists():
        for other in base.glob(f"kernels-{path.stem}-*"):
            if time.time() - other.stat().st_mtime > _OLD:
                shutil.rmtree(other, ignore_errors=True)
    return folder


@cache
def _state() -> str:
    """All that the code depends on: sources, numba, Python and the processor."""
    digest = hashlib.sha256(f"{sys.version} {version('numba')} {version('llvmlite')} {platform.machine()}".encode())
    try:
        with Path("/proc/cpuinfo").open("rb") as file:
            lines = file.read(8192).split(b"\n")
        digest.update(b"".join(line for line in lines if line.startswith((b"model", b"flags"))))
    except OSError:
        digest.update(platform.processor().encode())
    for path in sources():
        digest.update(contents(path).encode())
    return digest.hexdigest()


def _stamp() -> Path | None:
    base = base_folder()
    return None if base is None else base / f"kernels-warm-{hashlib.sha256(str(SOLID).encode()).hexdigest()[:16]}"


def is_warm() -> bool:
    """Whether every kernel is compiled and kept whole for this machine, so that a run need not wait for it."""
    stamp = _stamp()
    try:
        if stamp is None or stamp.read_text() != _state():
            return False
    except OSError:
        return False
    kept = [list(folder.rglob("*.nb[ci]")) for folder in map(folder_of, sources()) if folder is not None]
    return all(files and all(map(whole, files)) for files in kept)


def set_warm() -> None:
    """Note that every kernel is compiled and kept."""
    stamp = _stamp()
    if stamp is not None:
        try:
            stamp.write_text(_state())
        except OSError:
            return
