"""Writing a record: one writer, one transaction a variant, on the disk before it counts."""

from __future__ import annotations

import json
import os
import sqlite3
import zlib
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager
from datetime import datetime
from pathlib import Path
from typing import Any, Protocol

from studies.record.errors import RecordError, told
from studies.record.lock import Lock
from studies.record.opening import absolute, connect, refuse_foreign
from studies.record.place import refuse_folder, refuse_network, refuse_unwritable
from studies.record.reader import Record, Varied
from studies.record.schema import Column, make_tables, named, results_view, upgrade
from studies.record.seal import number, seal, text
from studies.vary.outcome import Outcome
from studies.vary.variant import Variant


class VariedLike(Protocol):
    """What the record reads of one varied thing."""

    @property
    def label(self) -> str: ...
    @property
    def unit(self) -> str: ...


class PlanLike(Protocol):
    """What the record reads of a plan."""

    @property
    def title(self) -> str: ...
    @property
    def name(self) -> str: ...
    @property
    def text(self) -> str: ...
    @property
    def part_text(self) -> str: ...
    @property
    def key(self) -> str: ...
    @property
    def varied(self) -> Mapping[str, VariedLike]: ...


def create(path: str | Path, plan: PlanLike) -> Writer:
    """See `Record.create`."""
    path = absolute(path)
    _refuse_place(path)
    lock = Lock(path)
    try:
        if path.exists():
            raise RecordError(f"{path} exists already: go on in it by the same command, or choose another --record")
        for left in (path.with_name(path.name + "-wal"), path.with_name(path.name + "-shm")):
            if left.exists():
                raise RecordError(f"{left} belongs to a record that is no longer beside it. Put the record back, or "
                                  "move that file away; it may hold finished variants")
        _make(path)
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


def _make(path: Path) -> None:
    """An empty record under a name of its own, then under its name: it is whole, or not there."""
    early = path.with_name(f".{path.name}.new")
    early.unlink(missing_ok=True)
    with told(path):
        early.touch()
        db = connect(early, "rw")
        try:
            db.execute("PRAGMA synchronous = FULL")
            make_tables(db)
            db.execute("PRAGMA journal_mode = WAL")
        finally:
            db.close()
    try:
        early.rename(path)
        folder = os.open(path.parent, os.O_RDONLY)
        try:
            os.fsync(folder)
        finally:
            os.close(folder)
    except OSError as error:
        raise RecordError(f"cannot make the record {path}: {error.strerror}; choose another --record") from error


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
                _join(db, path, plan, share)
            super().__init__(path, db, text(plan.title))
        except BaseException:
            db.close()
            raise
        self._lock = lock
        self._names = [varied.name for varied in self.study().varied]
        self._columns = {(column.what, column.source) for column in self.columns()}
        self._inode = path.stat().st_ino

    def close(self) -> None:
        """Close it and give the lock up; a second time does nothing."""
        with self._guard:
            super().close()
            self._lock.release()

    @contextmanager
    def _change(self) -> Iterator[sqlite3.Connection]:
        """One transaction: all of it on the disk when the block has ended, or nothing."""
        with self._guard, told(self.path):
            self._refuse_moved()
            self._db.execute("BEGIN IMMEDIATE")
            try:
                yield self._db
                self._db.execute("COMMIT")
            except BaseException:
                if self._db.in_transaction:  # a full disk has ended it already
                    self._db.execute("ROLLBACK")
                raise

    def _refuse_moved(self) -> None:
        try:
            there = self.path.stat().st_ino
        except OSError:
            there = -1
        if there != self._inode:
            raise RecordError(f"the record {self.path} was moved or removed while it was being written: put it back, "
                              "with the files beside it that begin with its name, and give the same command again")

    def set_points(self, variants: Iterable[Variant]) -> None:
        """Write the points of the plan; those that are there are kept, with their new keys where those changed."""
        with self._change() as db:
            for variant in variants:
                _put_point(db, self._study, self._names, variant)

    def set_left_out(self, entries: Iterable[tuple[int, Mapping[str, Any], str]]) -> None:
        """Write the points that are no variants (number, values, reason), in place of those written before."""
        with self._change() as db:
            db.execute("DELETE FROM left_out WHERE study = ?", (self._study,))
            for place, given, reason in entries:
                row = (self._study, place, _json(dict(given)), text(reason))
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
            _put_point(db, self._study, self._names, variant)
            if rows and rows[0][1] == "finished" and not replace:
                return False
            place, attempts = (rows[0][0], rows[0][2]) if rows else (None, 0)
            new = _columns_of(outcome) if outcome.status == "finished" else []
            if {(column.what, column.source) for column in new} - self._columns:
                _put_columns(db, new)
            _put_variant(db, place, attempts + 1, variant, outcome)
        self._columns |= {(column.what, column.source) for column in new}
        return True

    def note(self, what: str) -> None:
        """Write an event of this study with its time."""
        with self._change() as db:
            _put_event(db, self._study, what)


def _now() -> str:
    return datetime.now().astimezone().isoformat(" ", "seconds")


def _json(plain: Any) -> str:
    return json.dumps(plain, separators=(",", ":"))


def _put_event(db: sqlite3.Connection, study: int, what: str) -> None:
    row = (study, _now(), text(what))
    db.execute("INSERT INTO events (study, time, what, seal) VALUES (?, ?, ?, ?)", (*row, seal(row)))


