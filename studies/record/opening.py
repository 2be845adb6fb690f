"""Opening the file: is it a record, of which version, is it whole?"""

from __future__ import annotations

import os
import sqlite3
from contextlib import suppress
from pathlib import Path

from studies.record.errors import RecordError, damaged, told
from studies.record.place import is_network, kind_of
from studies.record.schema import APPLICATION, VERSION, upgrade

BUSY_SECONDS = 30.0


def absolute(path: str | Path) -> Path:
    """The file that a path leads to, links followed: the files beside it are named after that one."""
    return Path(os.path.realpath(Path(path).expanduser()))


def connect(path: Path, mode: str, more: str = "") -> sqlite3.Connection:
    """Connect to the file `path`; `mode` is ``ro`` or ``rw``. Transactions are begun by hand.

    The file is never opened in any other way: closing a second descriptor of it would give up the locks that SQLite
    holds for this process (see "How To Corrupt An SQLite Database File", section 2.2, of its documentation).
    """
    db = sqlite3.connect(f"{path.as_uri()}?mode={mode}{more}", uri=True, timeout=BUSY_SECONDS, isolation_level=None,
                         check_same_thread=False)
    db.execute("PRAGMA trusted_schema = OFF")
    db.execute("PRAGMA cell_size_check = ON")
    return db


def refuse_foreign(db: sqlite3.Connection, path: Path) -> None:
    """Raise `RecordError` when the file is no record, or one of a newer version."""
    with told(path):
        (application,) = db.execute("PRAGMA application_id").fetchone()
        (version,) = db.execute("PRAGMA user_version").fetchone()
    if application != APPLICATION:
        raise RecordError(f"{path} is no record of Haunch, and is left as it is: give another --record")
    if version > VERSION:
        raise RecordError(f"the record {path} was written by a newer Haunch (layout {version}; this one knows "
                          f"{VERSION}): use that one, or give another --record")
    if version < 1:
        raise damaged(path, f"its layout has the number {version}")


def open_reader(path: Path) -> sqlite3.Connection:
    """Connect to the record `path` for reading, while it is written or not; in today's layout.

    Where it may be written, it is opened so, and the last one to close it tidies up the files beside it; SQLite itself
    refuses every change by this connection. Raises `RecordError`.
    """
    kind = kind_of(path)
    if is_network(kind):
        db = _resting(path, f"it lies on a network drive ({kind})")
    else:
        with told(path):
            try:
                db = _try(path, "rw")
                db.execute("PRAGMA query_only = ON")
            except sqlite3.OperationalError as error:
                if not _refused(error):
                    raise
                db = _unwritable(path)
    try:
        refuse_foreign(db, path)
        return _todays(db, path)
    except BaseException:
        db.close()
        raise


def _try(path: Path, mode: str, more: str = "") -> sqlite3.Connection:
    db = connect(path, mode, more)
    try:
        db.execute("SELECT count(*) FROM sqlite_master").fetchone()
    except BaseException:
        db.close()
        raise
    return db


def _refused(error: sqlite3.Error) -> bool:
    """Is it for want of a right, or of room for the files beside the record?"""
    return getattr(error, "sqlite_errorname", "").startswith(("SQLITE_CANTOPEN", "SQLITE_READONLY", "SQLITE_PERM",
                                                              "SQLITE_FULL", "SQLITE_IOERR_SHM", "SQLITE_IOERR_WRITE"))


def _unwritable(path: Path) -> sqlite3.Connection:
    """A record in a place where nothing may be written; perhaps somebody who may is writing it."""
    with suppress(sqlite3.OperationalError):
        return _try(path, "ro")
    return _resting(path, "its folder may not be written in")


def _resting(path: Path, why: str) -> sqlite3.Connection:
    """A record that nobody writes and that has no open log, as a copy: SQLite cannot lock it where it is.

    That no log was there, neither before nor after, says that the copy is of one state.
    """
    _refuse_log(path, why)
    with told(path):
        db = _try(path, "ro", "&immutable=1")
        refuse_foreign(db, path)
        copy = _copy(db)
    _refuse_log(path, why)
    return copy


def _refuse_log(path: Path, why: str) -> None:
    log = log_of(path)
    if log.exists() and log.stat().st_size:
        raise RecordError(f"the record {path} was not closed by its driver, or is being written, and cannot be read "
                          f"where it is: {why}. Copy it to a folder of your own together with {log.name}, and read the "
                          "copy; or go on with the study, which closes it")


def _copy(db: sqlite3.Connection) -> sqlite3.Connection:
    """A private copy in a temporary file without a name; closes the original."""
    copy = sqlite3.connect("", isolation_level=None, check_same_thread=False)
    try:
        db.backup(copy)
    except BaseException:
        copy.close()
        raise
    finally:
        db.close()
    return copy


def log_of(path: Path) -> Path:
    """SQLite's write-ahead log of the record `path`."""
    return path.with_name(path.name + "-wal")


def _todays(db: sqlite3.Connection, path: Path) -> sqlite3.Connection:
    """The same record in today's layout; one of an older layout is read in a copy, and its file left as it is."""
    with told(path):
        if db.execute("PRAGMA user_version").fetchone()[0] == VERSION:
            return db
        copy = _copy(db)
        upgrade(copy)
        return copy
