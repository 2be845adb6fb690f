"""Reading a record, also while a study writes it."""

from __future__ import annotations

import json
import sqlite3
import threading
import zlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Any, NamedTuple, Self

from studies.record.errors import RecordError, told
from studies.record.opening import absolute, open_reader
from studies.record.place import refuse_folder
from studies.record.schema import Column
from studies.record.whole import refuse_damaged
from studies.vary.outcome import Outcome

if TYPE_CHECKING:
    from studies.record.joining import PlanLike
    from studies.record.writer import Writer


MOST_AT_ONCE = 500
"""Outcomes held at a time while all of them are gone through."""


class Varied(NamedTuple):
    """What a study varies: its name in the plan, how to call it, and the unit to show it in."""

    name: str
    label: str
    unit: str


@dataclass(frozen=True, slots=True)
class Study:
    """One study of a record: the texts that define it. `key` is the plan's."""

    title: str
    key: str
    name: str
    plan_text: str
    part_text: str
    varied: tuple[Varied, ...]
    made: str


@dataclass(frozen=True, slots=True)
class Point:
    """One point of a study. `values` as written in a spec, `numbers` in base units where they are quantities."""

    number: int
    key: str
    values: Mapping[str, Any]
    numbers: Mapping[str, float]


class LeftOut(NamedTuple):
    """A point that is no variant, and why."""

    number: int
    values: Mapping[str, Any]
    reason: str


@dataclass(frozen=True, slots=True)
class Progress:
    """How far a study is, in points. `judgements` counts the finished ones by their word."""

    points: int
    finished: int
    failed: int
    waiting: int
    left_out: int
    fine: int
    judgements: Mapping[str, int]