def _put_point(db: sqlite3.Connection, study: int, names: list[str], variant: Variant) -> None:
    given = [variant.values.get(name) for name in names]
    numbers = [number(variant.numbers.get(name)) for name in names]
    row = (study, variant.number, variant.key, _json(given), _json(numbers))
    done = db.execute("INSERT INTO points VALUES (?, ?, ?, ?, ?, ?) ON CONFLICT (study, number) DO UPDATE SET "
                      "key = excluded.key, given = excluded.given, numbers = excluded.numbers, seal = excluded.seal "
                      "WHERE seal <> excluded.seal", (*row, seal(row)))
    if done.rowcount:
        db.executemany("INSERT OR REPLACE INTO choices VALUES (?, ?, ?, ?)",
                       [(study, variant.number, name, choice(*pair))
                        for name, *pair in zip(names, given, numbers, strict=True)])


def choice(given: Any, found: float | None) -> float | str | None:
    """What the table shows of a value: its number in base units, else itself; a list as JSON."""
    if found is not None or given is None:
        return found
    return text(given) if isinstance(given, str) else _json(given)


def _columns_of(outcome: Outcome) -> list[Column]:
    found = []
    for name, kept in outcome.figures.items():
        found += [Column("", what, text(name), text(kept.unit), "") for what in ("figure", "beam")]
    return found + [Column("", "margin", text(held.name), "", text(held.quantity)) for held in outcome.limits]


def _put_columns(db: sqlite3.Connection, new: Iterable[Column]) -> None:
    """Add columns to `results`."""
    old = [Column(*row) for row in db.execute("SELECT name, what, source, unit, label FROM columns")]
    columns = named([*new, *old])
    db.execute("DELETE FROM columns")
    db.executemany("INSERT INTO columns VALUES (?, ?, ?, ?, ?, ?)", [(*row, seal(row)) for row in columns])
    db.execute("DROP VIEW results")
    db.execute(results_view(columns))


def _put_variant(db: sqlite3.Connection, place: int | None, attempts: int, variant: Variant, outcome: Outcome) -> None:
    """Write the rows of one variant, `place` being the number that it has already."""
    if place is None:
        ((place,),) = db.execute("SELECT coalesce(max(id), 0) + 1 FROM variants").fetchall()
    figures = sorted((text(name), number(kept.solid), number(kept.beam), text(kept.unit), text(kept.judgement))
                     for name, kept in outcome.figures.items())
    limits = [(text(h.name), text(h.quantity), number(h.given), number(h.found), text(h.unit), text(h.verdict),
               number(h.margin), text(h.reason)) for h in outcome.limits]
    row = (place, variant.key, variant.shape_key, _json(variant.data),
           None if variant.fullest is None else _json(variant.fullest), outcome.status, outcome.judgement,
           int(outcome.fine), text(outcome.stage), text(outcome.reason), int(outcome.safer_mesh),
           text(outcome.first_reason), int(outcome.unknowns), number(outcome.seconds.get("wall")),
           number(outcome.peak_memory), text(outcome.worker), attempts, _now(),
           zlib.compress(_json(outcome.to_json()).encode("ascii"), 6))
    db.execute("DELETE FROM figures WHERE variant = ?", (place,))
    db.execute("DELETE FROM limits WHERE variant = ?", (place,))
    db.execute(f"INSERT OR REPLACE INTO variants VALUES ({', '.join('?' * 20)})", (*row, seal(row, *figures, *limits)))
    db.executemany("INSERT INTO figures VALUES (?, ?, ?, ?, ?, ?)", [(place, *figure) for figure in figures])
    db.executemany("INSERT INTO limits VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
                   [(place, k, *limit) for k, limit in enumerate(limits)])


def _join(db: sqlite3.Connection, path: Path, plan: PlanLike, share: bool) -> None:
    """Find the study of `plan` in the record, or write it."""
    titles = dict(db.execute("SELECT title, key FROM study").fetchall())
    title = text(plan.title)
    if titles.get(title) == plan.key:
        return
    if titles and not share:
        what = (f"another plan of the study {title!r} (the plan was changed)" if title in titles
                else "another study: " + ", ".join(map(repr, titles)))
        raise RecordError(f"the record {path} is that of {what}.\n"
                          f"  1. keep them apart: --record {path.with_name(path.stem + '-2' + path.suffix)}\n"
                          "  2. write both into this one, and use its finished variants again: --share")
    varied = [Varied(text(name), text(v.label), text(v.unit)) for name, v in plan.varied.items()]
    db.execute("BEGIN IMMEDIATE")
    if title in titles:
        _leave_old_plan(db, title)
    ids = dict(db.execute("SELECT title, id FROM study").fetchall())
    study = ids.get(title, max(ids.values(), default=0) + 1)
    row = (study, title, text(plan.key), text(plan.name), text(plan.text), text(plan.part_text), _json(varied), _now())
    db.execute("INSERT OR REPLACE INTO study VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)", (*row, seal(row)))
    _put_columns(db, [Column("", "varied", v.name, v.unit, v.label) for v in varied])
    db.execute("COMMIT")


def _leave_old_plan(db: sqlite3.Connection, title: str) -> None:
    """A changed plan takes the place of the old one, whose text is kept as an event; variants stay."""
    ((study, plan),) = db.execute("SELECT id, plan FROM study WHERE title = ?", (title,)).fetchall()
    _put_event(db, study, f"the plan was changed; it was:\n{plan}")
    for table in ("points", "choices", "left_out"):
        db.execute(f"DELETE FROM {table} WHERE study = ?", (study,))
