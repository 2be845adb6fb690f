"""Writing a record: one writer, one transaction a variant, on the disk before it counts."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from studies.record.errors import RecordError, told
from studies.record.joining import PlanLike, join
from studies.record.lock import Lock
from studies.record.opening import absolute, connect, log_of, refuse_foreign
from studies.record.place import refuse_folder, refuse_network, refuse_unwritable
from studies.record.reader import Record
from studies.record.rows import columns_of, plain_json, point_row, put_columns, put_event, put_point, put_variant
from studies.record.schema import make_tables, upgrade
from studies.record.seal import seal, text
from studies.record.whole import Row, refuse_damaged
from studies.vary.outcome import Outcome
from studies.vary.variant import Variant


def create(path: str | Path, plan: PlanLike) -> Writer:
    """See `Record.create`."""
    path = absolute(path)
    _refuse_place(path)
    lock = Lock(path)
    try:
        if path.exists():
            raise RecordError(f"{path} exists already: go on in it by the same command, or choose another --record")
        log = log_of(path)
        if log.exists() and log.stat().st_size:
            raise RecordError(f"{log} belongs to a record that is no longer beside it, and may hold finished variants. "
                              "Put the record back, or move that file away")
        make(path)
        return Writer(path, lock, plan, share=False)
    except BaseException:
        lock.release()
        raise


def resume(path: str | Path, plan: PlanLike, share: bool = False) -> Writer:
    """See `Record.resume`."""
    path = absolute(path)
    refuse_folder(path)
    if not path.exists():
        raise RecordError(f"there is no record {path}: haunch vary PLAN.toml makes it")
    _refuse_place(path)
    if path.stat().st_nlink > 1:
        raise RecordError(f"the record {path} has a second name (a hard link), so that two drivers could write it at "
                          f"once: copy it (cp {path.name} ANOTHER), and give the copy as --record")
    lock = Lock(path)
    try:
        return Writer(path, lock, plan, share)
    except BaseException:
        lock.release()
        raise


def _refuse_place(path: Path) -> None:
    refuse_folder(path)
    refuse_network(path)
    refuse_unwritable(path)


def make(path: Path) -> None:
    """An empty record under a name of its own, then under its name: it is whole, or not there."""
    early = path.with_name(f".{path.name[:200]}.new")
    try:
        early.unlink(missing_ok=True)
        early.touch()
        with told(path):
            db = connect(early, "rw")
            try:
                db.execute("PRAGMA synchronous = FULL")
                make_tables(db)
                db.execute("PRAGMA journal_mode = WAL")
            finally:
                db.close()
        early.rename(path)
        folder = os.open(path.parent, os.O_RDONLY)
        try:
            os.fsync(folder)
        finally:
            os.close(folder)
    except OSError as error:
        raise RecordError(f"cannot make the record {path}: {error.strerror}; choose another --record") from error
    finally:
        for left in ("", "-wal", "-shm", "-journal"):
            early.with_name(early.name + left).unlink(missing_ok=True)


class Writer(Record):
    """A record that this process writes; made by `Record.create` and `Record.resume`. Its threads may share it."""

    def __init__(self, path: Path, lock: Lock, plan: PlanLike, share: bool) -> None:
        with told(path):
            db = connect(path, "rw")
        try:
            refuse_foreign(db, path)
            with told(path):
                db.execute("PRAGMA journal_mode = WAL")
                db.execute("PRAGMA synchronous = FULL")
                db.execute("PRAGMA journal_size_limit = 67108864")
                upgrade(db)
            refuse_damaged(db, path)
            with told(path):
                join(db, path, plan, share)
            super().__init__(path, db, text(plan.title))
        except BaseException:
            db.close()
            raise
        self._lock = lock
        self._names = [varied.name for varied in self.study().varied]
        self._columns = {(column.what, column.source) for column in self.columns()}
        self._inodes = dict.fromkeys((path, log_of(path)), 0)

    def close(self) -> None:
        """Close it and give the lock up; a second time does nothing."""
        with self._guard:
            try:
                super().close()
            finally:
                self._lock.release()

    @contextmanager
    def _change(self) -> Iterator[sqlite3.Connection]:
        """One transaction: all of it on the disk when the block has ended, or nothing."""
        with self._guard, told(self.path):
            self._refuse_moved()
            try:
                self._db.execute("BEGIN IMMEDIATE")
                yield self._db
                self._db.execute("COMMIT")
            except BaseException:
                if self._db.in_transaction:  # a full disk has ended it already
                    self._db.execute("ROLLBACK")
                raise

    def _refuse_moved(self) -> None:
        """The files that are open must still be those of the record's name: a commit to others would be lost."""
        for file, known in self._inodes.items():
            there = file.stat().st_ino if file.exists() else -1
            if known == 0 and there != -1:
                self._inodes[file] = there
            elif there != known != 0:
                raise RecordError(f"the file {file} was moved or removed while the record was being written: put the "
                                  "record back, with all files beside it that begin with its name, and give the same "
                                  "command again")

    def set_points(self, variants: Iterable[Variant]) -> None:
        """Write the points of the plan; those that are there are kept, with their new keys where those changed."""
        with self._change() as db:
            for variant in variants:
                row = point_row(self._study, self._names, variant)
                if _seal_there(db, row) != row[-1]:
                    put_point(db, self._names, row)

    def set_left_out(self, entries: Iterable[tuple[int, Mapping[str, Any], str]]) -> None:
        """Write the points that are no variants (number, values, reason), in place of those written before."""
        with self._change() as db:
            db.execute("DELETE FROM left_out WHERE study = ?", (self._study,))
            for place, given, reason in entries:
                row = (self._study, place, plain_json(dict(given)), text(reason))
                db.execute("INSERT INTO left_out VALUES (?, ?, ?, ?, ?)", (*row, seal(row)))

    def add(self, variant: Variant, outcome: Outcome, replace: bool = False) -> bool:
        """Write the outcome of a variant; when this returns, it is on the disk.

        An earlier failure gives way to it. A finished variant is not written twice: False is then returned, unless
        `replace`. The point is written too, if it is not there.
        """
        if variant.key != outcome.key:
            raise RecordError(f"the outcome of {outcome.key[:12]} was given for the variant {variant.key[:12]}")
        with self._change() as db:
            rows = db.execute("SELECT id, status, attempts FROM variants WHERE key = ?", (variant.key,)).fetchall()
            self._add_point(db, variant)
            if rows and rows[0][1] == "finished" and not replace:
                return False
            place, attempts = (rows[0][0], rows[0][2]) if rows else (None, 0)
            new = columns_of(outcome)
            if {(column.what, column.source) for column in new} - self._columns:
                put_columns(db, new)
            put_variant(db, place, attempts + 1, variant, outcome)
        self._columns |= {(column.what, column.source) for column in new}
        return True

    def _add_point(self, db: sqlite3.Connection, variant: Variant) -> None:
        row = point_row(self._study, self._names, variant)
        there = _seal_there(db, row)
        if there is None:
            put_point(db, self._names, row)
        elif there != row[-1]:
            raise RecordError(f"point {variant.number} of the study {self.title!r} in the record {self.path} has other "
                              "values or was made by other versions: nothing was written; give the same command again")

    def next_number(self) -> int:
        """A number that no point of this study has, above all of them."""
        ((number,),) = self._rows("SELECT coalesce(max(number), 0) + 1 FROM points WHERE study = ?", self._study)
        return int(number)

    def note(self, what: str) -> None:
        """Write an event of this study with its time."""
        with self._change() as db:
            put_event(db, self._study, what)


def _seal_there(db: sqlite3.Connection, row: Row) -> bytes | None:
    """The seal of the point that is in the record with the number of `row`."""
    found = db.execute("SELECT seal FROM points WHERE study = ? AND number = ?", row[:2]).fetchone()
    return found[0] if found else None
