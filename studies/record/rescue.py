"""What is whole in a damaged record, in a new one."""

from __future__ import annotations

import json
import sqlite3
import zlib
from pathlib import Path
from typing import Any, NamedTuple

from studies.record.errors import RecordError, damaged, told
from studies.record.lock import Lock
from studies.record.opening import absolute, connect, log_of, open_reader
from studies.record.place import refuse_folder, refuse_network, refuse_unwritable
from studies.record.reader import Varied, unpacked
from studies.record.rows import columns_of, put_columns, put_point, put_rows, rows_of
from studies.record.schema import Column
from studies.record.seal import seal
from studies.record.whole import Row
from studies.record.writer import make
from studies.vary.outcome import Outcome


class Rescued(NamedTuple):
    """How many variants were saved, and how many rows of variants were seen that are not whole."""

    variants: int
    spoiled: int


def rescue(path: str | Path, new: str | Path) -> Rescued:
    """Write the variants of the damaged record `path` that are as they were written into a new record `new`.

    The old one is left as it is. Every row is fetched by itself, so that a damaged page costs its own rows only; what
    bears no right seal is left behind, and computed again when the study goes on in the new record. Raises
    `RecordError` when nothing can be read, a driver writes it, or `new` exists.
    """
    path, new = absolute(path), absolute(new)
    refuse_folder(path)
    if not path.exists():
        raise RecordError(f"there is no record {path}")
    if new.exists():
        raise RecordError(f"{new} exists already: choose another name for the rescued record")
    for place in (refuse_folder, refuse_network, refuse_unwritable):
        place(new)
    locks = [Lock(new)]
    try:
        locks.append(Lock(path))
        old = open_reader(path)
        try:
            return _rescued(old, path, new)
        finally:
            old.close()
    finally:
        for lock in locks:
            lock.release()


def _rescued(old: sqlite3.Connection, path: Path, new: Path) -> Rescued:
    make(new)
    with told(new):
        db = connect(new, "rw")
        try:
            db.execute("BEGIN IMMEDIATE")
            bound = sum(file.stat().st_size for file in (path, log_of(path)) if file.exists()) // 100
            result = _save_variants(old, db, bound)
            _save_studies(old, db, bound)
            db.execute("COMMIT")
        finally:
            db.close()
    if not result.variants:
        new.unlink()
        raise damaged(path, "no variant in it is whole")
    return result


def _fetched(old: sqlite3.Connection, sql: str, *given: Any) -> list[Row] | None:
    """The rows, or None where the file is damaged."""
    try:
        return old.execute(sql, given).fetchall()
    except (sqlite3.Error, OverflowError, UnicodeDecodeError):
        return None


def _save_variants(old: sqlite3.Connection, db: sqlite3.Connection, bound: int) -> Rescued:
    saved, spoiled = 0, 0
    columns: set[Column] = set()
    for place in range(1, _last(old, "SELECT max(id) FROM variants", bound) + 1):
        rows = _fetched(old, "SELECT * FROM variants WHERE id = ?", place)
        if rows == []:
            continue
        whole = _whole(rows[0]) if rows else None
        if whole is None:
            spoiled += 1
            continue
        row, outcome = whole
        db.execute(f"INSERT INTO variants VALUES ({', '.join('?' * len(row))})", row)
        put_rows(db, place, *rows_of(outcome))
        columns |= set(columns_of(outcome))
        saved += 1
    put_columns(db, columns)
    return Rescued(saved, spoiled)


def _whole(row: Row) -> tuple[Row, Outcome] | None:
    """The row and its outcome, when the seal holds; the rows of figures and limits follow from the outcome."""
    try:
        outcome = unpacked(row[-2])
        figures, limits = rows_of(outcome)
        return (row, outcome) if seal(row[:-1], *figures, *limits) == row[-1] else None
    except (zlib.error, ValueError, TypeError, KeyError, AttributeError):
        return None


def _last(old: sqlite3.Connection, sql: str, bound: int) -> int:
    """The highest number in use; `bound`, which no record of this size reaches, where that is not to be seen."""
    rows = _fetched(old, sql)
    found = rows[0][0] if rows else bound
    return min(found, bound) if isinstance(found, int) else 0


def _save_studies(old: sqlite3.Connection, db: sqlite3.Connection, bound: int) -> None:
    """Studies, their points and events that are whole."""
    for study in range(1, _last(old, "SELECT max(id) FROM study", 1000) + 1):
        rows = _sealed(_fetched(old, "SELECT * FROM study WHERE id = ?", study))
        if not rows:
            continue
        db.execute("INSERT INTO study VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)", rows[0])
        varied = [Varied(*v) for v in json.loads(rows[0][6])]
        put_columns(db, [Column("", "varied", v.name, v.unit, v.label) for v in varied])
        for number in range(1, bound):
            for point in _sealed(_fetched(old, "SELECT * FROM points WHERE study = ? AND number = ?", study, number)):
                put_point(db, [v.name for v in varied], point)
        for event in _sealed(_fetched(old, "SELECT * FROM events WHERE study = ? ORDER BY id", study)):
            db.execute("INSERT INTO events VALUES (?, ?, ?, ?, ?)", event)


def _sealed(rows: list[Row] | None) -> list[Row]:
    return [row for row in rows or [] if seal(row[:-1]) == row[-1]]
