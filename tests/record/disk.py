"""A disk that can lose its power: what SQLite writes and when it asks for it to be kept, and what a cut can leave.

Run as a program (in a process of its own, for it changes SQLite's way to the disk) it writes a study and prints a log,
one JSON list a line: write, truncate, sync, delete with the file's name, and ``done`` with the number of a variant when
`Record.add` has returned. `after_cut` makes a folder as a cut after any line could leave it: what was synced is there,
of everything later each sector is new, old, zero or rubbish.
"""

from __future__ import annotations

import base64
import ctypes
import json
import random
import sys
from pathlib import Path
from typing import Any

SECTOR = 512
WRITE, SYNC = 3, 5
"""Places in the table of a file's methods (sqlite3_io_methods), the version being at 0."""


class Vfs(ctypes.Structure):
    _fields_ = [("version", ctypes.c_int), ("size", ctypes.c_int), ("longest", ctypes.c_int),
                ("next", ctypes.c_void_p), ("name", ctypes.c_char_p), ("data", ctypes.c_void_p),
                ("open", ctypes.c_void_p), ("delete", ctypes.c_void_p)]


OPEN = ctypes.CFUNCTYPE(ctypes.c_int, ctypes.c_void_p, ctypes.c_void_p, ctypes.c_void_p, ctypes.c_int, ctypes.c_void_p)
DELETE = ctypes.CFUNCTYPE(ctypes.c_int, ctypes.c_void_p, ctypes.c_char_p, ctypes.c_int)
WRITES = ctypes.CFUNCTYPE(ctypes.c_int, ctypes.c_void_p, ctypes.c_void_p, ctypes.c_int, ctypes.c_int64)
TRUNCATE = ctypes.CFUNCTYPE(ctypes.c_int, ctypes.c_void_p, ctypes.c_int64)
SYNCS = ctypes.CFUNCTYPE(ctypes.c_int, ctypes.c_void_p, ctypes.c_int)
_kept: list[Any] = []


def library() -> ctypes.CDLL | None:
    """The SQLite that Python uses, or None where it cannot be reached."""
    import _sqlite3

    try:
        found = ctypes.CDLL(_sqlite3.__file__)
        found.sqlite3_vfs_find.restype = ctypes.POINTER(Vfs)
        return found
    except (AttributeError, OSError):
        return None


def listen(log: list[list[Any]]) -> None:
    """Write everything that SQLite does to files from now on into `log`."""
    vfs = library().sqlite3_vfs_find(None).contents
    opens, deletes = OPEN(vfs.open), DELETE(vfs.delete)

    def opened(at: int, name: int | None, file: int, flags: int, out: int) -> int:
        code = opens(at, name, file, flags, out)  # it keeps the address of the name, so no copy will do
        if code == 0 and name:
            _listen_to(log, Path(ctypes.string_at(name).decode()).name, file)
        return code

    def deleted(at: int, name: bytes, sync: int) -> int:
        log.append(["delete", Path(name.decode()).name])
        return deletes(at, name, sync)

    for field, kind, function in (("open", OPEN, opened), ("delete", DELETE, deleted)):
        _kept.append(callback := kind(function))
        setattr(vfs, field, ctypes.cast(callback, ctypes.c_void_p).value)


def _listen_to(log: list[list[Any]], name: str, file: int) -> None:
    """Give the open file a table of methods of its own."""
    methods = ctypes.cast(file, ctypes.POINTER(ctypes.c_void_p))
    table = (ctypes.c_void_p * 19)(*ctypes.cast(methods[0], ctypes.POINTER(ctypes.c_void_p * 19)).contents)
    writes, truncates, syncs = WRITES(table[WRITE]), TRUNCATE(table[WRITE + 1]), SYNCS(table[SYNC])

    def write(at: int, data: int, size: int, offset: int) -> int:
        log.append(["write", name, offset, base64.b64encode(ctypes.string_at(data, size)).decode()])
        return writes(at, data, size, offset)

    def truncate(at: int, size: int) -> int:
        log.append(["truncate", name, size])
        return truncates(at, size)

    def sync(at: int, flags: int) -> int:
        code = syncs(at, flags)
        log.append(["sync", name])
        return code

    for place, kind, function in ((WRITE, WRITES, write), (WRITE + 1, TRUNCATE, truncate), (SYNC, SYNCS, sync)):
        _kept.append(callback := kind(function))
        table[place] = ctypes.cast(callback, ctypes.c_void_p).value
    _kept.append(table)
    methods[0] = ctypes.addressof(table)


def after_cut(log: list[list[Any]], start: dict[str, bytes], cut: int, folder: Path, rng: random.Random) -> set[int]:
    """Fill `folder` as a cut after `cut` lines could leave it; returns the variants that had been told as recorded."""
    synced: dict[str, bytearray] = {name: bytearray(content) for name, content in start.items()}
    pending: dict[str, list[list[Any]]] = {}
    done = set()
    for line in log[:cut]:
        if line[0] == "done":
            done.add(line[1])
        elif line[0] == "sync":
            _apply(synced, pending.pop(line[1], []), None)
        else:
            pending.setdefault(line[1], []).append(line)
    for lines in pending.values():
        _apply(synced, lines, rng)
    for name, content in synced.items():
        (folder / name).write_bytes(content)
    return done


def _apply(files: dict[str, bytearray], lines: list[list[Any]], rng: random.Random | None) -> None:
    """Do what the lines say; with `rng`, as much of it as chance has it."""
    for what, name, *more in lines:
        if rng is not None and rng.random() < 0.3:
            continue
        if what == "delete":
            files.pop(name, None)
            continue
        content = files.setdefault(name, bytearray())
        if what == "truncate":
            del content[more[0]:]
            continue
        offset, data = more[0], base64.b64decode(more[1])
        content.extend(bytes(max(0, offset + len(data) - len(content))))
        for at in range(0, len(data), SECTOR):
            new = data[at:at + SECTOR]
            torn = rng is not None and rng.random() < 0.3
            if torn:
                new = rng.choice((bytes(len(new)), rng.randbytes(len(new)), bytes(content[offset + at:][:len(new)])))
            content[offset + at:offset + at + len(new)] = new


def main(path: str, count: int, synchronous: str) -> None:
    """Write a study of `count` variants, with a checkpoint every few of them, closed and resumed half-way.

    `synchronous` is empty, or what to use in place of the writer's own setting.
    """
    sys.path.insert(0, str(Path(__file__).parent))
    from small_study import P, outcome, variant

    from studies.record import Record

    log: list[list[Any]] = []
    listen(log)
    Record.create(path, P()).close()
    start, making = Path(path).read_bytes(), log.copy()
    log.clear()
    for part in (range(1, count // 2), range(count // 2, count + 1)):
        with Record.resume(path, P()) as record:
            record._db.execute("PRAGMA wal_autocheckpoint = 25")
            if synchronous:
                record._db.execute(f"PRAGMA synchronous = {synchronous}")
            if part.start == 1:
                record.set_points(map(variant, range(1, count + 1)))
            for number in part:
                record.add(variant(number), outcome(number))
                log.append(["done", number])
    json.dump({"start": base64.b64encode(start).decode(), "making": making, "log": log}, sys.stdout)


if __name__ == "__main__":
    main(sys.argv[1], int(sys.argv[2]), sys.argv[3])
