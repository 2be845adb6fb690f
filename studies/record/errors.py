"""What can be wrong with a record, in words that a person can act on."""

from __future__ import annotations

import shlex
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from geometry.problem import HaunchError


class RecordError(HaunchError):
    """The record cannot be read or written. The message says what, where and what to do; nothing in it is lost."""


class RecordHeldError(RecordError):
    """Another driver is writing this record."""


class RecordFullError(RecordError):
    """There is no room for the next variant; the record stays open, and the variant can be added again later."""


class RecordDamagedError(RecordError):
    """The file has been changed by something that is not Haunch."""


class RecordBusyError(RecordError):
    """Another program keeps the record from being written; the variant can be added again later."""


def damaged(path: Path, what: str) -> RecordDamagedError:
    """The error for a record in which `what` was found."""
    new = shlex.quote(str(rescued_name(path)))
    return RecordDamagedError(
        f"the record {path} is damaged: {what}. It is refused, for a wrong figure is worse than none.\n"
        f"  1. a copy of the file from before (with its {path.name}-wal, if there is one): put it in its place\n"
        f"  2. keep what is whole: haunch rescue {shlex.quote(str(path))} {new}, then give --record {new}; what "
        "was lost is computed again")


def rescued_name(path: Path) -> Path:
    """A free name beside `path` for what is saved from it."""
    found, number = path.with_name(f"{path.stem}-rescued{path.suffix}"), 2
    while found.exists():
        found, number = path.with_name(f"{path.stem}-rescued-{number}{path.suffix}"), number + 1
    return found


@contextmanager
def told(path: Path) -> Iterator[None]:
    """Errors of SQLite on the record `path` become `RecordError`, each with what to do."""
    try:
        yield
    except sqlite3.Error as error:
        raise in_words(path, error) from error
    except UnicodeDecodeError as error:  # SQLite's own message names a damaged table
        raise damaged(path, "a name in it is no text") from error


def in_words(path: Path, error: sqlite3.Error) -> RecordError:
    """What SQLite's error means for the record `path`. A mistake in Haunch itself is raised as it is."""
    if isinstance(error, sqlite3.ProgrammingError | sqlite3.InterfaceError):
        raise error
    name = getattr(error, "sqlite_errorname", None) or ""
    if name.startswith(("SQLITE_FULL", "SQLITE_IOERR_WRITE", "SQLITE_IOERR_SHMSIZE", "SQLITE_IOERR_FSYNC",
                        "SQLITE_IOERR_TRUNCATE")):
        return RecordFullError(f"the record {path} cannot be written: {error} (the disk is full, or a quota or a limit "
                               "on the size of a file is reached). All that was recorded is safe. Make room in "
                               f"{path.parent}, then give the same command again")
    if name.startswith(("SQLITE_BUSY", "SQLITE_LOCKED")):
        return RecordBusyError(f"the record {path} is held by another program, perhaps a database browser: close it "
                               "there, then give the same command again; all that was recorded is safe")
    if name.startswith(("SQLITE_READONLY", "SQLITE_PERM", "SQLITE_CANTOPEN", "SQLITE_AUTH")):
        return RecordError(f"the record {path} cannot be opened for writing: {error}. Make the file and its folder "
                           "writable, or copy the record to a folder of your own and give --record")
    if name.startswith("SQLITE_NOTADB"):
        return RecordError(f"{path} is no record of Haunch (or its first bytes are damaged): give another --record")
    if name.startswith(("SQLITE_CORRUPT", "SQLITE_IOERR_SHORT_READ")):
        return damaged(path, str(error))
    if name.startswith("SQLITE_IOERR"):
        return RecordError(f"the disk does not give back or take the record {path}: {error} ({name}). Look at the "
                           "disk, copy the record elsewhere and give --record")
    return damaged(path, f"{error} {name}".strip())