class Record:
    """A record opened for reading; every method raises `RecordError`.

    Attributes
    ----------
    path
        The file.
    title
        Of the study that `table`, `points`, `progress` and the like are about.
    """

    def __init__(self, path: Path, db: sqlite3.Connection, title: str) -> None:
        self.path = path
        self.title = title
        self._db = db
        self._guard = threading.RLock()
        with told(path):
            (self._study,) = db.execute("SELECT id FROM study WHERE title = ?", (title,)).fetchone()

    @staticmethod
    def create(path: str | Path, plan: PlanLike) -> Writer:
        """Make a new record for `plan`. Raises `RecordError` when the file exists."""
        from studies.record.writer import create

        return create(path, plan)

    @staticmethod
    def resume(path: str | Path, plan: PlanLike, share: bool = False) -> Writer:
        """Go on writing the record of `plan`; with `share`, also one that holds other studies."""
        from studies.record.writer import resume

        return resume(path, plan, share)

    @staticmethod
    def open(path: str | Path, title: str | None = None, check: bool = True) -> Record:
        """Open for reading, also while the study runs. Of several studies the one with this `title`, else the last one.

        The whole file is checked first (about two seconds for 10 000 variants), unless `check` is false.
        """
        path = absolute(path)
        refuse_folder(path)
        if not path.exists():
            raise RecordError(f"there is no record {path}: haunch vary PLAN.toml makes it")
        db = open_reader(path)
        try:
            if check:
                refuse_damaged(db, path)
            with told(path):
                titles = [row[0] for row in db.execute("SELECT title FROM study ORDER BY id")]
            if not titles:
                raise RecordError(f"the record {path} holds no study yet: haunch vary PLAN.toml writes it")
            if title is not None and title not in titles:
                raise RecordError(f"the record {path} holds no study {title!r}; it holds: {', '.join(titles)}")
            return Record(path, db, titles[-1] if title is None else title)
        except BaseException:
            db.close()
            raise

    def close(self) -> None:
        """Close it; a second time does nothing."""
        self._db.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        self.close()

    def _rows(self, sql: str, *given: Any) -> list[tuple[Any, ...]]:
        """All rows at once: a reader that waits in the middle would keep the write-ahead log from being emptied."""
        with self._guard, told(self.path):
            return self._db.execute(sql, given).fetchall()

    def studies(self) -> list[str]:
        """Titles of the studies in the record, in the order in which they came."""
        return [row[0] for row in self._rows("SELECT title FROM study ORDER BY id")]

    def study(self) -> Study:
        """The study's texts."""
        ((title, key, name, plan, part, varied, made),) = self._rows(
            "SELECT title, key, name, plan, part, varied, made FROM study WHERE id = ?", self._study)
        return Study(title, key, name, plan, part, tuple(Varied(*v) for v in json.loads(varied)), made)

    def columns(self) -> list[Column]:
        """What the columns of `table` mean, beyond the fixed ones."""
        from studies.record.schema import ORDER

        found = [Column(*row) for row in self._rows("SELECT name, what, source, unit, label FROM columns")]
        return sorted(found, key=lambda c: (ORDER.index(c.what), c.source))

    def table(self) -> list[dict[str, Any]]:
        """The rows of `results` of this study, as they are in the database: in order, also of what still waits."""
        with self._guard, told(self.path):
            cursor = self._db.execute("SELECT * FROM results WHERE study = ?", (self.title,))
            names = [column[0] for column in cursor.description]
            return [dict(zip(names, row, strict=True)) for row in cursor.fetchall()]

    def points(self) -> list[Point]:
        """The points of the plan, finished or not."""
        names = [varied.name for varied in self.study().varied]
        return [_point(names, *row) for row in self._rows(
            "SELECT number, key, given, numbers FROM points WHERE study = ? ORDER BY number", self._study)]

    def left_out(self) -> list[LeftOut]:
        """The points that are no variants."""
        return [LeftOut(number, json.loads(given), reason) for number, given, reason in self._rows(
            "SELECT number, given, reason FROM left_out WHERE study = ? ORDER BY number", self._study)]

    def outcome(self, key: str) -> Outcome | None:
        """What became of the variant with this key; None while it waits."""
        rows = self._rows("SELECT outcome FROM variants WHERE key = ?", key)
        return unpacked(rows[0][0]) if rows else None

    def outcomes(self) -> Iterator[tuple[Point, Outcome]]:
        """Each point of the study that has an outcome, in order."""
        names, last = [varied.name for varied in self.study().varied], -1
        while rows := self._rows(
                "SELECT p.number, p.key, p.given, p.numbers, v.outcome FROM points p JOIN variants v ON v.key = p.key "
                "WHERE p.study = ? AND p.number > ? ORDER BY p.number LIMIT ?", self._study, last, MOST_AT_ONCE):
            yield from ((_point(names, *row), unpacked(outcome)) for *row, outcome in rows)
            last = rows[-1][0]

    def spec(self, key: str) -> dict[str, Any] | None:
        """The tables of the spec of a variant that has an outcome."""
        rows = self._rows("SELECT spec FROM variants WHERE key = ?", key)
        return json.loads(rows[0][0]) if rows else None

    def finished_keys(self) -> set[str]:
        """Keys of the finished variants of all studies in the record."""
        return {row[0] for row in self._rows("SELECT key FROM variants WHERE status = 'finished'")}

    def failed_keys(self) -> set[str]:
        """Keys of the failed variants of all studies in the record."""
        return {row[0] for row in self._rows("SELECT key FROM variants WHERE status = 'failed'")}

    def words(self) -> dict[str, str]:
        """Key -> judgement, or ``failed``, of the variants of all studies in the record."""
        return {key: judgement if status == "finished" else "failed"
                for key, status, judgement in self._rows("SELECT key, status, judgement FROM variants")}

    def failed(self) -> list[tuple[Point, Outcome]]:
        """The points of this study that failed, in order."""
        names = [varied.name for varied in self.study().varied]
        return [(_point(names, *row), unpacked(outcome)) for *row, outcome in self._rows(
            "SELECT p.number, p.key, p.given, p.numbers, v.outcome FROM points p JOIN variants v ON v.key = p.key "
            "WHERE p.study = ? AND v.status = 'failed' ORDER BY p.number", self._study)]

    def events(self) -> list[tuple[str, str]]:
        """What happened to this study, and when."""
        return [(time, what) for time, what in self._rows(
            "SELECT time, what FROM events WHERE study = ? ORDER BY id", self._study)]

    def progress(self) -> Progress:
        """Counts of the study's points."""
        rows = self._rows(
            "SELECT coalesce(v.status, 'waiting'), coalesce(v.judgement, ''), coalesce(v.fine, 0), count(*) "
            "FROM points p LEFT JOIN variants v ON v.key = p.key WHERE p.study = ? GROUP BY 1, 2, 3", self._study)
        ((left_out,),) = self._rows("SELECT count(*) FROM left_out WHERE study = ?", self._study)
        count = {status: sum(n for s, _, _, n in rows if s == status) for status in ("finished", "failed", "waiting")}
        words = sorted({word for status, word, _, _ in rows if status == "finished"})
        return Progress(
            points=sum(count.values()), **count, left_out=left_out, fine=sum(n for _, _, fine, n in rows if fine),
            judgements={word: sum(n for s, w, _, n in rows if s == "finished" and w == word) for word in words})


def _point(names: list[str], number: int, key: str, given: str, numbers: str) -> Point:
    values = dict(zip(names, json.loads(given), strict=True))
    found = dict(zip(names, json.loads(numbers), strict=True))
    return Point(number, key, values, {name: value for name, value in found.items() if value is not None})


def unpacked(blob: bytes) -> Outcome:
    """The outcome that a row keeps."""
    return Outcome.from_json(json.loads(zlib.decompress(blob)))
