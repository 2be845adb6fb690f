"""Opening the file: is it a record, of which version, is it whole?"""

from __future__ import annotations

import os
import sqlite3
from pathlib import Path

from studies.record.errors import RecordError, damaged, told
from studies.record.schema import APPLICATION, VERSION

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


def connect_reader(path: Path) -> sqlite3.Connection:
    """Connect to the record `path` for reading, while it is written or not.

    Where the file may be written, so that the last one to close it can tidy up the files beside it; SQLite itself
    refuses every change by this connection.
    """
    if os.access(path, os.W_OK) and os.access(path.parent, os.W_OK | os.X_OK):
        db = connect(path, "rw")
        db.execute("PRAGMA query_only = ON")
        return db
    return connect(path, "ro")


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
